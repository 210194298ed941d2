// Figures that need nothing but the result as JSON.

#include <fmt/format.h>

#include "drawing/document.hpp"
#include "drawing/document_parts.hpp"
#include "drawing/quality_figures.hpp"
#include "drawing/result_reading.hpp"

namespace ringwright {
namespace drawing {
namespace {

constexpr const char* compared_quantities[] = {"natural_frequency", "damping_ratio"};
/// More releases than this are shown by the method of the result alone.
constexpr std::size_t most_releases_in_full = 8;
constexpr std::size_t most_releases = 60;

void add_release(MethodsFigure& figure, const Json& event, const std::string& group,
                 const std::string& only) {
    for (const MethodKey& method : method_keys) {
        if (!only.empty() && only != method.key) continue;
        for (std::size_t i = 0; i < figure.columns.size(); ++i) {
            MethodRow row{group, method.name, std::nullopt, false};
            const Json& entry = at(event, {"methods", method.key, "quantities", compared_quantities[i]});
            if (entry.is_object()) row.value = shown_value(entry);
            figure.columns[i].rows.push_back(row);
        }
    }
}

std::size_t release_count(const Json& result) {
    std::size_t count = 0;
    for (const Json& recording : list_at(result, {"recordings"}))
        count += list_at(recording, {"events"}).size();
    return count;
}

NamedFigure methods_figure(const Json& result) {
    MethodsFigure figure;
    for (const char* key : compared_quantities)
        figure.columns.push_back(
            {quantity_name(key), std::string(key) == "natural_frequency" ? "Hz" : "1", {}});
    const std::size_t count = release_count(result);
    const std::string method = text_at(result, {"result", "method"});
    std::size_t number = 0;
    for (const Json& recording : list_at(result, {"recordings"}))
        for (const Json& event : list_at(recording, {"events"}))
            if (++number <= most_releases)
                add_release(figure, event, fmt::format("release {}", number),
                            count > most_releases_in_full ? method : "");
    const std::string name = at(result, {"result", "event_count"}) == 1 ? "result" : "pooled";
    for (std::size_t i = 0; i < figure.columns.size(); ++i) {
        const Json& entry = at(result, {"result", "quantities", compared_quantities[i]});
        MethodRow row{name, method_name(method), std::nullopt, true};
        if (entry.is_object()) row.value = shown_value(entry);
        figure.columns[i].rows.push_back(row);
    }
    std::string caption = "What each method answers for each release, with its interval, and the result.";
    if (number > most_releases)
        caption += fmt::format(" The first {} of {} releases are drawn.", most_releases, number);
    return {"methods", "The methods on one scale", caption, figure};
}

JudgedValue judged_value(const Json& limit, const Json& result) {
    const std::string key = text_at(limit, {"quantity"});
    JudgedValue judged;
    judged.quantity = quantity_name(key);
    judged.unit = text_at(limit, {"unit"});
    const Json& entry = at(result, {"result", "quantities", key.c_str()});
    if (entry.is_object()) judged.value = shown_value(entry);
    judged.value.value = number_at(limit, {"value"}).value_or(judged.value.value);
    if (judged.unit.empty()) judged.unit = text_at(entry, {"unit"});
    judged.lower_limit = number_at(limit, {"lower"});
    judged.upper_limit = number_at(limit, {"upper"});
    judged.lower_acceptance = number_at(limit, {"acceptance_lower"});
    judged.upper_acceptance = number_at(limit, {"acceptance_upper"});
    judged.decision = text_at(limit, {"decision"});
    return judged;
}

}  // namespace
}  // namespace drawing

std::vector<NamedFigure> figures_of_result(const std::string& result_json, const std::string& file) {
    using namespace drawing;
    const Json result = parsed_result(result_json, file);
    const std::string schema = text_at(result, {"schema"});
    if (schema == schemas::comparison) return {comparison_figure(result)};
    if (schema == schemas::chart) return {chart_figure(result)};
    if (schema == schemas::gauge) return {gauge_figure(result)};
    std::vector<NamedFigure> figures;
    if (!text_at(result, {"result", "method"}).empty()) figures.push_back(methods_figure(result));
    VerdictFigure verdict;
    for (const Json& limit : list_at(result, {"verdict", "limits"}))
        if (number_at(limit, {"value"})) verdict.values.push_back(judged_value(limit, result));
    if (!verdict.values.empty())
        figures.push_back({"verdict", "The result against its limits",
                           "Value and interval against the limits; in the guard band, where one is kept, the "
                           "uncertainty is too large to decide.",
                           verdict});
    return figures;
}

}  // namespace ringwright
