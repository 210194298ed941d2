#pragma once
// FILEs of a batch: folders and patterns become the recordings in them; a shard is a part of the list.

#include <cstddef>
#include <optional>
#include <string>
#include <vector>

#include "app/article_options.hpp"
#include "ringwright/error.hpp"

namespace ringwright::app {

/// One recording of a batch, or a FILE that stands for none.
struct BatchFile {
    LoadedFile loaded;
    std::optional<Problem> problem = {};  ///< why there is nothing to read: an empty folder …
};

/// The list and what was left out of folders, a sentence for each.
struct BatchList {
    std::vector<BatchFile> files;
    std::vector<Problem> passed_over;
};

/// A folder becomes the ordinary files in it, whose names end as those of recordings do (.csv, .wav … in
/// upper or lower case) and do not begin with a dot, ordered by the bytes of their names; folders in it are
/// not entered. A FILE that does not exist and holds *, ? or [ is a pattern (POSIX glob), its matches ordered
/// alike, so that lists longer than a command line can be named. Everything else stands for itself. An added
/// mass goes with every recording of its folder or pattern.
[[nodiscard]] BatchList batch_list(const std::vector<LoadedFile>& files);

/// Part I of N, 1 ≤ I ≤ N.
struct Shard {
    std::size_t part = 1, parts = 1;
    /// The positions [begin, end) of a list of `count`: contiguous, in the order of the parts, sizes equal
    /// within one.
    [[nodiscard]] std::size_t begin(std::size_t count) const;
    [[nodiscard]] std::size_t end(std::size_t count) const;
};
/// "3/8"; empty is 1/1. Throws UsageError.
[[nodiscard]] Shard shard_from(const std::string& text);

}  // namespace ringwright::app
