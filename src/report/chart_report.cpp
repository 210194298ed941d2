#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <nlohmann/json.hpp>

#include "report/terminal_chart.hpp"
#include "report/text_table.hpp"
#include "ringwright/ledger_report.hpp"
#include "ringwright/result_json.hpp"

namespace ringwright {
namespace {

using nlohmann::ordered_json;

std::string unit_of_values(const LedgerChart& chart) {
    return chart.values.empty() || chart.values.front().unit == "1" ? "" : chart.values.front().unit;
}

std::vector<bool> marked_values(const LedgerChart& chart) {
    std::vector<bool> marked(chart.values.size(), false);
    for (const RunSignal& signal : chart.signals) marked[signal.last] = true;
    return marked;
}

std::string heading(const LedgerChart& chart, std::size_t width) {
    const std::string unit = unit_of_values(chart);
    std::string text = fmt::format("{}{}, {} entries, {} … {}", name_of(chart.quantity),
                                   unit.empty() ? std::string() : fmt::format(" in {}", unit),
                                   chart.values.size(), chart.values.front().day, chart.values.back().day);
    if (chart.values.size() > width) text += fmt::format("; the last {} are drawn", width);
    return text + "\n\n";
}

std::string signal_text(const LedgerChart& chart, const RunSignal& signal) {
    const auto entry = [&](std::size_t i) { return chart.values[i].number; };
    const std::string where = signal.first == signal.last
                                  ? fmt::format("entry {}", entry(signal.last))
                                  : fmt::format("entries {} … {}", entry(signal.first), entry(signal.last));
    return report::wrapped("  ◆ ", fmt::format("{}: {}", where, to_text(signal.rule)));
}

bool outside(const LedgerChart& chart, const LedgerValue& value) {
    return (chart.lower_specification && value.value < *chart.lower_specification) ||
           (chart.upper_specification && value.value > *chart.upper_specification);
}

std::string specification_text(const LedgerChart& chart) {
    const auto& lower = chart.lower_specification;
    const auto& upper = chart.upper_specification;
    if (!lower && !upper) return "";
    const std::string unit = unit_of_values(chart);
    const std::string range = lower && upper ? fmt::format("{:.6g} … {:.6g}", *lower, *upper)
                              : lower        ? fmt::format("≥ {:.6g}", *lower)
                                             : fmt::format("≤ {:.6g}", *upper);
    const auto count =
        std::ranges::count_if(chart.values, [&](const LedgerValue& value) { return outside(chart, value); });
    return fmt::format("\nSpecified: {}{}; {} of {} values outside.\n", range, unit.empty() ? "" : " " + unit,
                       count, chart.values.size());
}

std::string trend_text(const LinearTrend& trend, const std::string& unit, double level) {
    return report::wrapped(
        "Trend: ",
        fmt::format(
            "{:.3g} {} a year, between {:.3g} and {:.3g} at {:.4g} % confidence; p = {:.3g} of no trend.",
            trend.slope.value, unit, trend.slope.interval.low, trend.slope.interval.high, 100.0 * level,
            trend.p_value));
}

ordered_json value_json(const LedgerValue& value) {
    return {{"entry", value.number},  {"day", value.day},
            {"serial", value.serial}, {"operator", value.test_operator},
            {"value", value.value},   {"standard_uncertainty", value.standard_uncertainty}};
}

ordered_json signal_json(const LedgerChart& chart, const RunSignal& signal) {
    return {{"rule", to_text(signal.rule)},
            {"first_entry", chart.values[signal.first].number},
            {"last_entry", chart.values[signal.last].number}};
}

}  // namespace

std::string to_text(const LedgerChart& chart, std::size_t width) {
    const IndividualsChart& numbers = chart.chart;
    std::string text = heading(chart, width);
    text += report::draw_run({numbers.values, marked_values(chart)},
                             {{numbers.lower_limit, "lower limit"},
                              {numbers.upper_limit, "upper limit"},
                              {numbers.center, "center"}},
                             width, 17);
    std::vector<bool> beyond;
    for (const double range : numbers.moving_ranges) beyond.push_back(range > numbers.range_upper_limit);
    text += "\nmoving range of two\n\n";
    text += report::draw_run({numbers.moving_ranges, beyond},
                             {{numbers.range_upper_limit, "upper limit"}, {numbers.range_center, "mean"}},
                             width, 8);
    text += specification_text(chart);
    text += chart.signals.empty() ? "\nNo signal by the rules asked for.\n" : "\nSignals\n";
    for (const RunSignal& signal : chart.signals) text += signal_text(chart, signal);
    if (chart.trend)
        text += fmt::format("\n{}", trend_text(*chart.trend, unit_of_values(chart), chart.confidence_level));
    return text;
}

ordered_json to_json(const LedgerChart& chart) {
    ordered_json json{{"schema", "ringwright.chart.v1"},
                      {"quantity", key_of(chart.quantity)},
                      {"unit", chart.values.empty() ? "" : chart.values.front().unit},
                      {"center", chart.chart.center},
                      {"sigma", chart.chart.sigma},
                      {"lower_limit", chart.chart.lower_limit},
                      {"upper_limit", chart.chart.upper_limit},
                      {"moving_range_mean", chart.chart.range_center},
                      {"moving_range_upper_limit", chart.chart.range_upper_limit},
                      {"values", ordered_json::array()},
                      {"signals", ordered_json::array()}};
    if (chart.lower_specification) json["lower_specification"] = *chart.lower_specification;
    if (chart.upper_specification) json["upper_specification"] = *chart.upper_specification;
    for (const LedgerValue& value : chart.values) json["values"].push_back(value_json(value));
    for (const RunSignal& signal : chart.signals) json["signals"].push_back(signal_json(chart, signal));
    if (chart.trend)
        json["trend"] = {{"slope_per_year", to_json(chart.trend->slope, "1/year")},
                         {"p_value", chart.trend->p_value}};
    return json;
}

}  // namespace ringwright
