#include "analysis/series.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <set>

#include "ringwright/repeats.hpp"

namespace ringwright::analysis {
namespace {

bool usable(const Estimate& estimate) {
    return std::isfinite(estimate.value) && std::isfinite(estimate.standard_uncertainty) &&
           estimate.standard_uncertainty >= 0.0;
}

/// A recording without noise has no uncertainty; rounding of the arithmetic stands in for it, so that weights
/// stay finite.
Estimate with_rounding(Estimate estimate) {
    const double rounding = 1e-12 * std::max(std::abs(estimate.value), 1e-300);
    estimate.standard_uncertainty = std::max(estimate.standard_uncertainty, rounding);
    if (!(estimate.degrees_of_freedom > 0.0)) estimate.degrees_of_freedom = 1.0;
    return estimate;
}

bool answers(const MethodResult& result) {
    return result.status == MethodStatus::ok &&
           std::ranges::any_of(result.quantities, [](const auto& entry) { return usable(entry.second); });
}

template <typename Visit>
void for_each_event(const std::vector<RecordingIdentification>& recordings, Visit visit) {
    for (const RecordingIdentification& recording : recordings)
        for (const EventIdentification& event : recording.events) visit(recording, event);
}

std::size_t count_answers(const std::vector<RecordingIdentification>& recordings, const Method& method) {
    std::size_t count = 0;
    for_each_event(recordings, [&](const auto&, const EventIdentification& event) {
        if (answers(event.*method.result)) ++count;
    });
    return count;
}

std::string label_of(std::size_t number, const RecordingIdentification& recording,
                     const EventIdentification& event, bool name_file) {
    if (!name_file) return fmt::format("Release {} (at {:.4g} s)", number, event.start_s);
    return fmt::format("Release {} ({} at {:.4g} s)", number, recording.recording.origin.file, event.start_s);
}

ReleaseSeries series_of(const std::vector<Release>& releases, Quantity quantity) {
    ReleaseSeries series{std::string(name_of(quantity)), std::string(unit_of(quantity)), {}, {}, {}};
    const Recording& first = releases.front().recording->recording;
    bool comparable = true;
    for (const Release& release : releases) {
        const auto found = release.answer->quantities.find(quantity);
        if (found == release.answer->quantities.end() || !usable(found->second)) continue;
        const Recording& recording = release.recording->recording;
        comparable = comparable && recording.scaled == first.scaled && recording.quantity == first.quantity &&
                     release.event->event.start_amplitude > 0.0;
        series.releases.push_back(with_rounding(found->second));
        series.amplitudes.push_back(release.event->event.start_amplitude);
        series.labels.push_back(release.label);
    }
    if (!comparable) series.amplitudes.clear();
    return series;
}

void add_model_finding(Findings& findings, const std::vector<Release>& releases) {
    std::map<std::string, std::size_t> models;
    for (const Release& release : releases)
        if (!release.answer->model.empty()) ++models[release.answer->model];
    if (models.size() < 2) return;
    std::string list;
    for (const auto& [model, count] : models)
        list += fmt::format("{}{} for {}", list.empty() ? "" : ", ", model, count);
    findings.push_back({"models_differ", Severity::note,
                        fmt::format("Different damping models fit best in different releases ({}).", list)});
}

void add_disagreement(Findings& findings, const std::vector<Release>& releases) {
    std::size_t disagreeing = 0;
    for (const Release& release : releases)
        if (release.event->agreement.tested && !release.event->agreement.consistent) ++disagreeing;
    if (disagreeing == 0) return;
    findings.push_back({"methods_disagree", Severity::caution,
                        releases.size() == 1
                            ? std::string("The methods disagree; see the reading of the release.")
                            : fmt::format("The methods disagree in {} of {} releases; see the reading there.",
                                          disagreeing, releases.size())});
}

}  // namespace

const std::vector<Method>& methods_in_order_of_preference() {
    static const std::vector<Method> methods{
        {"curve_fit", "curve fit", &EventIdentification::curve_fit},
        {"logarithmic_decrement", "logarithmic decrement", &EventIdentification::logarithmic_decrement},
        {"half_power_bandwidth", "half-power bandwidth", &EventIdentification::half_power_bandwidth}};
    return methods;
}

const Method* choose_method(const std::vector<RecordingIdentification>& recordings) {
    std::size_t answered = 0;
    for_each_event(recordings, [&](const auto&, const EventIdentification& event) {
        if (std::ranges::any_of(methods_in_order_of_preference(),
                                [&](const Method& method) { return answers(event.*method.result); }))
            ++answered;
    });
    if (answered == 0) return nullptr;
    const Method* best = nullptr;
    std::size_t most = 0;
    for (const Method& method : methods_in_order_of_preference()) {
        const std::size_t count = count_answers(recordings, method);
        if (2 * count >= answered) return &method;
        if (count > most) best = &method, most = count;
    }
    return best;
}

std::vector<Release> releases_of(const std::vector<RecordingIdentification>& recordings,
                                 const Method& method) {
    std::vector<Release> releases;
    std::size_t number = 0;
    for_each_event(
        recordings, [&](const RecordingIdentification& recording, const EventIdentification& event) {
            ++number;
            const MethodResult& answer = event.*method.result;
            if (answers(answer))
                releases.push_back(
                    {&recording, &event, &answer, label_of(number, recording, event, recordings.size() > 1)});
        });
    return releases;
}

std::vector<Estimate> estimates_of(const std::vector<Release>& releases, Quantity quantity, Part part) {
    std::vector<Estimate> estimates;
    for (const Release& release : releases) {
        const Quantities& quantities = release.answer->*part;
        const auto found = quantities.find(quantity);
        if (found != quantities.end() && usable(found->second))
            estimates.push_back(with_rounding(found->second));
    }
    if (2 * estimates.size() < releases.size()) estimates.clear();
    return estimates;
}

std::vector<Quantity> quantities_of(const std::vector<Release>& releases, Part part) {
    std::set<Quantity> found;
    for (const Release& release : releases)
        for (const auto& [quantity, estimate] : release.answer->*part)
            if (usable(estimate)) found.insert(quantity);
    return {found.begin(), found.end()};
}

PoolingScale scale_of(Quantity quantity) {
    // The only quantity that is negative for a real article: a spring that softens.
    return quantity == Quantity::cubic_stiffness ? PoolingScale::linear : PoolingScale::logarithmic;
}

PooledSeries pool_series(const std::vector<Release>& releases, double confidence_level) {
    PooledSeries series;
    series.release_count = releases.size();
    for (const Quantity quantity : quantities_of(releases)) {
        const std::vector<Estimate> estimates = estimates_of(releases, quantity);
        if (!estimates.empty())
            series.pooled[quantity] = pool_repeats(estimates, confidence_level, scale_of(quantity));
    }
    for (const Quantity quantity : quantities_of(releases, &MethodResult::per_mass)) {
        const std::vector<Estimate> estimates = estimates_of(releases, quantity, &MethodResult::per_mass);
        if (!estimates.empty())
            series.per_mass[quantity] = pool_repeats(estimates, confidence_level, PoolingScale::linear);
    }
    return series;
}

Findings findings_of_series(const std::vector<Release>& releases, double confidence_level) {
    Findings findings;
    if (releases.size() == 1)
        findings.push_back(
            {"repeatability_not_tested", Severity::note,
             "One release only: how well the test repeats was not tested, and the interval holds for "
             "this release. Record three or more."});
    for (const Quantity quantity : {Quantity::natural_frequency, Quantity::damping_ratio}) {
        const Findings found = examine_repeats(series_of(releases, quantity), confidence_level);
        findings.insert(findings.end(), found.begin(), found.end());
    }
    add_model_finding(findings, releases);
    add_disagreement(findings, releases);
    return findings;
}

}  // namespace ringwright::analysis
