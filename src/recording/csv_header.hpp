#pragma once
// Names and units of columns from the lines above a table.

#include <string_view>
#include <vector>

#include "recording/csv_table.hpp"

namespace ringwright {

/// A label such as "time (s)", "Zeit [ms]", "acc_x/g", "Weg in mm", "disp_mm" taken apart.
struct Label {
    std::string name;
    std::string unit_text;
    std::optional<Unit> unit;
};
[[nodiscard]] Label read_label(std::string_view text);

/// Fills names and units of `columns` from the lines above the data, the nearest first: one line of names,
/// with or without units, and perhaps one line of units, whose delimiter may differ from that of the data.
/// Returns how many lines were used.
std::size_t read_header(const std::vector<std::string_view>& lines_above, bool latin1, const Dialect& dialect,
                        std::vector<Column>& columns);

}  // namespace ringwright
