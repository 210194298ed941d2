#pragma once
// A text table opened for reading: its form, its clock and its signal, before any row is read in full.

#include <string>
#include <string_view>

#include "recording/channel_scale.hpp"
#include "recording/csv_columns.hpp"
#include "recording/csv_rows.hpp"
#include "recording/csv_table.hpp"
#include "recording/csv_thousands.hpp"
#include "recording/text_encoding.hpp"
#include "ringwright/recording.hpp"

namespace ringwright {

/// A text file with its table found.
struct OpenTable {
    DecodedText decoded;
    std::string_view text;
    Table table;
    RowSample sample;
    ThousandsMarks thousands;
    [[nodiscard]] std::string_view rows() const { return text.substr(table.begin); }
};

/// The same with its clock and its signal chosen.
struct ChosenTable {
    OpenTable open;
    TimeChoice time;
    SignalChoice signal;
    RowPlan plan;
};

/// Adds what was assumed to the findings of `recording`, and names its channel. Throws InputError when there
/// is no table, no clock or no signal, UsageError for an unusable option.
[[nodiscard]] ChosenTable choose_columns(std::string_view bytes, const ReadOptions& options,
                                         Recording& recording);

/// Rate of a table without times: as the options say, else as its preamble states, which is a finding.
[[nodiscard]] double rate_without_times(const OpenTable& open, const ReadOptions& options,
                                        Recording& recording);

/// Missing and odd cells of the chosen column, in words; `rows` of which only the counts are used, and
/// `row_count`.
void report_absences(const Rows& rows, std::size_t row_count, const Table& table, const std::string& channel,
                     Findings& findings);

[[nodiscard]] ChannelScale scale_of(const ChosenTable& chosen, const ReadOptions& options);
/// Unit and quantity for the recording, and the findings of the scale.
void take_scale(const ChannelScale& scale, Recording& recording);

}  // namespace ringwright
