// What the report of a comparison says: before against after.

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "drawing/document.hpp"
#include "drawing/document_parts.hpp"
#include "drawing/quality_figures.hpp"
#include "drawing/result_reading.hpp"

namespace ringwright::drawing {
namespace {

std::string side_text(const Json& result, const char* side) {
    const std::size_t count = list_at(result, {side, "recordings"}).size();
    const std::string releases = text_at(result, {side, "event_count"});
    std::string text = fmt::format("{} recording{}", count, count == 1 ? "" : "s");
    if (!releases.empty()) text += fmt::format(", {} release{}", releases, releases == "1" ? "" : "s");
    return text;
}

Facts comparison_facts(const Json& result, const std::string& number) {
    FactRows rows = sheet_facts(result);
    add_fact(rows, "Before", side_text(result, "before"));
    add_fact(rows, "After", side_text(result, "after"));
    add_fact(rows, "Report number", number);
    return {rows, true};
}

std::string change_in_percent(const Json& entry) {
    const auto ratio = number_at(entry, {"ratio", "value"});
    if (!ratio) return "";
    const double percent = 100.0 * (*ratio - 1.0);
    return fmt::format("{}{:.1f} %", percent < 0.0 ? "−" : "+", std::abs(percent));
}

Answer comparison_answer(const Json& result) {
    Answer answer;
    std::string changed;
    for (const std::string& key : main_quantities(result)) {
        const Json& entry = at(result, {"quantities", key.c_str()});
        const bool differs = at(entry, {"changed"}) == true;
        if (differs) changed += (changed.empty() ? "" : ", ") + quantity_name(key);
        const QuantityText before = quantity_text(key, at(entry, {"before"})),
                           after = quantity_text(key, at(entry, {"after"}));
        const std::string change = change_in_percent(entry);
        answer.tiles.push_back({quantity_name(key),
                                !differs         ? "no change shown"
                                : change.empty() ? "changed"
                                                 : change,
                                before.value + " → " + after.with_unit()});
    }
    answer.headline = changed.empty() ? "No change shown" : "Changed: " + changed;
    const double level = number_at(result, {"confidence_level"}).value_or(0.95);
    answer.reading =
        fmt::format("A quantity that did not change is called changed in {:.4g} % of comparisons.",
                    100.0 * (1.0 - level));
    return answer;
}

std::string with_interval(const QuantityText& text) {
    const std::string interval = text.interval();
    return interval.empty() ? cell(text.value) : text.value + " [" + interval + "]";
}

std::string same_within(const Json& entry, const std::string& unit) {
    const Json& equivalence = at(entry, {"equivalence"});
    const auto margin = number_at(equivalence, {"margin"});
    if (!margin) return "";
    const std::string size = at(equivalence, {"relative"}) == true ? fmt::format("{:.4g} %", 100.0 * *margin)
                                                                   : with_unit(*margin, unit, 4);
    return fmt::format("{} the same within {} (p = {}).",
                       at(equivalence, {"equivalent"}) == true ? "shown to be" : "not shown to be", size,
                       p_text(number_at(equivalence, {"p_value"})));
}

void add_compared(std::vector<Block>& blocks, const Json& result) {
    const Json& quantities = at(result, {"quantities"});
    if (!quantities.is_object()) return;
    Table table{{"quantity", "unit", "before", "after", "difference", "after / before", "p-value", "changed"},
                {},
                {false, false, true, true, true, true, true, false}};
    std::vector<std::string> readings;
    for (const auto& [key, entry] : quantities.items()) {
        const std::string unit = text_at(entry, {"before", "unit"});
        const Json& ratio = at(entry, {"ratio"});
        table.rows.push_back(
            {quantity_name(key), cell(unit == "1" ? "" : unit),
             quantity_text(key, at(entry, {"before"})).value, quantity_text(key, at(entry, {"after"})).value,
             with_interval(quantity_text(key, at(entry, {"difference"}))),
             ratio.is_object() ? with_interval(quantity_text(key, ratio)) : "—",
             p_text(number_at(entry, {"p_value"})), at(entry, {"changed"}) == true ? "yes" : "no"});
        if (const std::string same = same_within(entry, unit); !same.empty())
            readings.push_back(quantity_name(key) + ": " + same);
    }
    blocks.push_back(Heading{2, "Results"});
    blocks.push_back(table);
    blocks.push_back(Paragraph{fmt::format("In brackets the {} interval. p-value: of no change, two-sided, "
                                           "Student's t (Welch, 1947).",
                                           confidence_text(result)),
                               true});
    for (const std::string& reading : readings) blocks.push_back(Paragraph{reading, false});
}

void add_side(std::vector<Block>& blocks, const Json& result, const char* side, const char* title) {
    blocks.push_back(Heading{3, title});
    FactRows rows;
    add_fact(rows, "Method", method_name(text_at(result, {side, "method"})));
    for (const Json& recording : list_at(result, {side, "recordings"})) {
        add_fact(rows, "File", text_at(recording, {"file"}));
        add_fact(rows, "SHA-256", text_at(recording, {"sha256"}));
        add_fact(rows, "Channel", text_at(recording, {"channel"}));
        add_fact(rows, "Added mass", text_at(recording, {"added_mass"}));
    }
    blocks.push_back(Facts{rows, false});
}

std::string compare_command_line(const Json& result) {
    if (!at(result, {"options"}).is_array()) return "";
    std::string line = "ringwright compare";
    for (const char* side : {"before", "after"}) {
        bool open = false;  // FILEs follow the option until an added mass stands between
        for (const Json& recording : list_at(result, {side, "recordings"})) {
            if (!open) line.append(" --").append(side);
            const std::string added = text_at(recording, {"added_mass"});
            line += file_words(text_at(recording, {"file"}), added);
            open = added.empty();
        }
    }
    return line + closing_words(result);
}

void add_comparison_traceability(std::vector<Block>& blocks, const Json& result) {
    blocks.push_back(Heading{2, "Traceability"});
    FactRows rows;
    add_sensor(rows, result);
    add_provenance(rows, result, compare_command_line(result));
    if (!rows.empty()) blocks.push_back(Facts{rows, false});
    add_side(blocks, result, "before", "Before");
    add_side(blocks, result, "after", "After");
}

}  // namespace

Document comparison_document(const Json& result) {
    Document document = opened(result, "Comparison", "Before against after");
    auto& blocks = document.blocks;
    blocks.push_back(comparison_facts(result, document.number));
    blocks.push_back(comparison_answer(result));
    blocks.push_back(Pictures{{comparison_figure(result)}});
    add_compared(blocks, result);
    Notes notes;
    for (const Json& finding : list_at(result, {"findings"})) notes.notes.push_back(note_of(finding));
    add_notes(blocks, notes);
    add_comparison_traceability(blocks, result);
    add_signature(blocks);
    return document;
}

}  // namespace ringwright::drawing
