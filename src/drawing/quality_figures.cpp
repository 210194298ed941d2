#include "drawing/quality_figures.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <set>

namespace ringwright::drawing {
namespace {

constexpr const char* asked_first[] = {"natural_frequency", "damping_ratio", "slow_decay_rate", "stiffness",
                                       "damping_coefficient"};
constexpr std::size_t most_compared = 4;

ComparedValue compared_value(const std::string& key, const Json& entry) {
    ComparedValue compared;
    compared.quantity = quantity_name(key);
    compared.unit = text_at(entry, {"before", "unit"});
    compared.before = shown_value(at(entry, {"before"}));
    compared.after = shown_value(at(entry, {"after"}));
    if (const Json& ratio = at(entry, {"ratio"}); ratio.is_object()) {
        ShownValue change = shown_value(ratio);
        change.value -= 1.0, change.low -= 1.0, change.high -= 1.0;
        compared.change = change;
    }
    compared.changed = at(entry, {"changed"}) == true;
    return compared;
}

/// A signal is shown at the entry that completes it.
std::set<long long> flagged_entries(const Json& chart) {
    std::set<long long> flagged;
    for (const Json& signal : list_at(chart, {"signals"}))
        if (const Json& entry = at(signal, {"last_entry"}); entry.is_number_integer())
            flagged.insert(entry.get<long long>());
    return flagged;
}

ChartPoint chart_point(const Json& value, const std::set<long long>& flagged) {
    ChartPoint point{text_at(value, {"day"}), {number_at(value, {"value"}).value_or(0.0)}, false};
    if (const auto u = number_at(value, {"standard_uncertainty"}); u && *u > 0.0) {
        point.value.low = point.value.value - 2.0 * *u;
        point.value.high = point.value.value + 2.0 * *u;
    }
    const Json& entry = at(value, {"entry"});
    point.flagged = entry.is_number_integer() && flagged.contains(entry.get<long long>());
    return point;
}

void add_part(std::vector<VariationPart>& parts, const Json& study, const char* key, const char* source) {
    const Json& component = at(study, {key});
    const auto variance = number_at(component, {"variance"});
    if (!variance) return;
    VariationPart part{source, *variance, 0.0, 0.0, 0.0};
    if (const auto& ends = list_at(component, {"interval"});
        ends.size() == 2 && ends[0].is_number() && ends[1].is_number())
        part.low = ends[0].get<double>(), part.high = ends[1].get<double>();
    parts.push_back(part);
}

}  // namespace

std::vector<std::string> main_quantities(const Json& comparison) {
    std::vector<std::string> keys;
    for (const char* key : asked_first)
        if (keys.size() < most_compared && at(comparison, {"quantities", key}).is_object())
            keys.emplace_back(key);
    const Json& quantities = at(comparison, {"quantities"});
    if (keys.empty() && quantities.is_object())
        for (const auto& [key, entry] : quantities.items())
            if (keys.size() < most_compared && entry.is_object()) keys.push_back(key);
    return keys;
}

NamedFigure comparison_figure(const Json& comparison) {
    ComparisonFigure figure;
    for (const std::string& key : main_quantities(comparison))
        figure.values.push_back(compared_value(key, at(comparison, {"quantities", key.c_str()})));
    return {
        "comparison", "Before against after",
        "Value and interval before and after, each quantity on its own scale, and the change where one is "
        "shown.",
        figure};
}

NamedFigure chart_figure(const Json& chart) {
    ChartFigure figure;
    figure.quantity = quantity_name(text_at(chart, {"quantity"}));
    figure.unit = text_at(chart, {"unit"});
    figure.centre = number_at(chart, {"center"});
    figure.lower_control = number_at(chart, {"lower_limit"});
    figure.upper_control = number_at(chart, {"upper_limit"});
    figure.lower_limit = number_at(chart, {"lower_specification"});
    figure.upper_limit = number_at(chart, {"upper_specification"});
    const std::set<long long> flagged = flagged_entries(chart);
    const auto& values = list_at(chart, {"values"});
    const std::size_t first = values.size() > most_charted ? values.size() - most_charted : 0;
    for (std::size_t i = first; i < values.size(); ++i)
        figure.points.push_back(chart_point(values[i], flagged));
    std::string caption =
        "The entries in the order of their tests; bars are twice the standard uncertainty. A mark in a "
        "frame completes a signal.";
    if (figure.lower_limit || figure.upper_limit)
        caption +=
            " The control limits come of the values themselves, the limits are specified; a triangle lies "
            "outside of them.";
    if (first > 0) caption += fmt::format(" The last {} of {} are drawn.", most_charted, values.size());
    return {"chart", "Control chart", caption, figure};
}

std::vector<VariationPart> variation_parts(const Json& study) {
    std::vector<VariationPart> parts;
    add_part(parts, study, "repeatability", "repeatability");
    if (number_at(study, {"operators"}).value_or(1.0) > 1.0) {
        add_part(parts, study, "operators_variation", "operators");
        add_part(parts, study, "interaction", "operators with articles");
    }
    add_part(parts, study, "articles_variation", "articles");
    double total = 0.0;
    for (const VariationPart& part : parts) total += part.variance;
    for (VariationPart& part : parts) part.share = total > 0.0 ? part.variance / total : 0.0;
    return parts;
}

NamedFigure gauge_figure(const Json& study) {
    GaugeFigure figure;
    figure.quantity = quantity_name(text_at(study, {"quantity"}));
    figure.unit = text_at(study, {"unit"});
    for (const Json& reading : list_at(study, {"readings"})) {
        GaugeReading shown{text_at(reading, {"serial"}), text_at(reading, {"operator"}), {}};
        for (const Json& value : list_at(reading, {"values"}))
            if (value.is_number()) shown.values.push_back(value.get<double>());
        figure.readings.push_back(std::move(shown));
    }
    for (const VariationPart& part : variation_parts(study))
        figure.shares.push_back({part.source, part.share});
    return {"gauge", "Gauge study",
            "Above, what each operator measured on each article; below, how the whole variance divides.",
            figure};
}

}  // namespace ringwright::drawing
