#pragma once
// The result as a table for spreadsheets and scripts.

#include <string>

#include "ringwright/analysis.hpp"

namespace ringwright {

/// Comma-separated, decimal point, UTF-8, one header row (RFC 4180). One row for each release, method and
/// quantity, then one for each quantity of the pooled result, whose `scope` is "result". Columns: scope,
/// file, release, start_s, end_s, method, model, quantity, value, unit, standard_uncertainty, interval_low,
/// interval_high, degrees_of_freedom, confidence_level, status, reason. A number that does not exist is an
/// empty cell; a method that does not apply has one row with the reason.
[[nodiscard]] std::string to_csv(const Identification& identification);
/// The row of a recording that could not be used: scope `recording`, status `unusable` and the reason.
[[nodiscard]] std::string csv_row_of_unusable(const std::string& file, const std::string& reason,
                                              double confidence_level);

}  // namespace ringwright
