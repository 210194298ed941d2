#include "ringwright/verdict_report.hpp"

#include <fmt/format.h>

#include <nlohmann/json.hpp>

#include "report/finding_text.hpp"
#include "report/number_text.hpp"
#include "report/text_table.hpp"
#include "ringwright/result_json.hpp"

namespace ringwright {
namespace {

using nlohmann::ordered_json;
using report::Align;
using report::TextTable;

void put(ordered_json& object, const char* key, const std::optional<double>& number) {
    if (number) object[key] = *number;
}

ordered_json remedy_json(const Remedy& remedy) {
    ordered_json json{{"standard_uncertainty_needed", remedy.standard_uncertainty_needed}};
    if (remedy.more_releases) json["more_releases"] = *remedy.more_releases;
    put(json, "inputs_uncertainty_needed", remedy.inputs_needed);
    json["reading"] = remedy.reading;
    return json;
}

ordered_json limit_json(const LimitDecision& decided, bool torsional) {
    ordered_json json{{"quantity", key_of(decided.limit.quantity)},
                      {"unit", unit_of(decided.limit.quantity, torsional)}};
    put(json, "lower", decided.limit.lower);
    put(json, "upper", decided.limit.upper);
    if (decided.estimate) {
        json["value"] = decided.estimate->value;
        json["standard_uncertainty"] = decided.estimate->standard_uncertainty;
        json["guard_band"] = decided.guard_band;
        put(json, "acceptance_lower", decided.acceptance_lower);
        put(json, "acceptance_upper", decided.acceptance_upper);
    }
    put(json, "probability_of_conformity", decided.probability_of_conformity);
    json["decision"] = to_text(decided.decision);
    if (decided.decision == Decision::conforms) put(json, "consumer_risk", decided.risk);
    if (decided.decision == Decision::does_not_conform) put(json, "producer_risk", decided.risk);
    if (decided.remedy) json["remedy"] = remedy_json(*decided.remedy);
    json["reading"] = decided.reading;
    return json;
}

/// A limit with as many digits as it has.
std::string limit_text(const Limit& limit, std::string_view unit) {
    const std::string suffix = unit == "1" ? "" : fmt::format(" {}", unit);
    if (limit.lower && limit.upper)
        return fmt::format("{:.6g} … {:.6g}{}", *limit.lower, *limit.upper, suffix);
    return limit.lower ? fmt::format("≥ {:.6g}{}", *limit.lower, suffix)
                       : fmt::format("≤ {:.6g}{}", *limit.upper, suffix);
}

std::string value_text(const LimitDecision& decided) {
    if (!decided.estimate) return "not measured";
    const double u = decided.estimate->standard_uncertainty;
    return fmt::format("{}, u = {:.2g}", report::rounded(decided.estimate->value, u), u);
}

std::string probability_text(const LimitDecision& decided) {
    if (!decided.probability_of_conformity) return "—";
    const double percent = 100.0 * *decided.probability_of_conformity;
    if (percent > 99.99) return "> 99.99 %";
    if (percent < 0.01) return "< 0.01 %";
    return fmt::format("{:.2f} %", percent);
}

std::string rule_text(const DecisionOptions& options) {
    if (options.rule == DecisionRule::simple_acceptance) return std::string(to_text(options.rule));
    const std::string factor = options.coverage_factor ? fmt::format("{:.3g} u", *options.coverage_factor)
                                                       : std::string("k u (k for a coverage of 95.45 %)");
    return fmt::format("{}; guard band {:.3g} times the expanded uncertainty {}", to_text(options.rule),
                       options.guard_multiple, factor);
}

}  // namespace

std::string spoken(Decision decision) {
    return decision == Decision::does_not_conform ? "does not conform" : std::string(to_text(decision));
}

ordered_json to_json(const Verdict& verdict, bool torsional) {
    ordered_json json{{"decision", to_text(verdict.decision)}, {"rule", to_text(verdict.options.rule)}};
    if (verdict.options.rule != DecisionRule::simple_acceptance) {
        json["guard_multiple"] = verdict.options.guard_multiple;
        put(json, "coverage_factor", verdict.options.coverage_factor);
    }
    json["limits"] = ordered_json::array();
    for (const LimitDecision& decided : verdict.limits)
        json["limits"].push_back(limit_json(decided, torsional));
    json["findings"] = to_json(verdict.findings);
    return json;
}

std::string to_text(const Verdict& verdict, bool torsional) {
    std::string text =
        fmt::format("Verdict: {}\n  by {}\n", spoken(verdict.decision), rule_text(verdict.options));
    TextTable table{{Align::left, Align::left, Align::left, Align::right, Align::left}, {}, true};
    table.rows.push_back({"limit of", "permitted", "measured", "probability of conformity", "decision"});
    for (const LimitDecision& decided : verdict.limits) {
        const std::string_view unit = unit_of(decided.limit.quantity, torsional);
        table.rows.push_back({std::string(name_of(decided.limit.quantity)), limit_text(decided.limit, unit),
                              value_text(decided), probability_text(decided), spoken(decided.decision)});
    }
    if (!verdict.limits.empty()) text += fmt::format("\n{}\n", report::to_text(table, 2));
    for (const LimitDecision& decided : verdict.limits) {
        const std::string remedy =
            decided.remedy ? fmt::format(" {}", decided.remedy->reading) : std::string();
        text +=
            report::wrapped(fmt::format("  {}: ", name_of(decided.limit.quantity)), decided.reading + remedy);
    }
    report::GatheredFindings findings;
    findings.add(verdict.findings, "");
    const std::string found = findings.text();
    return found.empty() ? text : fmt::format("{}\n{}", text, found);
}

std::string to_csv(const Verdict& verdict, bool torsional) {
    const auto cell = [](const std::optional<double>& number) {
        return number ? fmt::format("{}", *number) : std::string();
    };
    std::string text =
        "quantity,unit,lower,upper,value,standard_uncertainty,probability_of_conformity,decision,verdict\r\n";
    for (const LimitDecision& decided : verdict.limits) {
        const auto& estimate = decided.estimate;
        text += fmt::format(
            "{},{},{},{},{},{},{},{},{}\r\n", key_of(decided.limit.quantity),
            unit_of(decided.limit.quantity, torsional), cell(decided.limit.lower), cell(decided.limit.upper),
            estimate ? cell(estimate->value) : "", estimate ? cell(estimate->standard_uncertainty) : "",
            cell(decided.probability_of_conformity), to_text(decided.decision), to_text(verdict.decision));
    }
    return text;
}

}  // namespace ringwright
