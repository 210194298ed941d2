// ringwright ledger chart | capability | gauge.

#include <fmt/format.h>

#include <CLI/App.hpp>
#include <CLI/Config.hpp>
#include <CLI/Formatter.hpp>
#include <algorithm>
#include <map>
#include <memory>
#include <nlohmann/json.hpp>
#include <set>

#include "app/filing.hpp"
#include "app/ledger_options.hpp"
#include "app/messages.hpp"
#include "app/result_report.hpp"
#include "ringwright/error.hpp"
#include "ringwright/ledger_report.hpp"
#include "ringwright/result_json.hpp"
#include "ringwright/test_sheet.hpp"

namespace ringwright::app {
namespace {

struct StatisticsArguments {
    FilterArguments filter;
    AnswerArguments answer;
    DrawingArguments drawing;
    std::string rules = "usual", lower, upper;
};

LedgerFilter filter_without_quantity(const StatisticsArguments& arguments) {
    LedgerFilter filter = filter_from(arguments.filter);
    filter.quantity.reset();
    return filter;
}

[[noreturn]] void too_few(const std::string& path, const char* what, std::string reason) {
    throw InputError({path, "", fmt::format("there is nothing to {}: {}", what, reason),
                      "See `ringwright ledger list`, or choose other entries or another --quantity"});
}

/// Values of one unit: a chart of N/m and N·m/rad together says nothing.
std::vector<LedgerValue> values_from(const std::string& path, const StatisticsArguments& arguments,
                                     const char* what) {
    const Quantity quantity = quantity_from(arguments.filter);
    auto values = Ledger::open_to_read(path).values(quantity, filter_without_quantity(arguments));
    if (values.size() < 2)
        too_few(path, what, fmt::format("{} entries hold a {}", values.size(), name_of(quantity)));
    for (const LedgerValue& value : values)
        if (value.unit != values.front().unit)
            too_few(path, what,
                    fmt::format("entry {} is in {}, others in {}", value.number, value.unit,
                                values.front().unit));
    return values;
}

std::vector<double> numbers_of(const std::vector<LedgerValue>& values) {
    std::vector<double> numbers;
    for (const LedgerValue& value : values) numbers.push_back(value.value);
    return numbers;
}

/// Years since the first day; empty when a day is no date.
std::vector<double> years_of(const std::vector<LedgerValue>& values) {
    std::vector<double> years;
    for (const LedgerValue& value : values) {
        const auto day = date_from_text(value.day);
        if (!day) return {};
        years.push_back(static_cast<double>(std::chrono::sys_days(*day).time_since_epoch().count()) /
                        365.2425);
    }
    for (std::size_t i = values.size(); i-- > 0;) years[i] -= years.front();
    return years;
}

std::vector<RunRule> rules_from(const std::string& text) {
    if (text == "usual") return usual_run_rules();
    if (text == "all") return all_run_rules();
    throw UsageError({"--rules", "", fmt::format("\"{}\" is no set of rules", text), "Give usual or all"});
}

nlohmann::ordered_json chart_document(const LedgerChart& chart, const FilterArguments& filter) {
    nlohmann::ordered_json json = to_json(chart);
    json["software"] = software_json();
    json["confidence_level"] = chart.confidence_level;
    json["filter"] = nlohmann::ordered_json::object();
    for (const auto& [key, text] :
         {std::pair{"article_type", filter.article_type}, std::pair{"serial", filter.serial},
          std::pair{"operator", filter.test_operator}, std::pair{"decision", filter.decision},
          std::pair{"since", filter.since}, std::pair{"until", filter.until}})
        if (!text.empty()) json["filter"][key] = text;
    return json;
}

int draw_statistics(const std::string& path, const nlohmann::ordered_json& document,
                    const StatisticsArguments& arguments) {
    draw_result({document, path, path, {}, std::nullopt}, arguments.drawing, arguments.answer.output);
    return done;
}

/// The limit of the quantity in the sheet of the newest of the entries that has one.
std::optional<Limit> newest_limit(const Ledger& ledger, const std::vector<LedgerValue>& values,
                                  Quantity quantity) {
    std::vector<std::int64_t> numbers;
    for (const LedgerValue& value : values) numbers.push_back(value.number);
    std::ranges::sort(numbers, std::greater<>{});
    for (const std::int64_t number : numbers) {
        const LedgerEntry entry = ledger.get(number);
        if (entry.sheet_text.empty()) continue;
        for (const Limit& limit : limits_of(read_test_sheet_from_memory(entry.sheet_text, entry.sheet_name)))
            if (limit.quantity == quantity) return limit;
    }
    return std::nullopt;
}

/// --min and --max as the test sheet would read them.
std::optional<Limit> limit_from(const StatisticsArguments& arguments, Quantity quantity) {
    if (arguments.lower.empty() && arguments.upper.empty()) return std::nullopt;
    const auto quoted = [](const std::string& text) {
        const bool plain = text.find_first_not_of("0123456789.eE+-") == std::string::npos;
        return plain ? text : fmt::format("\"{}\"", text);
    };
    std::string sheet = fmt::format("[limits]\n{} = {{ ", key_of(quantity));
    if (!arguments.lower.empty()) sheet += fmt::format("min = {}", quoted(arguments.lower));
    if (!arguments.upper.empty())
        sheet += fmt::format("{}max = {}", arguments.lower.empty() ? "" : ", ", quoted(arguments.upper));
    try {
        return limits_of(read_test_sheet_from_memory(sheet + " }\n", "")).front();
    } catch (const InputError& error) {
        throw UsageError({"--min, --max", "", error.problem().found, error.problem().remedy});
    }
}

/// The limit that the options give, else that of the sheets.
std::optional<Limit> known_limit(const std::string& path, const std::vector<LedgerValue>& values,
                                 const StatisticsArguments& arguments, Quantity quantity) {
    const auto given = limit_from(arguments, quantity);
    return given ? given : newest_limit(Ledger::open_to_read(path), values, quantity);
}

int run_chart(const std::string& path, const StatisticsArguments& arguments) {
    const Format format = format_from(arguments.answer);
    const bool drawn = require_drawable(arguments.answer.output, arguments.drawing);
    refuse_overwriting(arguments.answer.output, {path});
    LedgerChart chart;
    chart.rules = rules_from(arguments.rules);
    chart.quantity = quantity_from(arguments.filter);
    chart.values = values_from(path, arguments, "chart");
    chart.chart = individuals_chart(numbers_of(chart.values));
    chart.signals = run_signals(chart.chart, chart.rules);
    chart.confidence_level = confidence_from(arguments.answer);
    if (!arguments.filter.serial.empty())
        chart.trend = linear_trend(years_of(chart.values), chart.chart.values, chart.confidence_level);
    const auto limit = known_limit(path, chart.values, arguments, chart.quantity);
    if (limit) chart.lower_specification = limit->lower, chart.upper_specification = limit->upper;
    const auto document = [&] { return chart_document(chart, arguments.filter); };
    if (drawn) return draw_statistics(path, document(), arguments);
    write_answer(format == Format::text ? to_text(chart) : to_text(document()), arguments.answer.output);
    return done;
}

int run_capability(const std::string& path, const StatisticsArguments& arguments) {
    refuse_drawn(arguments.answer.output);
    const Format format = format_from(arguments.answer);
    const Quantity quantity = quantity_from(arguments.filter);
    const auto values = values_from(path, arguments, "judge");
    const auto limit = known_limit(path, values, arguments, quantity);
    if (!limit)
        throw UsageError({"--min, --max", "", fmt::format("no limit of the {} is known", name_of(quantity)),
                          "Give --min or --max; the sheets of these entries have none"});
    const double level = confidence_from(arguments.answer);
    const auto answer = capability(numbers_of(values), limit->lower, limit->upper, level);
    if (!answer) too_few(path, "judge", "the entries do not scatter");
    nlohmann::ordered_json json{{"schema", "ringwright.capability.v1"}, {"quantity", key_of(quantity)}};
    if (limit->lower) json["lower"] = *limit->lower;
    if (limit->upper) json["upper"] = *limit->upper;
    json["confidence_level"] = level;
    json.update(to_json(*answer));
    write_answer(format == Format::text ? capability_text(*answer, quantity, values.front().unit,
                                                          limit->lower, limit->upper, level)
                                        : to_text(json),
                 arguments.answer.output);
    return done;
}

using Cells = std::map<std::string, std::map<std::string, std::vector<double>>>;  // serial, operator

/// Articles that every operator measured, each cell cut to the smallest count. `note` says what was left out.
std::vector<std::vector<std::vector<double>>> balanced(const Cells& cells, std::string& note) {
    std::set<std::string> operators;
    for (const auto& [serial, by_operator] : cells)
        for (const auto& [name, values] : by_operator) operators.insert(name);
    std::vector<std::vector<std::vector<double>>> table;
    std::size_t fewest = SIZE_MAX, most = 0;
    for (const auto& [serial, by_operator] : cells) {
        if (by_operator.size() != operators.size()) {
            note += fmt::format("Article {} was not measured by every operator and is left out. ", serial);
            continue;
        }
        table.emplace_back();
        for (const auto& [name, values] : by_operator) {
            fewest = std::min(fewest, values.size());
            most = std::max(most, values.size());
            table.back().push_back(values);
        }
    }
    for (auto& article : table)
        for (auto& cell : article) cell.resize(fewest);
    if (!table.empty() && most > fewest)
        note += fmt::format("The first {} measurements of each article by each operator are used. ", fewest);
    return table;
}

nlohmann::ordered_json readings_json(const Cells& cells) {
    nlohmann::ordered_json readings = nlohmann::ordered_json::array();
    for (const auto& [serial, by_operator] : cells)
        for (const auto& [name, values] : by_operator)
            readings.push_back({{"serial", serial}, {"operator", name}, {"values", values}});
    return readings;
}

int run_gauge(const std::string& path, const StatisticsArguments& arguments) {
    const Format format = format_from(arguments.answer);
    const bool drawn = require_drawable(arguments.answer.output, arguments.drawing);
    refuse_overwriting(arguments.answer.output, {path});
    const Quantity quantity = quantity_from(arguments.filter);
    const auto values = values_from(path, arguments, "study");
    Cells cells;
    for (const LedgerValue& value : values)
        if (!value.serial.empty() && !value.test_operator.empty())
            cells[value.serial][value.test_operator].push_back(value.value);
    if (cells.empty()) too_few(path, "study", "no entry names both serial and operator in its sheet");
    std::string note;
    const auto table = balanced(cells, note);
    const double level = confidence_from(arguments.answer);
    const GaugeAnswer answer = gauge_study(table, level);
    if (!answer.study) too_few(path, "study", without_period(note + answer.reason));
    nlohmann::ordered_json json{{"schema", "ringwright.gauge.v1"},
                                {"software", software_json()},
                                {"quantity", key_of(quantity)},
                                {"unit", values.front().unit},
                                {"confidence_level", level}};
    json.update(to_json(*answer.study));
    json["readings"] = readings_json(cells);
    if (!note.empty()) json["note"] = note;
    if (drawn) return draw_statistics(path, json, arguments);
    const std::string text = gauge_text(*answer.study, quantity, values.front().unit, level);
    write_answer(format == Format::text ? (note.empty() ? text : fmt::format("{}\n  {}\n", text, note))
                                        : to_text(json),
                 arguments.answer.output);
    return done;
}

using Runner = int (*)(const std::string&, const StatisticsArguments&);

}  // namespace

void add_ledger_statistics_commands(CLI::App& ledger, Context& context, const LedgerLocation& location) {
    const auto add = [&](const char* name, const char* help, Runner runner) {
        const auto arguments = std::make_shared<StatisticsArguments>();
        CLI::App* part = ledger.add_subcommand(name, help);
        add_filter_options(*part, arguments->filter, "Of what: damping_ratio where nothing is said");
        add_answer_options(*part, arguments->answer);
        part->callback([arguments, &context, &location, runner] {
            context.run = [arguments, path = ledger_path_from(location.option), runner] {
                return runner(path, *arguments);
            };
        });
        return std::pair(part, arguments);
    };
    const auto [chart, chart_arguments] = add(
        "chart",
        "Individuals and moving ranges against the limits of the newest sheet or --min, --max, signals, and "
        "the trend of one --serial",
        run_chart);
    add_drawing_options(*chart, chart_arguments->drawing, "chart");
    chart->add_option("--rules", chart_arguments->rules, "Which patterns are signals: usual or all")
        ->type_name("usual|all")
        ->capture_default_str();
    const auto add_limit_options = [](CLI::App& part, StatisticsArguments& arguments) {
        part.add_option("--min", arguments.lower, "Lower limit, with its unit")->type_name("VALUE");
        part.add_option("--max", arguments.upper, "Upper limit")->type_name("VALUE");
    };
    add_limit_options(*chart, *chart_arguments);
    const auto [capable, capability_arguments] =
        add("capability", "Cp, Cpk, Pp, Ppk against the limits of the newest sheet or --min, --max",
            run_capability);
    add_limit_options(*capable, *capability_arguments);
    const auto [gauge, gauge_arguments] =
        add("gauge", "Repeatability, reproducibility and articles, by analysis of variance", run_gauge);
    add_drawing_options(*gauge, gauge_arguments->drawing, "gauge");
}

}  // namespace ringwright::app
