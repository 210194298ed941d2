#pragma once
// Writing a file so that nobody ever sees half of it.

#include <functional>
#include <string>
#include <string_view>

namespace ringwright {

/// Writes `bytes` to a new file beside `path`, flushes it to the disk, and renames it over `path`: after a
/// failure `path` is as it was before. A `path` that is not an ordinary file (a device, a pipe) is written
/// directly. The file keeps the permissions that it had; a new one gets those of the process. Throws
/// OutputError (file, cause, remedy) when it cannot be written.
void write_file_safely(const std::string& path, std::string_view bytes);

/// Takes the next bytes of a text that is never in memory as a whole.
using PieceTaker = std::function<void(std::string_view)>;
/// The same, piece by piece: `write` hands its pieces to what it is given. An exception of `write` leaves
/// `path` as it was.
void write_pieces_safely(const std::string& path, const std::function<void(const PieceTaker&)>& write);

}  // namespace ringwright
