#pragma once
// The motion of a mass under a damping law that need not be viscous, with its derivatives by the parameters.

#include <Eigen/Core>
#include <array>
#include <cstddef>
#include <string>
#include <vector>

namespace ringwright::identify {

/// Parameters of the equation of motion over the mass, about the rest position, in units in which time,
/// length and mass are of the order of one:
///   a = −W² x − K x³ − f sgn(v) − 2 S v − 2 D |v| − Q v|v|,   W = e^w.
/// D sets the two directions apart: S + D damps while the recorded quantity's displacement grows (v > 0), S −
/// D while it falls. At v = 0 the mass stays for good where |W² x + K x³| ≤ f. f ≥ 0, Q ≥ 0.
enum class LawParameter : std::size_t {
    displacement,   ///< x at t = 0
    velocity,       ///< v at t = 0
    log_frequency,  ///< w
    damping,        ///< S
    friction,       ///< f
    asymmetry,      ///< D
    quadratic,      ///< Q
    cubic,          ///< K
};
inline constexpr std::size_t law_parameter_count = 8;

/// Terms beside spring and viscous damping.
struct LawTerms {
    bool friction = false, asymmetry = false, quadratic = false, cubic = false;
    [[nodiscard]] int count() const { return friction + asymmetry + quadratic + cubic; }
    [[nodiscard]] bool has(LawParameter parameter) const;
    [[nodiscard]] LawTerms with(LawParameter parameter) const;
};

/// "viscous", "viscous+friction", "two-way+friction", "viscous+hardening" (K > 0), "viscous+softening" …
[[nodiscard]] std::string name_of(const LawTerms& terms, double cubic);

struct DampingLaw {
    std::array<double, law_parameter_count> values{};
    [[nodiscard]] double operator[](LawParameter p) const { return values[static_cast<std::size_t>(p)]; }
    double& operator[](LawParameter p) { return values[static_cast<std::size_t>(p)]; }
    [[nodiscard]] double angular_frequency() const;  ///< W
};

/// Which derivative of the displacement is measured.
enum class Measured { displacement, velocity, acceleration };

/// The measured quantity at each time, and its derivative by each parameter asked for.
struct LawMotion {
    Eigen::VectorXd value;
    Eigen::MatrixXd derivative;  ///< one column a parameter
    std::vector<double> reversals;
    bool sticks = false;  ///< friction holds the mass at `stick_time`
    double stick_time = 0.0;
    /// False: the motion runs away, as a softening spring lets it beyond its crest, or is too stiff for a
    /// swing.
    bool valid = false;
};

/// Integrates from t = 0 with Boost.Odeint's dense-output Dormand–Prince method, error at most about
/// `tolerance` of the parameters' unit, stopping at each reversal of the velocity, where friction and damping
/// change; the derivatives are integrated along (variational equations) and carried across each reversal.
/// Precondition: times ascend, all ≥ 0.
[[nodiscard]] LawMotion move(const DampingLaw& law, Measured measured, const std::vector<double>& times,
                             const std::vector<LawParameter>& by, double tolerance = 1e-9);

}  // namespace ringwright::identify
