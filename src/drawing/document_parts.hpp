#pragma once
// Parts that the reports of every kind of result have in common.

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

/// Null when there is none of that name.
[[nodiscard]] const NamedFigure* find_figure(const std::vector<NamedFigure>& figures,
                                             const std::string& name);
/// The figure over the whole width; nothing when there is none of that name.
void add_picture(std::vector<Block>& blocks, const std::vector<NamedFigure>& figures,
                 const std::string& name);

}  // namespace ringwright::drawing
