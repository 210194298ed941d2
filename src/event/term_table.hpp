#pragma once
// The two terms of a decay at many equally spaced moments.

#include <span>
#include <vector>

#include "event/decay_shape.hpp"

namespace ringwright::event_search {

/// e^(−st) C(p,t) and e^(−st) S(p,t) at `first`, `first` + 1, … steps: of what decay_terms gives, without its
/// exponential and its sine at every step. Any z that obeys the free decay has z(t+1) = 2 e^(−s) C₁ z(t) −
/// e^(−2s) z(t−1), and so z(t+4) in z(t) and z(t−4): four at a time that do not wait for each other. Rounding
/// grows with the number of steps, to about 10⁻¹² of the terms at 200.
class TermTable {
  public:
    explicit TermTable(std::size_t count) : cosine_like_(count), sine_like_(count) {}

    /// Of the first `count` moments, or of all.
    void set(const DecayShape& shape, double first, std::size_t count);
    void set(const DecayShape& shape, double first) { set(shape, first, cosine_like_.size()); }

    [[nodiscard]] std::span<const double> cosine_like() const { return cosine_like_; }
    [[nodiscard]] std::span<const double> sine_like() const { return sine_like_; }

  private:
    std::vector<double> cosine_like_, sine_like_;
};

}  // namespace ringwright::event_search
