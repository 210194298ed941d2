#pragma once
// What the program says: messages on standard error, answers on standard output or into a file.

#include <string>
#include <string_view>
#include <vector>

#include "ringwright/error.hpp"

namespace ringwright::app {

/// One line on standard error: `ringwright: file: place: cause. remedy`.
void say(const Problem& problem);

/// True when standard output and standard error go to the same place, so that a reader of one sees the other.
[[nodiscard]] bool errors_follow_answer();
/// The text without line breaks and a full stop at its end.
[[nodiscard]] std::string without_period(std::string text);

/// Writes the whole text to `output`, safely, or to standard output when `output` is empty or "-". A closed
/// pipe ends quietly; throws OutputError where the text cannot be written.
void write_answer(std::string_view text, const std::string& output);
/// True when write_answer found that nobody reads standard output any more.
[[nodiscard]] bool standard_output_is_closed();
/// Throws UsageError when `output` is one of the files to be read.
void refuse_overwriting(const std::string& output, const std::vector<std::string>& inputs);

}  // namespace ringwright::app
