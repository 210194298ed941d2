#pragma once
// A value with a unit and, if known, an uncertainty, as people write it; and the way back to text.

#include <limits>
#include <string>
#include <string_view>

#include "ringwright/estimate.hpp"
#include "ringwright/units.hpp"

namespace ringwright {

/// How the uncertainty of a value was stated.
enum class UncertaintyKind {
    not_stated,
    standard,   ///< "12.40(5) kg": standard uncertainty in the last digits (JCGM 100, 7.2.2)
    tolerance,  ///< "12.4 ± 0.1 kg": half-width of a rectangular distribution (JCGM 100, 4.3.7), u = a/√3
};

/// A stated value, in SI units.
struct MeasuredValue {
    double value = 0.0;
    double standard_uncertainty = 0.0;
    UncertaintyKind kind = UncertaintyKind::not_stated;
    double degrees_of_freedom = std::numeric_limits<double>::infinity();
    Unit unit;         ///< the unit it was written in
    std::string text;  ///< as it was written
};

/// Reads "12.4 kg", "12.40(5) kg", "12.4 ± 0.1 kg", "12.4 +/- 0.1 kg", "12,4 kg", "1.5e-3 kg m2". Throws
/// UsageError naming `where` when the text is no number with a unit of the dimension wanted, is not finite,
/// or has a negative uncertainty.
[[nodiscard]] MeasuredValue parse_measured_value(std::string_view text, std::string_view where,
                                                 Dimension wanted);

/// A plain finite number with no unit in any locale; throws UsageError naming `where`.
[[nodiscard]] double parse_number(std::string_view text, std::string_view where);

/// Digits that the uncertainty supports: the uncertainty to two significant digits, the value to the same
/// decimal place (JCGM 100, 7.2.6). Zero or unknown uncertainty: six significant digits.
struct RoundedEstimate {
    std::string value, standard_uncertainty, low, high;
};
[[nodiscard]] RoundedEstimate round_to_uncertainty(const Estimate& estimate);
/// The same after division by `unit_factor` (SI units in one output unit, e.g. 1e-3 for mm).
[[nodiscard]] RoundedEstimate round_to_uncertainty(const Estimate& estimate, double unit_factor);

}  // namespace ringwright
