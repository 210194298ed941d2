#include "ringwright/estimate.hpp"

#include <algorithm>
#include <array>

namespace ringwright {
namespace {

struct Description {
    Quantity quantity;
    std::string_view key, name, unit, torsional_unit;
};

constexpr std::array<Description, 20> descriptions{{
    {Quantity::natural_frequency, "natural_frequency", "natural frequency", "Hz", "Hz"},
    {Quantity::damped_frequency, "damped_frequency", "damped frequency", "Hz", "Hz"},
    {Quantity::damping_ratio, "damping_ratio", "damping ratio", "1", "1"},
    {Quantity::logarithmic_decrement, "logarithmic_decrement", "logarithmic decrement", "1", "1"},
    {Quantity::loss_factor, "loss_factor", "loss factor", "1", "1"},
    {Quantity::quality_factor, "quality_factor", "quality factor", "1", "1"},
    {Quantity::decay_rate, "decay_rate", "decay rate", "1/s", "1/s"},
    {Quantity::slow_decay_rate, "slow_decay_rate", "slow decay rate k/c", "1/s", "1/s"},
    {Quantity::stiffness, "stiffness", "stiffness", "N/m", "N·m/rad"},
    {Quantity::damping_coefficient, "damping_coefficient", "damping coefficient", "N·s/m", "N·m·s/rad"},
    {Quantity::mass, "mass", "mass", "kg", "kg"},
    {Quantity::inertia, "inertia", "moment of inertia", "kg·m²", "kg·m²"},
    {Quantity::static_deflection, "static_deflection", "static deflection", "m", "m"},
    {Quantity::friction_force, "friction_force", "friction force", "N", "N·m"},
    {Quantity::compression_damping, "compression_damping", "damping coefficient in compression", "N·s/m",
     "N·m·s/rad"},
    {Quantity::rebound_damping, "rebound_damping", "damping coefficient in rebound", "N·s/m", "N·m·s/rad"},
    {Quantity::quadratic_damping, "quadratic_damping", "quadratic damping coefficient", "N·s²/m²",
     "N·m·s²/rad²"},
    {Quantity::cubic_stiffness, "cubic_stiffness", "cubic stiffness", "N/m³", "N·m/rad³"},
    {Quantity::drop_height, "drop_height", "drop height", "m", "m"},
    {Quantity::contact_velocity, "contact_velocity", "contact velocity", "m/s", "m/s"},
}};

const Description& describe(Quantity quantity) {
    return descriptions[static_cast<std::size_t>(quantity)];
}

}  // namespace

std::string_view key_of(Quantity quantity) {
    return describe(quantity).key;
}
std::string_view name_of(Quantity quantity) {
    return describe(quantity).name;
}

std::string_view unit_of(Quantity quantity, bool torsional) {
    return torsional ? describe(quantity).torsional_unit : describe(quantity).unit;
}

std::optional<Quantity> quantity_from_key(std::string_view key) {
    const auto found = std::ranges::find(descriptions, key, &Description::key);
    if (found == descriptions.end()) return std::nullopt;
    return found->quantity;
}

}  // namespace ringwright
