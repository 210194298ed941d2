#include "support/bench_judgement.hpp"

#include <cmath>
#include <optional>
#include <utility>

#include "ringwright/analysis.hpp"

namespace simulated {

using namespace ringwright;

namespace {

Miss compare(const Estimate& estimate, double truth) {
    const double error = estimate.value - truth;
    return {error / truth, estimate.interval.low <= truth && truth <= estimate.interval.high,
            std::abs(error) > 4.0 * estimate.standard_uncertainty};
}

const Quantities* nearest_mode(const MethodResult& fit, double frequency_hz) {
    const Quantities* nearest = nullptr;
    double least = 0.05;  // of the frequency
    for (const Mode& mode : fit.modes) {
        const auto found = mode.quantities.find(Quantity::natural_frequency);
        if (found == mode.quantities.end()) continue;
        const double away = std::abs(found->second.value / frequency_hz - 1.0);
        if (away < least) least = away, nearest = &mode.quantities;
    }
    return nearest;
}

void compare_mode(Outcome& outcome, const Quantities& quantities, const simulator::Mode& truth) {
    const auto f = quantities.find(Quantity::natural_frequency), z = quantities.find(Quantity::damping_ratio);
    if (f != quantities.end()) outcome.frequency.push_back(compare(f->second, truth.frequency_hz));
    if (z != quantities.end()) outcome.damping.push_back(compare(z->second, truth.damping_ratio));
    outcome.without_frequency |= f == quantities.end();
}

void compare_law(Outcome& outcome, const Quantities& quantities, const MethodResult& fit,
                 const BenchTruth& truth) {
    const auto f = quantities.find(Quantity::natural_frequency);
    if (f != quantities.end()) outcome.frequency.push_back(compare(f->second, truth.mode->frequency_hz));
    for (const auto& [quantity, value] : truth.per_mass) {
        const auto found = fit.per_mass.find(quantity);
        if (found != fit.per_mass.end())
            outcome.damping.push_back(compare(found->second, value));
        else
            outcome.coefficient_missing = true;
    }
}

/// Each true mode beside the listed one that is nearest: of two of like size either may come first.
void compare_modes(Outcome& outcome, const Quantities& stated, const MethodResult& fit,
                   const BenchTruth& truth) {
    const Quantities* first = nearest_mode(fit, truth.mode->frequency_hz);
    const Quantities* second = nearest_mode(fit, truth.second_mode->frequency_hz);
    compare_mode(outcome, first != nullptr ? *first : stated, *truth.mode);
    outcome.second_listed = second != nullptr;
    if (second != nullptr) compare_mode(outcome, *second, *truth.second_mode);
}

}  // namespace

Outcome judge(const BenchRecording& made, int replicates) {
    AnalysisOptions options;
    options.identify.replicates = replicates;
    options.jobs = 1;
    std::vector<RecordingInput> input;
    input.push_back({read_recording_from_memory(made.csv, "drawn"), std::nullopt});
    const Identification identification = identify(std::move(input), options);
    const RecordingIdentification& recording = identification.recordings.front();
    Outcome outcome;
    outcome.events = recording.events.size();
    for (const EventIdentification& event : recording.events)
        for (const Finding& finding : event.findings) outcome.findings.push_back(finding.code);
    outcome.answered = identification.answered();
    if (!outcome.answered || !made.truth.mode) return outcome;
    const MethodResult& fit = recording.events.front().curve_fit;
    outcome.model = identification.result.model;
    outcome.named = outcome.model == made.truth.model;
    if (made.truth.second_mode)
        compare_modes(outcome, identification.result.quantities, fit, made.truth);
    else if (!made.truth.per_mass.empty())
        compare_law(outcome, identification.result.quantities, fit, made.truth);
    else
        compare_mode(outcome, identification.result.quantities, *made.truth.mode);
    return outcome;
}

}  // namespace simulated
