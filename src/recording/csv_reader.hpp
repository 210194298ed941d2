#pragma once
// Recordings as text tables.

#include <string>
#include <string_view>

#include "ringwright/recording.hpp"

namespace ringwright {

/// Fills samples, clock, quantity, unit, channel and findings of `recording` from a text table. Accepts what
/// docs/formats.md lists. Throws InputError when there is no table, no clock or too little data, UsageError
/// for an unusable option.
void read_csv(std::string_view bytes, const ReadOptions& options, Recording& recording);

/// What is in a text table, all columns.
void summarise_csv(std::string_view bytes, const ReadOptions& options, FileSummary& summary);

}  // namespace ringwright
