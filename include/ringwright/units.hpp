#pragma once
// Units of measurement as people write them. SI inside; a unit is attached where text is read and where it is
// written.

#include <optional>
#include <string>
#include <string_view>

namespace ringwright {

/// What kind of quantity a unit measures.
enum class Dimension {
    none,          // 1, %
    time,          // s
    frequency,     // Hz
    length,        // m
    velocity,      // m/s
    acceleration,  // m/s²
    angle,         // rad
    angular_velocity,
    angular_acceleration,
    mass,                 // kg
    inertia,              // kg·m²
    force,                // N
    torque,               // N·m
    stiffness,            // N/m
    torsional_stiffness,  // N·m/rad
    damping,              // N·s/m
    torsional_damping,    // N·m·s/rad
    quadratic_damping,    // N·s²/m²
    rate,                 // 1/s
    voltage,              // V
};

/// The name for people: "length", "acceleration" …
[[nodiscard]] std::string_view name_of(Dimension dimension);
/// The SI unit of the dimension, e.g. "m/s²".
[[nodiscard]] std::string_view si_unit_of(Dimension dimension);

/// A unit: value in SI = value in this unit times `si_factor`. Factors are exact (NIST SP 811, appendix B).
struct Unit {
    std::string symbol;  ///< as it is written in output, e.g. "mm", "g", "m/s²"
    Dimension dimension = Dimension::none;
    double si_factor = 1.0;
};

/// The unit that `text` names, whatever the spelling ("mm/s^2", "mm/s2", "mm/s²", "mm s-2", "G", "in/s2",
/// "lbf/in"). Nothing when the text names no unit that is known.
[[nodiscard]] std::optional<Unit> find_unit(std::string_view text);
/// The same, and of the dimension wanted, which settles what can be read in two ways: "g" and "mg" are masses
/// where a mass is wanted and accelerations otherwise; "lb/in" and "kg/mm" are stiffnesses where one is
/// wanted.
[[nodiscard]] std::optional<Unit> find_unit(std::string_view text, Dimension wanted);
/// The usual spelling nearest to `text`, for a message about an unknown unit.
[[nodiscard]] std::string_view suggested_unit(std::string_view text);

/// As find_unit, but throws UsageError naming `where` (an option, a header, a sheet key) and the nearest
/// known spelling.
[[nodiscard]] Unit parse_unit(std::string_view text, std::string_view where);
/// The same, and of one of the dimensions wanted; the error says what was wanted.
[[nodiscard]] Unit parse_unit(std::string_view text, std::string_view where, Dimension wanted);

}  // namespace ringwright
