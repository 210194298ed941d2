#include "ringwright/result_text.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <utility>
#include <vector>

#include "report/finding_text.hpp"
#include "report/number_text.hpp"
#include "report/text_table.hpp"

namespace ringwright {
namespace {

using report::Align;
using report::TextTable;

struct NamedMethod {
    std::string_view key, name;
    MethodResult EventIdentification::*result;
};

constexpr std::array<NamedMethod, 3> methods{{
    {"logarithmic_decrement", "logarithmic decrement", &EventIdentification::logarithmic_decrement},
    {"half_power_bandwidth", "half-power bandwidth", &EventIdentification::half_power_bandwidth},
    {"curve_fit", "curve fit", &EventIdentification::curve_fit},
}};

std::string method_name(const std::string& key, const std::string& model) {
    std::string name = key;
    for (const NamedMethod& method : methods)
        if (method.key == key) name = method.name;
    return model.empty() ? name : fmt::format("{} ({})", name, model);
}

std::string plural(std::size_t count, const char* one, const char* many) {
    return fmt::format("{} {}", count, count == 1 ? one : many);
}

std::string recording_heading(const RecordingIdentification& identified) {
    const Recording& recording = identified.recording;
    const std::string what =
        recording.quantity_known ? std::string(to_text(recording.quantity)) : "quantity not known";
    std::string text = report::printable(recording.origin.file) + "\n";
    text += fmt::format("  {}{}, channel {}; {} samples at {:.6g} Hz, {:.4g} s", what,
                        recording.unit.symbol.empty() ? "" : " in " + recording.unit.symbol,
                        report::printable(recording.origin.channel), identified.sample_count,
                        recording.clock.sample_rate_hz, identified.duration_s);
    if (identified.added_mass) text += "; added mass " + report::printable(identified.added_mass->text);
    return text + "\n";
}

std::string cell(const Quantities& quantities, Quantity quantity) {
    const auto found = quantities.find(quantity);
    return found == quantities.end() ? "—" : report::in_table(found->second);
}

std::vector<std::string> method_row(std::string release, std::string start, const NamedMethod& method,
                                    const MethodResult& answer) {
    std::vector<std::string> row{std::move(release), std::move(start),
                                 method_name(std::string(method.key), answer.model)};
    if (answer.status == MethodStatus::not_applicable) {
        row.push_back("does not apply: " + answer.reason);
        return row;
    }
    row.push_back(cell(answer.quantities, Quantity::natural_frequency));
    row.push_back(cell(answer.quantities, Quantity::damping_ratio));
    row.push_back(cell(answer.quantities, answer.quantities.contains(Quantity::decay_rate)
                                              ? Quantity::decay_rate
                                              : Quantity::slow_decay_rate));
    return row;
}

/// What the agreement of the methods suggests, said once for all releases where it is the same.
std::string readings_text(const RecordingIdentification& recording, std::size_t number) {
    std::vector<std::pair<std::string, std::vector<std::size_t>>> readings;
    for (const EventIdentification& event : recording.events) {
        ++number;
        const std::string& reading = event.agreement.reading;
        if (reading.empty()) continue;
        auto same = std::ranges::find_if(readings, [&](const auto& entry) { return entry.first == reading; });
        if (same == readings.end()) same = readings.insert(readings.end(), {reading, {}});
        same->second.push_back(number);
    }
    std::string text;
    for (const auto& [reading, numbers] : readings)
        text += report::wrapped(fmt::format("  {}: ", report::numbered_places("release", numbers)), reading);
    return text;
}

std::string methods_table(const RecordingIdentification& recording, std::size_t& number,
                          double confidence_level) {
    TextTable table{
        {Align::right, Align::right, Align::left, Align::left, Align::left, Align::left}, {}, true};
    table.rows.push_back(
        {"release", "start / s", "method", "natural frequency / Hz", "damping ratio", "decay rate / (1/s)"});
    const std::string readings = readings_text(recording, number);
    for (const EventIdentification& event : recording.events) {
        ++number;
        bool first = true;
        for (const NamedMethod& method : methods) {
            table.rows.push_back(method_row(first ? std::to_string(number) : "",
                                            first ? fmt::format("{:.4f}", event.start_s) : "", method,
                                            event.*method.result));
            first = false;
        }
    }
    std::string text =
        fmt::format("  {} found; ± and [ ] are {:.4g} % intervals\n\n",
                    plural(recording.events.size(), "release", "releases"), 100.0 * confidence_level);
    text += report::to_text(table, 2);
    if (!readings.empty()) text += fmt::format("\n{}", readings);
    return text;
}

bool worth_a_budget(Quantity quantity) {
    switch (quantity) {
        case Quantity::natural_frequency:
        case Quantity::damping_ratio:
        case Quantity::stiffness:
        case Quantity::damping_coefficient:
        case Quantity::mass:
        case Quantity::inertia:
            return true;
        default:
            return false;
    }
}

std::string degrees_of_freedom_text(double degrees_of_freedom) {
    if (!std::isfinite(degrees_of_freedom)) return "∞";
    return degrees_of_freedom < 100.0 ? fmt::format("{:.3g}", degrees_of_freedom)
                                      : fmt::format("{:.0f}", degrees_of_freedom);
}

/// Two significant digits and the unit.
std::string two_digits(double value, std::string_view unit) {
    const std::string number = value < 1e-4 ? fmt::format("{:.2g}", value) : report::rounded(value, value);
    return unit == "1" ? number : fmt::format("{} {}", number, unit);
}

}  // namespace

std::string result_lines(const Identification& identification) {
    const PooledResult& result = identification.result;
    if (result.method.empty()) return "Result: no method can answer\n";
    std::string text = fmt::format("Result of {} by {}\n", plural(result.event_count, "release", "releases"),
                                   method_name(result.method, result.model));
    TextTable table{{Align::left, Align::left}, {}, false};
    for (const auto& [quantity, estimate] : result.quantities) {
        const std::string_view unit = unit_of(quantity, result.torsional);
        table.rows.push_back({std::string(name_of(quantity)),
                              fmt::format("= {}, {:.4g} % confidence", report::with_interval(estimate, unit),
                                          100.0 * identification.confidence_level)});
    }
    return text + report::to_text(table, 2);
}

std::string budget_text(const Identification& identification) {
    const PooledResult& result = identification.result;
    TextTable table{
        {Align::left, Align::left, Align::left, Align::right, Align::right, Align::right}, {}, true};
    table.rows.push_back({"uncertainty of", "source", "standard uncertainty", "contribution", "share", "ν"});
    std::string_view last;
    for (const BudgetLine& line : result.budget) {
        if (!worth_a_budget(line.quantity)) continue;
        const std::string_view name = name_of(line.quantity);
        table.rows.push_back({name == last ? "" : std::string(name), line.source,
                              two_digits(line.standard_uncertainty, line.unit),
                              two_digits(line.contribution, unit_of(line.quantity, result.torsional)),
                              fmt::format("{:.1f} %", 100.0 * line.share),
                              degrees_of_freedom_text(line.degrees_of_freedom)});
        last = name;
    }
    if (table.rows.size() < 2) return {};
    return "Uncertainty budget\n" + report::to_text(table, 2);
}

std::string findings_text(const Identification& identification) {
    report::GatheredFindings gathered;
    const bool name_files = identification.recordings.size() > 1;
    std::size_t number = 0;
    for (const RecordingIdentification& recording : identification.recordings) {
        gathered.add(recording.findings,
                     name_files ? report::printable(recording.recording.origin.file) : "");
        for (const EventIdentification& event : recording.events) {
            gathered.add(event.event.findings, ++number);
            gathered.add(event.findings, number);
        }
    }
    gathered.add(identification.result.findings, "");
    return gathered.text();
}

std::string caution_text() {
    return report::wrapped(
        "Caution: ",
        "springs under load, suspended and dropped masses injure people. This is a measurement, no "
        "release of the part: the maker's instructions, local codes and licensed practice decide "
        "that.");
}

std::string to_text(const Identification& identification) {
    std::string text;
    std::size_t number = 0;
    for (const RecordingIdentification& recording : identification.recordings) {
        text += recording_heading(recording);
        text += recording.events.empty() ? report::wrapped("  no release found: ", recording.reason)
                                         : methods_table(recording, number, identification.confidence_level);
        text += "\n";
    }
    text += result_lines(identification);
    if (const std::string budget = budget_text(identification); !budget.empty()) text += "\n" + budget;
    if (const std::string findings = findings_text(identification); !findings.empty())
        text += "\n" + findings;
    return text + "\n" + caution_text();
}

}  // namespace ringwright
