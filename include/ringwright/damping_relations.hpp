#pragma once
// Formulas that tie together the measures of damping and of stiffness of a mass on a spring and damper,
//     m ẍ + c ẋ + k x = 0,   ω_n = √(k/m),   ζ = c / (2 m ω_n).
// Pure arithmetic without uncertainty. Sources: standard theory (Thomson, Theory of Vibration with
// Applications; Rao, Mechanical Vibrations; Den Hartog, Mechanical Vibrations), from memory where no page is
// named; derivations of the exact half-power relations in docs/methods/damping-relations.md. A precondition
// that is not met is a broken promise of the caller and asserts; what a measurement may bring is returned as
// "nothing".

#include <cstddef>
#include <optional>

namespace ringwright {

/// Standard acceleration of free fall, m/s² (exact, 3rd CGPM 1901).
inline constexpr double standard_gravity = 9.80665;

// --- Decay
// --------------------------------------------------------------------------------------------------------

/// δ = 2πζ/√(1 − ζ²): logarithm of the ratio of two extremes one cycle apart. 0 ≤ ζ < 1.
[[nodiscard]] double logarithmic_decrement(double damping_ratio);
/// ζ = δ/√(4π² + δ²). Any finite δ, negative for a growing oscillation.
[[nodiscard]] double damping_ratio_from_decrement(double logarithmic_decrement);
/// δ = ln(earlier/later)/cycles; half cycles count as 0.5. Both extremes > 0 (moduli), cycles > 0.
[[nodiscard]] double decrement_between(double earlier, double later, double cycles);
/// Cycles until the amplitude has fallen to this fraction: −ln(fraction)/δ. 0 < fraction ≤ 1, ζ > 0.
[[nodiscard]] double cycles_to_fraction(double damping_ratio, double fraction);
/// f_d = f_n √(1 − ζ²), in the unit of f_n. 0 ≤ ζ < 1.
[[nodiscard]] double damped_frequency(double natural_frequency, double damping_ratio);
/// f_n = f_d/√(1 − ζ²), in the unit of f_d. 0 ≤ ζ < 1.
[[nodiscard]] double undamped_frequency(double damped_frequency, double damping_ratio);
/// σ = ζ ω_n in 1/s: the envelope of a decay is e^(−σt).
[[nodiscard]] double decay_rate(double natural_frequency_hz, double damping_ratio);
/// Share of the vibration energy that is lost in one cycle: 1 − e^(−2δ). 0 ≤ ζ < 1.
[[nodiscard]] double energy_lost_per_cycle(double damping_ratio);
/// Quality factor Q = 1/(2ζ). ζ > 0.
[[nodiscard]] double quality_factor(double damping_ratio);
/// Loss factor η = 2ζ of viscous damping at resonance; exact for the ratio of dissipated to stored energy at
/// ω_n.
[[nodiscard]] double loss_factor(double damping_ratio);
/// Time in s for the amplitude to fall by 60 dB: ln(1000)/σ. ζ > 0.
[[nodiscard]] double decay_time_60db(double natural_frequency_hz, double damping_ratio);
/// Coefficient of critical damping in N·s/m: c_c = 2√(k m).
[[nodiscard]] double critical_damping_coefficient(double stiffness, double mass);

/// Smallest relative standard deviation of δ from two extremes alone, per noise-to-first-extreme ratio σ/x₀,
/// when the later is `u` = nδ below the earlier: √(1 + e^(2u))/u. Equal independent noise; u > 0. Least at u
/// = 1.1089, where the later extreme is 0.33 of the earlier, the root of (u − 1)e^(2u) = 1.
[[nodiscard]] double two_extremes_relative_deviation(double u);

// --- Half-power bandwidth
// -----------------------------------------------------------------------------------------

/// Which frequency response is read: displacement, velocity or acceleration for a force (ISO 7626-1 terms).
enum class FrequencyResponse { receptance, mobility, accelerance };

/// The two frequencies at which the response has fallen to 1/√2 of its peak, low < high, Hz.
struct HalfPowerPoints {
    double low_hz = 0.0;
    double high_hz = 0.0;
};

struct FrequencyAndDamping {
    double natural_frequency_hz = 0.0;  ///< undamped
    double damping_ratio = 0.0;
};

/// sin 22.5°: beyond it a receptance has no lower, an accelerance no upper half-power point.
inline constexpr double half_power_damping_limit = 0.38268343236508977;

/// With ζ = sin θ. Receptance: f² = f_n²(cos 2θ ∓ sin 2θ); accelerance: the reciprocals, f² = f_n²/(cos 2θ ±
/// sin 2θ); both exist for 0 < ζ < sin 22.5°. Mobility: f = f_n(√(1 + ζ²) ∓ ζ) for any ζ > 0. Nothing
/// outside.
[[nodiscard]] std::optional<HalfPowerPoints> half_power_points(FrequencyResponse response,
                                                               const FrequencyAndDamping& oscillator);

/// The way back, exact at any damping. Receptance and accelerance: tan 2θ = (f₂² − f₁²)/(f₁² + f₂²), ζ = sin
/// θ, and f_n² = (f₁² + f₂²)/(2 cos 2θ) or 2 cos 2θ f₁²f₂²/(f₁² + f₂²). Mobility: f_n² = f₁f₂, ζ = (f₂ −
/// f₁)/(2 f_n). 0 < low < high, both finite.
[[nodiscard]] FrequencyAndDamping from_half_power_points(FrequencyResponse response,
                                                         const HalfPowerPoints& points);

/// Frequency of the peak of the response, in the unit of f_n: f_n√(1 − 2ζ²), f_n, f_n/√(1 − 2ζ²). Nothing
/// where ζ ≥ 1/√2 leaves a receptance or accelerance without a peak.
[[nodiscard]] std::optional<double> peak_frequency(FrequencyResponse response,
                                                   const FrequencyAndDamping& oscillator);

/// The light-damping width at half power from a width read n dB below the peak: divide by √(10^(n/10) − 1).
/// "3 dB" is not half power (3.0103 dB): the factor is 0.99763. n > 0. The n-dB rule of ASTM E756 (from
/// memory).
[[nodiscard]] double half_power_width_from(double width, double decibels_below_peak);

// --- Damping that is not viscous
// ----------------------------------------------------------------------------------

/// Viscous coefficient in N·s/m that takes the same energy a cycle as dry friction of force F (N) at
/// amplitude X (m) and angular frequency ω (rad/s): 4F/(πωX) (Jacobsen 1930; Den Hartog).
[[nodiscard]] double equivalent_viscous_of_friction(double friction_force, double amplitude,
                                                    double angular_frequency);
/// The same for a force c₂ v|v| (N·s²/m²): 8 c₂ ω X/(3π).
[[nodiscard]] double equivalent_viscous_of_quadratic(double quadratic_damping, double amplitude,
                                                     double angular_frequency);
/// ζ = c/(2√(k m)) of a viscous coefficient.
[[nodiscard]] double damping_ratio_of(double damping_coefficient, double stiffness, double mass);

/// Loss of amplitude in a full cycle under dry friction alone: 4F/k, m.
[[nodiscard]] double friction_loss_per_cycle(double friction_force, double stiffness);
/// Friction force from the loss of amplitude over whole cycles: k(x₀ − x_n)/(4n), N.
[[nodiscard]] double friction_force_from_loss(double first_amplitude, double last_amplitude, double cycles,
                                              double stiffness);
/// Half cycles until friction holds the mass for good: the least n ≥ 0 with x₀ − 2nF/k ≤ F/k. F > 0.
[[nodiscard]] std::size_t half_cycles_to_rest(double start_amplitude, double friction_force,
                                              double stiffness);

// --- Stiffness and mass
// -------------------------------------------------------------------------------------------

/// k = m ω_n², N/m (torsion: inertia in, N·m/rad out).
[[nodiscard]] double stiffness_of(double mass, double natural_frequency_hz);
/// f_n = √(k/m)/(2π), Hz.
[[nodiscard]] double natural_frequency_of(double stiffness, double mass);
/// Static deflection in m under its own weight of a mass with this natural frequency: g/ω_n².
[[nodiscard]] double static_deflection(double natural_frequency_hz, double gravity = standard_gravity);
/// f_n = √(g/δ_st)/(2π), Hz.
[[nodiscard]] double natural_frequency_from_deflection(double deflection, double gravity = standard_gravity);

/// Mass and stiffness from the natural frequency without and with an added mass (kg).
struct MassAndStiffness {
    double mass = 0.0;
    double stiffness = 0.0;
};
/// m = Δm f₂²/(f₁² − f₂²), k = m ω₁². Nothing unless f₁ > f₂ > 0 and Δm > 0.
[[nodiscard]] std::optional<MassAndStiffness> from_added_mass(double frequency_hz, double loaded_frequency_hz,
                                                              double added_mass);

/// Mass that moves with the end of a heavy uniform spring: m + m_s/3 (Rayleigh 1877).
[[nodiscard]] double moving_mass(double mass, double spring_mass);
}  // namespace ringwright
