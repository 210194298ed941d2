#pragma once
// One cell of a CSV file (RFC 4180).

#include <string>

namespace ringwright::report {

/// Shortest digits that read back as the same number; empty where it is not finite.
[[nodiscard]] std::string csv_number(double value);
/// Quoted where it must be. A cell that a spreadsheet would take for a formula gets a leading apostrophe.
[[nodiscard]] std::string csv_cell(const std::string& text);

}  // namespace ringwright::report
