#pragma once
// A decay with a second one beside it: another mode, or the slow answer of an AC-coupled sensor.

#include <cstddef>
#include <optional>
#include <span>

#include "event/decay_shape.hpp"

namespace ringwright::event_search {

/// offset + Σ over two shapes e^(−st)[A·C + B·S] at t = 0, 1, 2 …, fitted by least squares.
struct TwoTermFit {
    DecayShape first, second;
    double offset = 0.0;
    double first_cosine = 0.0, first_sine = 0.0, second_cosine = 0.0, second_sine = 0.0;
    double residual_sum = 0.0;  ///< of squares
    std::size_t points = 0;
    [[nodiscard]] double value_at(double t) const;
    [[nodiscard]] double residual_rms() const;
};

/// By variable projection from the given shapes. Nothing with fewer than 14 points or for a constant.
[[nodiscard]] std::optional<TwoTermFit> fit_two_terms(std::span<const double> points, const DecayShape& first,
                                                      const DecayShape& second);
/// The second shape from what the first leaves unexplained.
[[nodiscard]] std::optional<TwoTermFit> fit_two_terms(std::span<const double> points,
                                                      const DecayShape& first);
/// The amplitudes and the offset with both shapes held.
[[nodiscard]] TwoTermFit fit_two_amplitudes(std::span<const double> points, const DecayShape& first,
                                            const DecayShape& second);

}  // namespace ringwright::event_search
