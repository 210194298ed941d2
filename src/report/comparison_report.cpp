#include <fmt/format.h>

#include <cmath>
#include <nlohmann/json.hpp>

#include "report/finding_text.hpp"
#include "report/number_text.hpp"
#include "report/text_table.hpp"
#include "ringwright/result_json.hpp"
#include "ringwright/verdict_report.hpp"

namespace ringwright {
namespace {

using nlohmann::ordered_json;
using report::Align;
using report::TextTable;

ordered_json equivalence_json(const Equivalence& equivalence) {
    return {{"margin", equivalence.margin.size},
            {"relative", equivalence.margin.relative},
            {"equivalent", equivalence.equivalent},
            {"p_value", equivalence.p_value}};
}

ordered_json quantity_json(const QuantityComparison& compared, std::string_view unit) {
    ordered_json json{{"before", to_json(compared.before, unit)},
                      {"after", to_json(compared.after, unit)},
                      {"difference", to_json(compared.difference, unit)}};
    if (compared.ratio) json["ratio"] = to_json(*compared.ratio, "1");
    json["changed"] = compared.changed;
    json["p_value"] = compared.p_value;
    if (compared.equivalence) json["equivalence"] = equivalence_json(*compared.equivalence);
    return json;
}

std::string p_text(double p) {
    return p < 1e-4 ? "< 0.0001" : fmt::format("{:.4f}", p);
}

std::string margin_text(const EquivalenceMargin& margin, std::string_view unit) {
    if (margin.relative) return fmt::format("{:.4g} %", 100.0 * margin.size);
    return fmt::format("{:.4g}{}", margin.size, unit == "1" ? "" : fmt::format(" {}", unit));
}

std::string sentence(Quantity quantity, const QuantityComparison& compared, std::string_view unit,
                     double level) {
    std::string text = compared.changed
                           ? fmt::format("changed by {}", report::with_interval(compared.difference, unit))
                           : fmt::format("no change shown; the difference is {}",
                                         report::with_interval(compared.difference, unit));
    if (compared.ratio)
        text += fmt::format(", after is {:.4g} times before [{:.4g}, {:.4g}]", compared.ratio->value,
                            compared.ratio->interval.low, compared.ratio->interval.high);
    text += fmt::format(" ({:.4g} % confidence).", 100.0 * level);
    if (compared.equivalence)
        text += fmt::format(" {} the same within {} (p {}{}).",
                            compared.equivalence->equivalent ? "Shown to be" : "Not shown to be",
                            margin_text(compared.equivalence->margin, unit),
                            p_text(compared.equivalence->p_value).starts_with('<') ? "" : "= ",
                            p_text(compared.equivalence->p_value));
    return report::wrapped(fmt::format("  {}: ", name_of(quantity)), text);
}

std::string number(double value) {
    return std::isfinite(value) ? fmt::format("{}", value) : std::string();
}

std::string estimate_cells(const Estimate& estimate) {
    return fmt::format("{},{},{},{}", number(estimate.value), number(estimate.standard_uncertainty),
                       number(estimate.interval.low), number(estimate.interval.high));
}

}  // namespace

ordered_json to_json(const Comparison& comparison, bool torsional) {
    ordered_json json = ordered_json::object();
    for (const auto& [quantity, compared] : comparison.quantities)
        json[std::string(key_of(quantity))] = quantity_json(compared, unit_of(quantity, torsional));
    return json;
}

std::string to_text(const Comparison& comparison, bool torsional) {
    TextTable table{
        {Align::left, Align::left, Align::left, Align::left, Align::right, Align::left}, {}, true};
    table.rows.push_back({"quantity", "before", "after", "unit", "p-value", "changed"});
    std::string sentences;
    const double level = comparison.options.confidence_level;
    for (const auto& [quantity, compared] : comparison.quantities) {
        const std::string_view unit = unit_of(quantity, torsional);
        table.rows.push_back({std::string(name_of(quantity)), report::in_table(compared.before),
                              report::in_table(compared.after), std::string(unit), p_text(compared.p_value),
                              compared.changed ? "yes" : "no"});
        sentences += sentence(quantity, compared, unit, level);
    }
    std::string text = fmt::format("Before against after\n{}\n{}\n", report::to_text(table, 2), sentences);
    text +=
        report::wrapped("  ", fmt::format("A quantity that did not change is called changed in {:.4g} % of "
                                          "comparisons.",
                                          100.0 * (1.0 - level)));
    report::GatheredFindings findings;
    findings.add(comparison.findings, "");
    const std::string found = findings.text();
    return found.empty() ? text : fmt::format("{}\n{}", text, found);
}

std::string to_csv(const Comparison& comparison, bool torsional) {
    std::string text = "quantity,unit";
    for (const char* part : {"before", "after", "difference", "ratio"})
        text += fmt::format(",{0},{0}_standard_uncertainty,{0}_low,{0}_high", part);
    text += ",p_value,changed,equivalent\r\n";
    for (const auto& [quantity, compared] : comparison.quantities) {
        text += fmt::format("{},{},{},{},{},{},{},{},{}\r\n", key_of(quantity), unit_of(quantity, torsional),
                            estimate_cells(compared.before), estimate_cells(compared.after),
                            estimate_cells(compared.difference),
                            compared.ratio ? estimate_cells(*compared.ratio) : std::string(",,,"),
                            number(compared.p_value), compared.changed ? "true" : "false",
                            !compared.equivalence              ? ""
                            : compared.equivalence->equivalent ? "true"
                                                               : "false");
    }
    return text;
}

}  // namespace ringwright
