#pragma once
// Recordings of the kinds that come from a bench, each with its truth: drawn anew with every seed, in the
// form in which they reach the program (the text of a CSV file).

#include <cstdint>
#include <map>
#include <optional>
#include <string>
#include <vector>

#include "ringwright/estimate.hpp"
#include "support/simulator.hpp"

namespace simulated {

/// What is true of the first event. Without a mode there is none in the recording.
struct BenchTruth {
    std::size_t events = 1;
    std::optional<simulator::Mode> mode, second_mode;
    std::string model = "viscous";
    /// Coefficients of a law that is not viscous over the mass, as MethodResult::per_mass has them.
    std::map<ringwright::Quantity, double> per_mass;
    /// What was drawn, for people: "412 Hz, 38 dB, φ 0.7, 12 bits".
    std::string conditions;
};

struct BenchRecording {
    std::string csv;
    BenchTruth truth;
};

/// Largest relative errors of frequency and of damping (ratio, or each coefficient of a law) that a user
/// would put up with at this kind.
struct Tolerance {
    double frequency = 0.01, damping = 0.1;
};

struct BenchKind {
    std::string name;
    Tolerance tolerance;
    BenchRecording (*draw)(std::uint64_t seed);
};

/// Free decays of every kind, then recordings without one.
[[nodiscard]] const std::vector<BenchKind>& bench_kinds();

}  // namespace simulated
