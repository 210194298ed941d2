#pragma once
// An estimate of one quantity: value, standard uncertainty, interval, degrees of freedom.

#include <limits>
#include <map>
#include <optional>
#include <string>
#include <string_view>

namespace ringwright {

/// The quantities that a result may hold, in the order in which people read them.
enum class Quantity {
    natural_frequency,      ///< undamped, Hz
    damped_frequency,       ///< Hz
    damping_ratio,          ///< 1
    logarithmic_decrement,  ///< 1
    loss_factor,            ///< 1
    quality_factor,         ///< 1
    decay_rate,             ///< 1/s: damping ratio times undamped angular frequency
    slow_decay_rate,        ///< 1/s: k/c, all that a recording far beyond critical damping shows
    stiffness,              ///< N/m, or N·m/rad for torsion
    damping_coefficient,    ///< N·s/m, or N·m·s/rad for torsion
    mass,                   ///< kg
    inertia,                ///< kg·m²
    static_deflection,      ///< m
    friction_force,         ///< N
    compression_damping,    ///< N·s/m
    rebound_damping,        ///< N·s/m
    quadratic_damping,      ///< N·s²/m²
    cubic_stiffness,        ///< N/m³
    drop_height,            ///< m
    contact_velocity,       ///< m/s
};

/// The key of the quantity in JSON, CSV, test sheets and the ledger, e.g. "natural_frequency".
[[nodiscard]] std::string_view key_of(Quantity quantity);
/// Its name for people, e.g. "natural frequency".
[[nodiscard]] std::string_view name_of(Quantity quantity);
/// Its SI unit for translation (`N/m`) or torsion (`N·m/rad`).
[[nodiscard]] std::string_view unit_of(Quantity quantity, bool torsional = false);
/// The quantity with this key; nothing when there is none.
[[nodiscard]] std::optional<Quantity> quantity_from_key(std::string_view key);

/// A closed interval; an end may be infinite inside the library, never in a written result.
struct Interval {
    double low = 0.0;
    double high = 0.0;
};

/// Value in SI units, standard uncertainty (JCGM 100, 2.3.1), interval at the confidence level that was asked
/// for (it may be lopsided about the value) and degrees of freedom (infinite where nothing limits them).
struct Estimate {
    double value = 0.0;
    double standard_uncertainty = 0.0;
    Interval interval;
    double degrees_of_freedom = std::numeric_limits<double>::infinity();
};

using Quantities = std::map<Quantity, Estimate>;

}  // namespace ringwright
