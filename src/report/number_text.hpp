#pragma once
// Estimates in words and digits for people: as many digits as the uncertainty supports (JCGM 100, 7.2.4
// and 7.2.6).

#include <string>
#include <string_view>

#include "ringwright/estimate.hpp"

namespace ringwright::report {

/// The value alone as round_to_uncertainty gives it; a dash where it is not finite.
[[nodiscard]] std::string rounded(double value, double uncertainty);

/// "(5.0123 ± 0.0022) Hz", or "3.1 Hz, between 2.7 Hz and 4.2 Hz" where the interval is lopsided, or
/// "about 3.1 Hz, at least 2.7 Hz" where an end is infinite. A unit of "1" is left out.
[[nodiscard]] std::string with_interval(const Estimate& estimate, std::string_view unit);
/// The same for a table whose header names the unit: "5.0123 ± 0.0022", "3.1 [2.7, 4.2]".
[[nodiscard]] std::string in_table(const Estimate& estimate);

}  // namespace ringwright::report
