#include "analysis/result.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <map>
#include <numbers>
#include <span>
#include <utility>

#include "analysis/series.hpp"
#include "ringwright/propagation.hpp"

namespace ringwright::analysis {
namespace {

/// Releases made with one added mass.
struct LoadingGroup {
    MeasuredValue added_mass;
    std::vector<Release> releases;
    PooledSeries series;
};

MeasuredValue added_mass_of(const RecordingIdentification& recording) {
    if (recording.added_mass) return *recording.added_mass;
    MeasuredValue none;
    none.text = "nothing";
    return none;
}

std::vector<LoadingGroup> group_by_loading(const std::vector<Release>& releases) {
    std::vector<LoadingGroup> groups;
    for (const Release& release : releases) {
        const MeasuredValue added = added_mass_of(*release.recording);
        auto group = std::ranges::find(
            groups, added.value, [](const LoadingGroup& candidate) { return candidate.added_mass.value; });
        if (group == groups.end()) {
            groups.push_back({added, {}, {}});
            group = std::prev(groups.end());
        }
        group->releases.push_back(release);
    }
    std::ranges::sort(groups, {}, [](const LoadingGroup& group) { return group.added_mass.value; });
    return groups;
}

/// Power of the clock's scale, of the sensor's gain and of gravity with which a quantity changes.
struct Exponents {
    double time = 0.0;
    double gain = 0.0;
    double gravity = 0.0;
};

/// Of what a drop says: read off a displacement, or off the time of the fall and the frequency.
Exponents exponents_of_drop(Quantity quantity, MeasuredQuantity sensor) {
    const double speed = quantity == Quantity::contact_velocity ? 1.0 : 0.0;
    if (sensor == MeasuredQuantity::displacement) return {speed, 1.0, 0.0};
    return {speed - 2.0, 0.0, 1.0};
}

Exponents exponents_of(Quantity quantity, MeasuredQuantity sensor) {
    switch (quantity) {
        case Quantity::natural_frequency:
        case Quantity::damped_frequency:
        case Quantity::decay_rate:
        case Quantity::slow_decay_rate:
            return {1.0, 0.0, 0.0};
        case Quantity::contact_velocity:
        case Quantity::static_deflection:
        case Quantity::drop_height:
            return exponents_of_drop(quantity, sensor);
        default:
            return {};
    }
}

/// The same of a damping law's coefficient over the moving mass; `order` is which derivative of the
/// displacement was measured.
Exponents exponents_over_mass(Quantity quantity, double order) {
    switch (quantity) {
        case Quantity::friction_force:
            return {2.0 - order, 1.0};
        case Quantity::quadratic_damping:
            return {order, -1.0};
        case Quantity::cubic_stiffness:
            return {2.0 + 2.0 * order, -2.0};
        default:
            return {1.0, 0.0};
    }
}

double order_of(MeasuredQuantity quantity) {
    switch (quantity) {
        case MeasuredQuantity::velocity:
        case MeasuredQuantity::angular_velocity:
            return 1.0;
        case MeasuredQuantity::acceleration:
        case MeasuredQuantity::angular_acceleration:
            return 2.0;
        default:
            return 0.0;
    }
}

double repeatability_share(const Pooled& pooled) {
    const double total = pooled.estimate.standard_uncertainty;
    if (!(total > 0.0)) return 0.0;
    const double within = std::min(pooled.within_standard_uncertainty / total, 1.0);
    return 1.0 - within * within;
}

/// The lines of a quantity's own variance: noise within the releases, scatter between them.
std::vector<BudgetLine> split_lines(Quantity quantity, const Pooled& pooled, std::size_t releases,
                                    const Contribution& added, const std::string& unit) {
    const double scatter = releases > 1 ? repeatability_share(pooled) : 0.0;
    std::vector<BudgetLine> lines;
    const auto add = [&](const char* source, double part, double degrees_of_freedom) {
        if (!(part > 0.0)) return;
        lines.push_back({quantity, source, pooled.estimate.value,
                         pooled.estimate.standard_uncertainty * std::sqrt(part), unit, added.sensitivity,
                         added.contribution * std::sqrt(part), added.share * part, degrees_of_freedom});
    };
    add("noise in the record", 1.0 - scatter, pooled.estimate.degrees_of_freedom);
    add("repeatability", scatter, pooled.estimate.degrees_of_freedom);
    return lines;
}

/// What all releases share.
struct Influences {
    double time_base = 0.0;  ///< relative standard uncertainty
    double gain = 0.0;       ///< the same
    Gravity gravity;
    MeasuredQuantity sensor = MeasuredQuantity::displacement;
};

/// An estimate with clock, gain and gravity added by the law of propagation.
struct Influenced {
    Propagated propagated;
    std::vector<ModelInput> inputs;
    Estimate estimate;
};

Influenced influenced(const Estimate& estimate, const Exponents& exponents, const Influences& influences,
                      double confidence_level, bool positive, const std::string& unit) {
    constexpr double infinite = std::numeric_limits<double>::infinity();
    const Gravity& gravity = influences.gravity;
    Influenced result;
    result.inputs = {
        {"", estimate.value, estimate.standard_uncertainty, estimate.degrees_of_freedom, unit,
         estimate.interval},
        {"time base", 0.0, influences.time_base, infinite, "1", std::nullopt},
        {"sensor gain", 0.0, influences.gain, infinite, "1", std::nullopt},
        {"gravity", gravity.value, gravity.standard_uncertainty, infinite, "m/s²", std::nullopt}};
    result.propagated = propagate(result.inputs, [&](std::span<const double> at) {
        return at[0] * std::pow(1.0 + at[1], exponents.time) * std::pow(1.0 + at[2], exponents.gain) *
               std::pow(at[3] / gravity.value, exponents.gravity);
    });
    const std::span<const Contribution> shared = std::span(result.propagated.contributions).subspan(1);
    const bool changed =
        std::ranges::any_of(shared, [](const Contribution& each) { return each.contribution > 0.0; });
    result.estimate =
        changed ? estimate_of(result.propagated, result.inputs, {}, confidence_level, positive) : estimate;
    return result;
}

/// The pooled quantity with clock, gain and gravity added, and its budget.
void add_pooled_quantity(PooledResult& result, Quantity quantity, const Pooled& pooled, std::size_t releases,
                         const Influences& influences, double confidence_level, bool torsional) {
    const std::string unit(unit_of(quantity, torsional));
    const bool positive =
        scale_of(quantity) == PoolingScale::logarithmic && pooled.estimate.interval.low > 0.0;
    const auto [propagated, inputs, estimate] =
        influenced(pooled.estimate, exponents_of(quantity, influences.sensor), influences, confidence_level,
                   positive, unit);
    result.quantities[quantity] = estimate;

    std::vector<BudgetLine> lines =
        split_lines(quantity, pooled, releases, propagated.contributions[0], unit);
    for (std::size_t i = 1; i < inputs.size(); ++i) {
        const Contribution& added = propagated.contributions[i];
        if (!(added.contribution > 0.0)) continue;
        lines.push_back({quantity, inputs[i].name, inputs[i].value, inputs[i].standard_uncertainty,
                         inputs[i].unit, added.sensitivity, added.contribution, added.share,
                         inputs[i].degrees_of_freedom});
    }
    result.budget.insert(result.budget.end(), lines.begin(), lines.end());
}

Influences influences_of(const AnalysisOptions& options, MeasuredQuantity sensor) {
    return {options.time_base_ppm.value_or(0.0) * 1e-6, options.sensor_gain_relative.value_or(0.0),
            gravity_of(options), sensor};
}

void add_pooled_quantities(PooledResult& result, const LoadingGroup& group, const AnalysisOptions& options,
                           bool torsional) {
    const Influences influences =
        influences_of(options, group.releases.front().recording->recording.quantity);
    for (const auto& [quantity, pooled] : group.series.pooled)
        add_pooled_quantity(result, quantity, pooled, group.releases.size(), influences,
                            options.identify.confidence_level, torsional);
}

Quantities law_over_mass(const LoadingGroup& group, const AnalysisOptions& options) {
    const MeasuredQuantity sensor = group.releases.front().recording->recording.quantity;
    const double order = order_of(sensor);
    Quantities quantities;
    for (const auto& [quantity, pooled] : group.series.per_mass)
        quantities[quantity] =
            influenced(pooled.estimate, exponents_over_mass(quantity, order), influences_of(options, sensor),
                       options.identify.confidence_level, false, "")
                .estimate;
    return quantities;
}

std::vector<Loading> loadings_of(const std::vector<LoadingGroup>& groups, const AnalysisOptions& options) {
    std::vector<Loading> loadings;
    for (const LoadingGroup& group : groups) {
        const auto frequency = group.series.pooled.find(Quantity::natural_frequency);
        const auto damping = group.series.pooled.find(Quantity::damping_ratio);
        if (frequency == group.series.pooled.end() || damping == group.series.pooled.end()) continue;
        Loading loading;
        loading.added_mass = group.added_mass;
        loading.natural_frequency = frequency->second.estimate;
        loading.damping_ratio = damping->second.estimate;
        if (group.releases.size() > 1) {
            loading.frequency_repeatability = repeatability_share(frequency->second);
            loading.damping_repeatability = repeatability_share(damping->second);
            loading.repeatability_degrees_of_freedom = static_cast<double>(group.releases.size() - 1);
        }
        loading.per_mass = law_over_mass(group, options);
        loadings.push_back(std::move(loading));
    }
    return loadings;
}

/// A pendulum's or shaft's answer: the inertia was given, or the sensor measured an angle and no mass was
/// given.
bool is_torsion_test(const std::vector<Release>& releases, const Article& article) {
    if (article.inertia) return true;
    return !article.mass && is_torsional(releases.front().recording->recording.quantity);
}

/// What was said of the article that does not go with the recordings.
void note_article(PooledResult& result, const std::vector<Release>& releases, const Article& article,
                  std::size_t loadings) {
    if (article.mass && is_torsional(releases.front().recording->recording.quantity))
        result.findings.push_back(
            {"mass_with_angle", Severity::caution,
             "The recording is of an angle, but a mass was given: the stiffness in N/m holds only where the "
             "article moves in a straight line. For a torsion test give --inertia in place of --mass."});
    if (article.spring_mass && !article.mass && !article.inertia && loadings < 2)
        result.findings.push_back({"spring_mass_alone", Severity::caution,
                                   "The spring mass alone gives no stiffness; give the moving mass too, with "
                                   "--mass or as mass under "
                                   "[article] in the test sheet."});
}

void append(Findings& findings, const Findings& more) {
    findings.insert(findings.end(), more.begin(), more.end());
}

void add_unanswered(PooledResult& result, const std::vector<RecordingIdentification>& recordings,
                    const Method& method) {
    std::size_t events = 0;
    for (const RecordingIdentification& recording : recordings) {
        events += recording.events.size();
        if (recording.events.empty())
            result.findings.push_back({"recording_without_event", Severity::caution,
                                       fmt::format("{} is not part of the result: {}",
                                                   recording.recording.origin.file, recording.reason)});
    }
    if (events > result.event_count)
        result.findings.push_back(
            {"releases_without_answer", Severity::caution,
             fmt::format("The {} does not apply to {} of {} releases, which are not part of the result.",
                         method.name, events - result.event_count, events)});
}

void add_properties(PooledResult& result, const std::vector<LoadingGroup>& groups,
                    const AnalysisOptions& options, bool torsional) {
    const std::vector<Loading> loadings = loadings_of(groups, options);
    PropertyResult properties =
        derive_properties(loadings, options.article, torsional, options.identify.confidence_level,
                          {options.time_base_ppm.value_or(0.0) * 1e-6});
    for (const auto& [quantity, estimate] : properties.quantities) result.quantities[quantity] = estimate;
    result.budget.insert(result.budget.end(), properties.budget.begin(), properties.budget.end());
    append(result.findings, properties.findings);
}

void note_loading_stated(PooledResult& result, const std::vector<LoadingGroup>& groups) {
    if (groups.size() < 2) return;
    const MeasuredValue& least = groups.front().added_mass;
    result.findings.push_back(
        {"loadings", Severity::note,
         fmt::format("{} loadings were recorded; frequency and damping ratio are those with {} added.",
                     groups.size(), least.text)});
}

std::string model_of(const std::vector<Release>& releases) {
    std::map<std::string, std::size_t> counts;
    for (const Release& release : releases) ++counts[release.answer->model];
    return std::ranges::max_element(counts, {}, [](const auto& entry) { return entry.second; })->first;
}

}  // namespace

Gravity gravity_of(const AnalysisOptions& options) {
    const std::optional<MeasuredValue>& gravity = options.article.gravity;
    return gravity ? Gravity{gravity->value, gravity->standard_uncertainty} : options.identify.gravity;
}

PooledResult combine(const std::vector<RecordingIdentification>& recordings, const AnalysisOptions& options) {
    PooledResult result;
    const Method* method = choose_method(recordings);
    if (method == nullptr) return result;
    const std::vector<Release> releases = releases_of(recordings, *method);
    const double confidence_level = options.identify.confidence_level;
    const bool torsional = is_torsion_test(releases, options.article);
    result.method = method->key;
    result.torsional = torsional;
    result.model = model_of(releases);
    result.event_count = releases.size();

    std::vector<LoadingGroup> groups = group_by_loading(releases);
    for (LoadingGroup& group : groups) {
        group.series = pool_series(group.releases, confidence_level);
        append(result.findings, findings_of_series(group.releases, confidence_level));
    }
    add_pooled_quantities(result, groups.front(), options, torsional);
    add_properties(result, groups, options, torsional);
    note_loading_stated(result, groups);
    note_article(result, releases, options.article, groups.size());
    add_unanswered(result, recordings, *method);
    return result;
}

}  // namespace ringwright::analysis
