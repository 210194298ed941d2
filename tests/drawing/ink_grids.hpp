#pragma once
#include <map>
#include <string>

namespace ringwright::samples {

/// Mean darkness of 32 × 12 cells of a drawn sample figure, one letter a cell, by the name of the figure.
/// Made by drawing the figure and looking at it; see "ink lies where it lay".
[[nodiscard]] const std::map<std::string, std::string>& ink_grids();

}  // namespace ringwright::samples
