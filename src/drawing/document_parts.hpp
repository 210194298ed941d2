#pragma once
// Parts that the reports of every kind of result have in common.

#include <optional>
#include <string>
#include <utility>
#include <vector>

#include "drawing/document.hpp"
#include "drawing/result_reading.hpp"

namespace ringwright::drawing {

namespace schemas {
inline constexpr const char* identification = "ringwright.identification.v1";
inline constexpr const char* comparison = "ringwright.comparison.v1";
inline constexpr const char* chart = "ringwright.chart.v1";
inline constexpr const char* gauge = "ringwright.gauge.v1";
}  // namespace schemas

using FactRows = std::vector<std::pair<std::string, std::string>>;
/// Adds nothing where the value is empty.
void add_fact(FactRows& rows, const char* name, const std::string& value);
/// What the test sheet says of article, date and operator.
[[nodiscard]] FactRows sheet_facts(const Json& result);
/// What the test sheet says of the sensor.
void add_sensor(FactRows& rows, const Json& result);
/// Test sheet with its hash, software, and the command that gives the result again.
void add_provenance(FactRows& rows, const Json& result, const std::string& command);

/// A report without blocks, with all that every report bears.
[[nodiscard]] Document opened(const Json& result, const char* kind, const std::string& title);
[[nodiscard]] Note note_of(const Json& finding);
void add_notes(std::vector<Block>& blocks, const Notes& notes);
/// Heading of the last part, `remarks`, and the lines to sign.
void add_signature(std::vector<Block>& blocks, const std::vector<std::string>& remarks = {});

/// "3.12 N/m"; a unit of one is not written.
[[nodiscard]] std::string with_unit(double value, const std::string& unit, int digits = 6);
/// To four decimals, "< 0.0001", or a dash where there is none.
[[nodiscard]] std::string p_text(std::optional<double> p);
/// "0.22 … 0.34", "≥ 0.22", "≤ 0.34", or empty where neither end is given.
[[nodiscard]] std::string range_text(std::optional<double> low, std::optional<double> high);

/// Twelve hexadecimal digits of the hash of the result: the same result has the same number.
[[nodiscard]] std::string report_number(const Json& result);
/// "95 %".
[[nodiscard]] std::string confidence_text(const Json& result);
/// Type and serial of the test sheet's article; empty when neither is said.
[[nodiscard]] std::string article_name(const Json& result);
/// The text, or a dash where there is none.
[[nodiscard]] std::string cell(const std::string& text);
/// A word as a shell takes it.
[[nodiscard]] std::string quoted(const std::string& word);
/// A recording with its added mass, as a command line takes it.
[[nodiscard]] std::string file_words(const std::string& file, const std::string& added_mass);
/// The sheet and the options of the result, as they end a command line.
[[nodiscard]] std::string closing_words(const Json& result);

/// Null when there is none of that name.
[[nodiscard]] const NamedFigure* find_figure(const std::vector<NamedFigure>& figures,
                                             const std::string& name);
/// The figure over the whole width; nothing when there is none of that name.
void add_picture(std::vector<Block>& blocks, const std::vector<NamedFigure>& figures,
                 const std::string& name);

}  // namespace ringwright::drawing
