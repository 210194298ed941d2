#include <fmt/format.h>

#include <cmath>
#include <nlohmann/json.hpp>

#include "report/text_table.hpp"
#include "ringwright/ledger_report.hpp"

namespace ringwright {
namespace {

using nlohmann::ordered_json;
using report::Align;
using report::TextTable;

ordered_json index_json(const CapabilityIndex& index) {
    return {{"value", index.value}, {"interval", {index.interval.low, index.interval.high}}};
}

std::vector<std::string> index_row(const char* name, const CapabilityIndex& index, const char* meaning) {
    return {name, fmt::format("{:.3f}", index.value),
            fmt::format("[{:.3f}, {:.3f}]", index.interval.low, index.interval.high), meaning};
}

std::string with_unit(std::optional<double> value, std::string_view unit) {
    if (!value) return "none";
    return fmt::format("{:.6g}{}", *value, unit == "1" ? "" : fmt::format(" {}", unit));
}

std::vector<std::string> component_row(const char* name, const VarianceComponent& component, double total) {
    return {name, fmt::format("{:.4g}", std::sqrt(component.variance)),
            fmt::format("[{:.4g}, {:.4g}]", std::sqrt(component.interval.low),
                        std::sqrt(component.interval.high)),
            total > 0.0 ? fmt::format("{:.1f} %", 100.0 * component.variance / total) : "—"};
}

std::string variance_table(const GaugeStudy& study) {
    TextTable table{
        {Align::left, Align::right, Align::right, Align::right, Align::right, Align::right}, {}, true};
    table.rows.push_back({"source", "sum of squares", "ν", "mean square", "F", "p-value"});
    for (const VarianceRow& row : study.table)
        table.rows.push_back({row.source, fmt::format("{:.5g}", row.sum_of_squares),
                              fmt::format("{:g}", row.degrees_of_freedom),
                              fmt::format("{:.5g}", row.mean_square),
                              row.f ? fmt::format("{:.4g}", *row.f) : "",
                              row.p_value ? fmt::format("{:.3g}", *row.p_value) : ""});
    return report::to_text(table, 2);
}

ordered_json component_json(const VarianceComponent& component) {
    return {{"variance", component.variance},
            {"interval", {component.interval.low, component.interval.high}}};
}

ordered_json row_json(const VarianceRow& row) {
    ordered_json json{{"source", row.source},
                      {"sum_of_squares", row.sum_of_squares},
                      {"degrees_of_freedom", row.degrees_of_freedom},
                      {"mean_square", row.mean_square}};
    if (row.f) json["f"] = *row.f;
    if (row.p_value) json["p_value"] = *row.p_value;
    return json;
}

}  // namespace

std::string capability_text(const Capability& capability, Quantity quantity, std::string_view unit,
                            std::optional<double> lower, std::optional<double> upper,
                            double confidence_level) {
    std::string text =
        fmt::format("Capability of the {}, {} entries; limits: lower {}, upper {}\n", name_of(quantity),
                    capability.count, with_unit(lower, unit), with_unit(upper, unit));
    text += fmt::format("  mean {:.6g}, short-term sigma {:.4g}, long-term sigma {:.4g}\n\n", capability.mean,
                        capability.within_sigma, capability.overall_sigma);
    TextTable table{{Align::left, Align::right, Align::left, Align::left}, {}, true};
    table.rows.push_back({"index", "value", fmt::format("{:.4g} % interval", 100.0 * confidence_level), ""});
    if (capability.cp) table.rows.push_back(index_row("Cp", *capability.cp, "short term, width alone"));
    table.rows.push_back(index_row("Cpk", capability.cpk, "short term, nearer limit"));
    if (capability.pp) table.rows.push_back(index_row("Pp", *capability.pp, "long term, width alone"));
    table.rows.push_back(index_row("Ppk", capability.ppk, "long term, nearer limit"));
    return text + report::to_text(table, 2);
}

ordered_json to_json(const Capability& capability) {
    ordered_json json{{"count", capability.count},
                      {"mean", capability.mean},
                      {"within_sigma", capability.within_sigma},
                      {"overall_sigma", capability.overall_sigma}};
    if (capability.cp) json["cp"] = index_json(*capability.cp);
    json["cpk"] = index_json(capability.cpk);
    if (capability.pp) json["pp"] = index_json(*capability.pp);
    json["ppk"] = index_json(capability.ppk);
    return json;
}

std::string gauge_text(const GaugeStudy& study, Quantity quantity, std::string_view unit,
                       double confidence_level) {
    std::string text = fmt::format(
        "Gauge study of the {}: {} articles, {} operator{}, {} measurements of each\n\n", name_of(quantity),
        study.articles, study.operators, study.operators == 1 ? "" : "s", study.repeats);
    text += variance_table(study) + "\n";
    const double total = study.gauge.variance + study.article_variation.variance;
    TextTable table{{Align::left, Align::right, Align::left, Align::right}, {}, true};
    table.rows.push_back({"part of the scatter", unit == "1" ? "sigma" : fmt::format("sigma / {}", unit),
                          fmt::format("{:.4g} % interval", 100.0 * confidence_level), "share of variance"});
    table.rows.push_back(component_row("repeatability", study.repeatability, total));
    if (study.operators > 1) {
        table.rows.push_back(component_row("reproducibility", study.reproducibility, total));
        table.rows.push_back(component_row("  of operators", study.operators_alone, total));
        table.rows.push_back(component_row("  of operators with articles", study.interaction, total));
    }
    table.rows.push_back(component_row("the whole measurement", study.gauge, total));
    table.rows.push_back(component_row("articles", study.article_variation, total));
    text += report::to_text(table, 2) + "\n";
    return text + fmt::format(
                      "  The measurement takes {:.1f} % of the total sigma and tells about {:.1f} classes of "
                      "articles apart.\n",
                      100.0 * study.gauge_share, study.distinct_classes);
}

ordered_json to_json(const GaugeStudy& study) {
    ordered_json json{{"articles", study.articles},
                      {"operators", study.operators},
                      {"repeats", study.repeats},
                      {"table", ordered_json::array()}};
    for (const VarianceRow& row : study.table) json["table"].push_back(row_json(row));
    json["repeatability"] = component_json(study.repeatability);
    json["reproducibility"] = component_json(study.reproducibility);
    json["operators_variation"] = component_json(study.operators_alone);
    json["interaction"] = component_json(study.interaction);
    json["measurement"] = component_json(study.gauge);
    json["articles_variation"] = component_json(study.article_variation);
    json["measurement_share_of_sigma"] = study.gauge_share;
    json["distinct_classes"] = study.distinct_classes;
    return json;
}

}  // namespace ringwright
