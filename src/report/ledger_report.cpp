#include "ringwright/ledger_report.hpp"

#include <fmt/format.h>
#include <fmt/ranges.h>

#include <algorithm>
#include <cmath>

#include "report/number_text.hpp"
#include "report/text_table.hpp"

namespace ringwright {
namespace {

using report::Align;
using report::printable;
using report::TextTable;

std::string state_of(const EntrySummary& entry) {
    if (entry.superseded_by) return fmt::format("superseded by {}", *entry.superseded_by);
    if (entry.supersedes) return fmt::format("supersedes {}", *entry.supersedes);
    return "";
}

std::string spoken_decision(const std::string& decision) {
    if (decision.empty()) return "not judged";
    return decision == "does_not_conform" ? "does not conform" : decision;
}

std::string day_of(const EntrySummary& entry) {
    return entry.test_date.empty() ? entry.utc.substr(0, 10) : entry.test_date;
}

Estimate estimate_of(const LedgerFigure& figure) {
    return {figure.value,
            figure.standard_uncertainty,
            {figure.low.value_or(-HUGE_VAL), figure.high.value_or(HUGE_VAL)},
            figure.degrees_of_freedom.value_or(HUGE_VAL)};
}

std::string figures_text(const LedgerEntry& entry) {
    TextTable table{{Align::left, Align::left}, {}, false};
    for (const LedgerFigure& figure : entry.figures)
        table.rows.push_back({std::string(name_of(figure.quantity)),
                              fmt::format("= {}", report::with_interval(estimate_of(figure), figure.unit))});
    return report::to_text(table, 2);
}

}  // namespace

std::string list_text(const std::vector<EntrySummary>& entries) {
    if (entries.empty()) return "No entries.\n";
    TextTable table{
        {Align::right, Align::left, Align::left, Align::left, Align::left, Align::left, Align::left},
        {},
        true};
    table.rows.push_back({"entry", "day", "article type", "serial", "operator", "decision", ""});
    for (const EntrySummary& entry : entries)
        table.rows.push_back({fmt::format("{}", entry.number), printable(day_of(entry)),
                              printable(entry.article_type), printable(entry.serial),
                              printable(entry.test_operator), spoken_decision(entry.decision),
                              state_of(entry)});
    return report::to_text(table, 0);
}

std::string entry_text(const LedgerEntry& entry) {
    const EntrySummary& summary = entry.summary;
    TextTable table{{Align::left, Align::left}, {}, false};
    const auto add = [&](const char* name, const std::string& text) {
        if (!text.empty()) table.rows.push_back({name, printable(text)});
    };
    add("filed", summary.utc);
    add("day of the test", summary.test_date);
    add("article type", summary.article_type);
    add("serial", summary.serial);
    add("operator", summary.test_operator);
    add("decision", spoken_decision(summary.decision));
    add("state", state_of(summary));
    add("reason", summary.reason);
    add("sheet", entry.sheet_name);
    add("options", fmt::format("{}", fmt::join(entry.arguments, " ")));
    add("version", summary.software_version);
    add("hash", summary.hash);
    add("hash before", summary.previous_hash);
    for (const LedgerRecording& recording : entry.recordings)
        add("recording",
            fmt::format("{}{}{}, SHA-256 {}", recording.file,
                        recording.bytes ? fmt::format(", {} bytes", *recording.bytes) : std::string(),
                        recording.added_mass.empty() ? std::string()
                                                     : fmt::format(", added mass {}", recording.added_mass),
                        recording.sha256));
    return fmt::format("Entry {}\n", summary.number) + report::to_text(table, 2) + "\n" + figures_text(entry);
}

}  // namespace ringwright
