#pragma once
// What the whole of identify makes of a recording from the bench, beside what is true of it.

#include <string>
#include <vector>

#include "support/bench_kinds.hpp"

namespace simulated {

/// One estimate beside its truth.
struct Miss {
    double relative = 0.0;  // error over truth
    bool held = false, beyond_four = false;
};

/// What the program made of one recording.
struct Outcome {
    std::size_t events = 0;
    bool answered = false, named = false, second_listed = true;
    std::string model;
    std::vector<Miss> frequency, damping;  // of each mode; damping: the ratio, or the coefficients of a law
    bool without_frequency = false, coefficient_missing = false;
    std::vector<std::string> findings;
};

/// Hands the text of the file to identify; `replicates` of the bootstrap, 0: curve fit only.
[[nodiscard]] Outcome judge(const BenchRecording& made, int replicates);

}  // namespace simulated
