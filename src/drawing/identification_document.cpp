// What the report of an identification says, in the order of ISO/IEC 17025:2017, 7.8.2: the answer at a
// glance, the evidence, the budget, the traceability. Here the order, and the answer.

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "drawing/document.hpp"
#include "drawing/document_parts.hpp"
#include "drawing/identification_parts.hpp"
#include "drawing/result_reading.hpp"

namespace ringwright::drawing {
namespace {

/// "pluck", or "pluck, tap" where the releases differ.
std::string kinds_of_test(const Json& result) {
    std::vector<std::string> kinds;
    for (const Json& recording : list_at(result, {"recordings"}))
        for (const Json& event : list_at(recording, {"events"})) {
            const std::string kind = text_at(event, {"test"});
            if (!kind.empty() && std::ranges::find(kinds, kind) == kinds.end()) kinds.push_back(kind);
        }
    std::string text;
    for (const std::string& kind : kinds) text.append(text.empty() ? "" : ", ").append(kind);
    return text;
}

Facts opening_facts(const Json& result, const std::string& number) {
    FactRows rows = sheet_facts(result);
    add_fact(rows, "Kind of test", kinds_of_test(result));
    const auto& recordings = list_at(result, {"recordings"});
    if (recordings.size() == 1)
        add_fact(rows, "Recording", text_at(recordings.front(), {"file"}));
    else if (!recordings.empty())
        add_fact(rows, "Recordings", fmt::format("{}", recordings.size()));
    add_fact(rows, "Releases", text_at(result, {"result", "event_count"}));
    add_fact(rows, "Report number", number);
    return {rows, true};
}

std::string verdict_headline(const std::string& decision) {
    if (decision == "conforms") return "Conforms";
    if (decision == "does_not_conform") return "Does not conform";
    return decision.empty() ? "" : "Undecided";
}

std::string verdict_reading(const Json& result) {
    const std::string decision = text_at(result, {"verdict", "decision"});
    const std::string rule = text_at(result, {"verdict", "rule"});
    if (decision.empty()) return "";
    const std::string by = rule.empty() ? "" : ", by the rule of " + rule;
    if (decision == "conforms") return "Every limit is met" + by + ".";
    if (decision == "does_not_conform") return "At least one limit is not met" + by + ".";
    return "The uncertainty is too large to decide" + by + ".";
}

Answer answer_of(const Json& result) {
    Answer answer;
    answer.verdict = text_at(result, {"verdict", "decision"});
    answer.headline = verdict_headline(answer.verdict);
    answer.reading = verdict_reading(result);
    for (const char* key :
         {"natural_frequency", "damping_ratio", "slow_decay_rate", "stiffness", "damping_coefficient"}) {
        const Json& entry = at(result, {"result", "quantities", key});
        if (!entry.is_object() || answer.tiles.size() == 4) continue;
        const QuantityText text = quantity_text(key, entry);
        const std::string interval = text.interval();
        answer.tiles.push_back({text.name, text.with_unit(),
                                interval.empty() ? interval : confidence_text(result) + ": " + interval});
    }
    if (answer.tiles.empty() && answer.headline.empty()) {
        answer.headline = "No method can answer";
        answer.reading = "The findings say why.";
    }
    return answer;
}

Table result_table(const Json& result) {
    Table table{{"quantity", "value", "unit", "standard uncertainty", confidence_text(result) + " interval",
                 "degrees of freedom"},
                {},
                {false, true, false, true, true, true}};
    const Json& quantities = at(result, {"result", "quantities"});
    if (!quantities.is_object()) return table;
    for (const auto& [key, entry] : quantities.items()) {
        const QuantityText text = quantity_text(key, entry);
        table.rows.push_back({text.name, text.value, cell(text.unit), cell(text.uncertainty),
                              cell(text.interval()),
                              text.degrees_of_freedom.empty() ? "∞" : text.degrees_of_freedom});
    }
    return table;
}

std::string limit_text(const Json& limit, const char* lower, const char* upper) {
    return cell(range_text(number_at(limit, {lower}), number_at(limit, {upper})));
}

std::string probability_text(const Json& limit) {
    const auto probability = number_at(limit, {"probability_of_conformity"});
    if (!probability) return "—";
    if (*probability > 0.9999) return "> 99.99 %";
    if (*probability < 0.0001) return "< 0.01 %";
    return fmt::format("{:.2f} %", 100.0 * *probability);
}

void add_verdict(std::vector<Block>& blocks, const Json& result) {
    const auto& limits = list_at(result, {"verdict", "limits"});
    if (limits.empty()) return;
    blocks.push_back(Heading{2, "Statement of conformity"});
    Table table{
        {"limit of", "unit", "permitted", "accepted", "value", "probability of conformity", "decision"},
        {},
        {false, false, true, true, true, true, false}};
    std::vector<std::string> readings;
    for (const Json& limit : limits) {
        const std::string key = text_at(limit, {"quantity"});
        const Json& entry = at(result, {"result", "quantities", key.c_str()});
        const QuantityText text = entry.is_object() ? quantity_text(key, entry) : QuantityText{};
        table.rows.push_back({quantity_name(key), cell(text.unit), limit_text(limit, "lower", "upper"),
                              limit_text(limit, "acceptance_lower", "acceptance_upper"), cell(text.value),
                              probability_text(limit), verdict_headline(text_at(limit, {"decision"}))});
        if (const std::string reading = text_at(limit, {"reading"}); !reading.empty())
            readings.push_back(quantity_name(key) + ": " + reading);
        if (const std::string remedy = text_at(limit, {"remedy", "reading"}); !remedy.empty())
            readings.push_back(quantity_name(key) + ": " + remedy);
    }
    blocks.push_back(table);
    const std::string rule = text_at(result, {"verdict", "rule"});
    if (!rule.empty()) blocks.push_back(Paragraph{"Decision rule: " + rule + " (JCGM 106:2012).", false});
    for (const std::string& reading : readings) blocks.push_back(Paragraph{reading, false});
}

void add_closing(std::vector<Block>& blocks) {
    add_signature(blocks,
                  {"The results relate only to the article tested, as it was received and tested.",
                   "Springs under load, suspended and dropped masses injure people. This report documents a "
                   "measurement and is no release of the part: the maker's instructions, local codes and "
                   "licensed practice decide that."});
}

void add_first_page(Document& document, const Json& result, const std::vector<NamedFigure>& own,
                    const ReportInput& input, const std::string& main_figure) {
    document.blocks.push_back(opening_facts(result, document.number));
    document.blocks.push_back(answer_of(result));
    if (main_figure == "verdict")
        add_picture(document.blocks, own, main_figure);
    else
        add_picture(document.blocks, input.figures, main_figure);
    add_picture(document.blocks, own, "methods");
    if (text_at(result, {"result", "event_count"}) == "1")
        document.blocks.push_back(Paragraph{"One release: repeatability was not tested.", true});
}

}  // namespace

Document identification_document(const Json& result, const ReportInput& input) {
    const std::vector<NamedFigure> own = figures_of_result(input.result_json, input.file);
    Document document = opened(result, "Test report", "Natural frequency and damping");
    const bool judged = find_figure(own, "verdict") != nullptr;
    const std::string main_figure = judged ? "verdict" : "decay-1";
    add_first_page(document, result, own, input, main_figure);
    auto& blocks = document.blocks;
    blocks.push_back(PageBreak{});
    if (const Table results = result_table(result); !results.rows.empty()) {
        blocks.push_back(Heading{2, "Results"});
        blocks.push_back(results);
        const std::string method = method_name(text_at(result, {"result", "method"}));
        blocks.push_back(
            Paragraph{fmt::format("By {}. Intervals cover the true value with {} confidence; SI units.",
                                  method, confidence_text(result)),
                      true});
    }
    add_verdict(blocks, result);
    add_notes(blocks, findings_of(result, input.differences));
    add_evidence(blocks, result, input, main_figure);
    add_budget(blocks, result);
    add_traceability(blocks, result);
    add_methods_text(blocks, result);
    add_closing(blocks);
    return document;
}

}  // namespace ringwright::drawing
