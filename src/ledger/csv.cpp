#include <fmt/format.h>

#include <array>

#include "ringwright/ledger.hpp"

namespace ringwright {
namespace {

/// A text as a CSV cell that no spreadsheet takes for a formula.
std::string cell(std::string_view text) {
    std::string safe(text);
    if (!safe.empty() && std::string_view("=+-@\t\r").find(safe.front()) != std::string_view::npos)
        safe.insert(safe.begin(), '\'');
    if (safe.find_first_of(",\"\n\r") == std::string::npos) return safe;
    std::string quoted = "\"";
    for (const char letter : safe) {
        if (letter == '"') quoted += '"';
        quoted += letter;
    }
    return quoted + '"';
}

template <class Number>
std::string cell(const std::optional<Number>& number) {
    return number ? fmt::format("{}", *number) : std::string();
}

template <class... Cells>
std::string line(const Cells&... cells) {
    std::string text;
    ((text += (text.empty() ? "" : ",") + cells), ...);
    return text + "\r\n";
}

constexpr std::string_view summary_columns =
    "number,utc,article_type,serial,operator,test_date,decision,supersedes,superseded_by,reason";

std::string summary_cells(const EntrySummary& entry) {
    std::string text = fmt::format("{}", entry.number);
    for (const std::string& value : {cell(entry.utc), cell(entry.article_type), cell(entry.serial),
                                     cell(entry.test_operator), cell(entry.test_date), cell(entry.decision),
                                     cell(entry.supersedes), cell(entry.superseded_by), cell(entry.reason)})
        text += "," + value;
    return text;
}

std::string figure_cells(const LedgerFigure& figure) {
    return fmt::format("{},{},{},{},{},{},{}", key_of(figure.quantity), cell(figure.unit), figure.value,
                       figure.standard_uncertainty, cell(figure.low), cell(figure.high),
                       cell(figure.degrees_of_freedom));
}

}  // namespace

std::string summaries_as_csv(const std::vector<EntrySummary>& entries) {
    std::string text = fmt::format("{},software_version,hash\r\n", summary_columns);
    for (const EntrySummary& entry : entries)
        text += line(summary_cells(entry), cell(entry.software_version), entry.hash);
    return text;
}

std::string figures_csv_header() {
    return fmt::format(
        "{},quantity,unit,value,standard_uncertainty,low,high,degrees_of_freedom,recordings\r\n",
        summary_columns);
}

std::string entry_as_figures_csv(const LedgerEntry& entry) {
    std::string hashes;
    for (const LedgerRecording& recording : entry.recordings)
        hashes += (hashes.empty() ? "" : " ") + recording.sha256;
    if (entry.figures.empty()) return line(summary_cells(entry.summary), std::string(",,,,,,"), cell(hashes));
    std::string text;
    for (const LedgerFigure& figure : entry.figures)
        text += line(summary_cells(entry.summary), figure_cells(figure), cell(hashes));
    return text;
}

}  // namespace ringwright
