#pragma once
// Random numbers that are the same on every machine: a written generator, a written seed.

#include <cmath>
#include <cstdint>
#include <numbers>

namespace ringwright::test {

/// SplitMix64 (Steele, Lea & Flood 2014), normal draws by Box and Muller (1958).
class Draws {
  public:
    explicit Draws(std::uint64_t seed) : state_(seed) {}

    std::uint64_t bits() {
        state_ += 0x9E3779B97F4A7C15U;
        std::uint64_t mixed = state_;
        mixed = (mixed ^ (mixed >> 30U)) * 0xBF58476D1CE4E5B9U;
        mixed = (mixed ^ (mixed >> 27U)) * 0x94D049BB133111EBU;
        return mixed ^ (mixed >> 31U);
    }
    /// In (0, 1).
    double uniform() { return (static_cast<double>(bits() >> 11U) + 0.5) * 0x1.0p-53; }
    double normal() {
        const double radius = std::sqrt(-2.0 * std::log(uniform()));
        return radius * std::cos(2.0 * std::numbers::pi * uniform());
    }
    /// Student's t with a whole number of degrees of freedom.
    double student(int degrees_of_freedom) {
        return normal() / std::sqrt(chi_squared(degrees_of_freedom) / degrees_of_freedom);
    }
    double chi_squared(int degrees_of_freedom) {
        double sum = 0.0;
        for (int i = 0; i < degrees_of_freedom; ++i) {
            const double draw = normal();
            sum += draw * draw;
        }
        return sum;
    }

  private:
    std::uint64_t state_;
};

}  // namespace ringwright::test
