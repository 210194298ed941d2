// What the report of an identification says, in the order of ISO/IEC 17025:2017, 7.8.2: the answer at a
// glance, the evidence, the budget, the traceability.

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "drawing/document.hpp"
#include "drawing/document_parts.hpp"
#include "drawing/result_reading.hpp"

namespace ringwright::drawing {
namespace {

/// The figures of more releases than this would make a report that nobody reads.
constexpr std::size_t most_releases_drawn = 10;

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
    FactRows rows;
    add_fact(rows, "Article", text_at(result, {"test_sheet", "article_type"}));
    add_fact(rows, "Serial number", text_at(result, {"test_sheet", "serial"}));
    add_fact(rows, "Date of test", text_at(result, {"test_sheet", "date"}));
    add_fact(rows, "Tested by", text_at(result, {"test_sheet", "operator"}));
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
    const auto low = number_at(limit, {lower}), high = number_at(limit, {upper});
    if (low && high) return fmt::format("{:.6g} … {:.6g}", *low, *high);
    if (low) return fmt::format("≥ {:.6g}", *low);
    return high ? fmt::format("≤ {:.6g}", *high) : "—";
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

std::string release_cell(const Json& method, const char* key) {
    const Json& entry = at(method, {"quantities", key});
    if (!entry.is_object()) return "—";
    const QuantityText text = quantity_text(key, entry);
    const std::string interval = text.interval();
    return interval.empty() ? text.value : text.value + " [" + interval + "]";
}

void add_methods_table(std::vector<Block>& blocks, const Json& event) {
    Table table{{"method", "natural frequency in Hz", "damping ratio"}, {}, {false, true, true}};
    std::vector<std::string> reasons;
    for (const MethodKey& key : method_keys) {
        const Json& method = at(event, {"methods", key.key});
        if (!method.is_object()) continue;
        std::string name = key.name;
        const std::string model = text_at(method, {"model"});
        if (!model.empty()) name += " (" + model + ")";
        if (text_at(method, {"status"}) == "ok")
            table.rows.push_back(
                {name, release_cell(method, "natural_frequency"), release_cell(method, "damping_ratio")});
        else {
            table.rows.push_back({name, "does not apply", "does not apply"});
            reasons.push_back(std::string(key.name) + " does not apply: " + text_at(method, {"reason"}));
        }
    }
    blocks.push_back(table);
    for (const std::string& reason : reasons) blocks.push_back(Paragraph{reason, true});
    std::string agreement = text_at(event, {"agreement", "reading"});
    if (const auto p = number_at(event, {"agreement", "p_value"}))
        agreement += *p < 0.0001 ? " (p < 0.0001)" : fmt::format(" (p = {:.3g})", *p);
    if (!agreement.empty()) blocks.push_back(Paragraph{agreement, true});
}

/// Small figures, two beside each other.
void add_pairs(std::vector<Block>& blocks, const std::vector<NamedFigure>& figures,
               const std::vector<std::string>& names) {
    Pictures pair;
    for (const std::string& name : names) {
        const NamedFigure* figure = find_figure(figures, name);
        if (figure == nullptr) continue;
        pair.figures.push_back(*figure);
        if (pair.figures.size() < 2) continue;
        blocks.push_back(pair);
        pair.figures.clear();
    }
    if (!pair.figures.empty()) blocks.push_back(pair);
}

void add_release(std::vector<Block>& blocks, const Json& event, std::size_t number,
                 const std::vector<NamedFigure>& figures, const std::string& shown_already) {
    const auto start = number_at(event, {"start_s"}), end = number_at(event, {"end_s"});
    std::string heading = fmt::format("Release {}", number);
    if (start && end) heading += fmt::format(", from {:.3f} s to {:.3f} s", *start, *end);
    blocks.push_back(Heading{3, heading});
    add_methods_table(blocks, event);
    const std::string decay = fmt::format("decay-{}", number);
    if (decay != shown_already) add_picture(blocks, figures, decay);
    add_pairs(blocks, figures,
              {fmt::format("decrement-{}", number), fmt::format("spectrum-{}", number),
               fmt::format("autocorrelation-{}", number), fmt::format("course-{}", number)});
}

void add_evidence(std::vector<Block>& blocks, const Json& result, const ReportInput& input,
                  const std::string& shown_already) {
    blocks.push_back(Heading{2, "Evidence"});
    std::size_t number = 0, recording_number = 0;
    for (const Json& recording : list_at(result, {"recordings"})) {
        add_picture(blocks, input.figures, fmt::format("recording-{}", ++recording_number));
        for (const Json& event : list_at(recording, {"events"}))
            if (++number <= most_releases_drawn)
                add_release(blocks, event, number, input.figures, shown_already);
        if (const std::string reason = text_at(recording, {"reason"}); !reason.empty())
            blocks.push_back(
                Paragraph{text_at(recording, {"file"}) + ": no release found: " + reason, false});
    }
    if (number > most_releases_drawn)
        blocks.push_back(
            Paragraph{fmt::format("The first {} of {} releases are shown one by one; all of them enter the "
                                  "result.",
                                  most_releases_drawn, number),
                      true});
    for (const std::string& missing : input.missing_figures) blocks.push_back(Paragraph{missing, true});
}

/// Findings that several places share are said once.
struct GatheredNote {
    Note note;
    std::vector<std::string> places;
};

void gather(std::vector<GatheredNote>& notes, const Json& holder, const std::string& place) {
    for (const Json& finding : list_at(holder, {"findings"})) {
        const Note note{text_at(finding, {"severity"}), text_at(finding, {"message"})};
        auto same = std::ranges::find_if(notes, [&](const GatheredNote& other) {
            return other.note.text == note.text && other.note.severity == note.severity;
        });
        if (same == notes.end()) same = notes.insert(notes.end(), {note, {}});
        if (!place.empty()) same->places.push_back(place);
    }
}

std::string places_text(const std::vector<std::string>& places) {
    constexpr std::size_t shown = 6;
    std::string text;
    for (std::size_t i = 0; i < std::min(places.size(), shown); ++i)
        text.append(i == 0 ? "" : ", ").append(places[i]);
    if (places.size() > shown) text += fmt::format(" and {} more", places.size() - shown);
    return text.empty() ? "" : text + ": ";
}

Notes findings_of(const Json& result, const std::vector<std::string>& differences) {
    std::vector<GatheredNote> gathered;
    const auto& recordings = list_at(result, {"recordings"});
    std::size_t number = 0;
    for (const Json& recording : recordings) {
        gather(gathered, recording, recordings.size() > 1 ? text_at(recording, {"file"}) : "");
        for (const Json& event : list_at(recording, {"events"}))
            gather(gathered, event, fmt::format("release {}", ++number));
    }
    gather(gathered, at(result, {"result"}), "");
    gather(gathered, at(result, {"verdict"}), "");
    Notes notes;
    for (const std::string& difference : differences) notes.notes.push_back({"caution", difference});
    for (const char* severity : {"defect", "caution", "note"})
        for (const GatheredNote& entry : gathered)
            if (entry.note.severity == severity)
                notes.notes.push_back({severity, places_text(entry.places) + entry.note.text});
    return notes;
}

std::string with_unit(double value, const std::string& unit, const char* form) {
    return fmt::format(fmt::runtime(form), value) + (unit == "1" || unit.empty() ? "" : " " + unit);
}

void add_budget(std::vector<Block>& blocks, const Json& result) {
    Table table{
        {"uncertainty of", "source", "standard uncertainty", "contribution", "share", "degrees of freedom"},
        {},
        {false, false, true, true, true, true}};
    std::string last;
    for (const Json& line : list_at(result, {"result", "budget"})) {
        const std::string key = text_at(line, {"quantity"});
        const std::string unit = text_at(line, {"unit"});
        const std::string result_unit = text_at(result, {"result", "quantities", key.c_str(), "unit"});
        const auto u = number_at(line, {"standard_uncertainty"}),
                   contribution = number_at(line, {"contribution"});
        const auto share = number_at(line, {"share"}), freedom = number_at(line, {"degrees_of_freedom"});
        table.rows.push_back({key == last ? "" : quantity_name(key), text_at(line, {"source"}),
                              u ? with_unit(*u, unit, "{:.2g}") : "—",
                              contribution ? with_unit(*contribution, result_unit, "{:.2g}") : "—",
                              share ? fmt::format("{:.1f} %", 100.0 * *share) : "—",
                              freedom ? freedom_text(*freedom) : "∞"});
        last = key;
    }
    if (table.rows.empty()) return;
    blocks.push_back(Heading{2, "Uncertainty budget"});
    blocks.push_back(table);
    blocks.push_back(
        Paragraph{"Combined by the law of propagation (JCGM 100:2008, 5.1.2); degrees of freedom by "
                  "Welch–Satterthwaite (G.4.1).",
                  true});
}

FactRows recording_facts(const Json& recording) {
    FactRows rows;
    add_fact(rows, "File", text_at(recording, {"file"}));
    add_fact(rows, "SHA-256", text_at(recording, {"sha256"}));
    add_fact(rows, "Channel", text_at(recording, {"channel"}));
    const std::string quantity = text_at(recording, {"quantity"}), unit = text_at(recording, {"unit"});
    add_fact(rows, "Measured", quantity.empty() || unit.empty() ? quantity + unit : quantity + " in " + unit);
    const auto count = number_at(recording, {"sample_count"}),
               rate = number_at(recording, {"sample_rate_hz"});
    const auto duration = number_at(recording, {"duration_s"});
    if (count && rate && duration)
        add_fact(rows, "Samples", fmt::format("{:.0f} at {:.8g} Hz, {:.6g} s", *count, *rate, *duration));
    add_fact(rows, "Added mass", text_at(recording, {"added_mass", "as_written"}));
    return rows;
}

/// The command line that gives this result again; empty where the result does not hold its options.
std::string command_line(const Json& result) {
    if (!at(result, {"options"}).is_array()) return "";
    const std::string sheet = text_at(result, {"test_sheet", "file"});
    std::string line = sheet.empty() ? "ringwright identify" : "ringwright verify";
    for (const Json& recording : list_at(result, {"recordings"})) {
        line.append(" ").append(quoted(text_at(recording, {"file"})));
        const std::string added = text_at(recording, {"added_mass", "as_written"});
        if (!added.empty()) line.append(" --added-mass ").append(quoted(added));
    }
    if (!sheet.empty()) line.append(" --sheet ").append(quoted(sheet));
    for (const Json& option : list_at(result, {"options"}))
        if (option.is_string()) line.append(" ").append(quoted(option.get<std::string>()));
    return line;
}

void add_traceability(std::vector<Block>& blocks, const Json& result) {
    blocks.push_back(Heading{2, "Traceability"});
    FactRows rows;
    const Json& sheet = at(result, {"test_sheet"});
    add_fact(rows, "Sensor", text_at(sheet, {"sensor"}));
    add_fact(rows, "Sensor calibrated", text_at(sheet, {"sensor_calibrated"}));
    add_fact(rows, "Calibration due", text_at(sheet, {"sensor_due"}));
    add_fact(rows, "Mass", text_at(result, {"article", "mass", "as_written"}));
    add_fact(rows, "Inertia", text_at(result, {"article", "inertia", "as_written"}));
    add_fact(rows, "Mass of the spring", text_at(result, {"article", "spring_mass", "as_written"}));
    add_fact(rows, "Gravity", text_at(result, {"article", "gravity", "as_written"}));
    add_fact(rows, "Note on the article", text_at(sheet, {"article_note"}));
    add_fact(rows, "Note on the test", text_at(sheet, {"test_note"}));
    add_fact(rows, "Test sheet", text_at(sheet, {"file"}));
    add_fact(rows, "SHA-256 of the sheet", text_at(sheet, {"sha256"}));
    add_fact(rows, "Software",
             text_at(result, {"software", "name"}) + " " + text_at(result, {"software", "version"}));
    add_fact(rows, "Command", command_line(result));
    blocks.push_back(Facts{rows, false});
    for (const Json& recording : list_at(result, {"recordings"})) {
        blocks.push_back(Heading{3, "Recording"});
        blocks.push_back(Facts{recording_facts(recording), false});
    }
}

void add_methods_text(std::vector<Block>& blocks) {
    blocks.push_back(Heading{2, "Methods"});
    for (const char* text :
         {"Curve fit: a decaying oscillation, from light to heavy damping in one model, fitted by variable "
          "projection "
          "(Golub and Pereyra, 1973) under an autoregressive model of the noise.",
          "Logarithmic decrement: a weighted straight line through the logarithms of successive swings.",
          "Half-power bandwidth: the width of the spectrum at 1/√2 of its peak, by the exact relation for a "
          "free decay.",
          "Intervals of the two simple methods come from a bootstrap with the fitted noise; repeats are "
          "pooled with a "
          "variance between releases (Mandel and Paule, 1982; Hartung and Knapp, 2001)."})
        blocks.push_back(Paragraph{text, false});
}

void add_closing(std::vector<Block>& blocks) {
    blocks.push_back(Heading{2, "Remarks and signature"});
    blocks.push_back(
        Paragraph{"The results relate only to the article tested, as it was received and tested.", false});
    blocks.push_back(
        Paragraph{"Springs under load, suspended and dropped masses injure people. This report documents a "
                  "measurement and is no release of the part: the maker's instructions, local codes and "
                  "licensed practice decide that.",
                  false});
    blocks.push_back(SignatureLines{});
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
    const std::string article = article_name(result);
    Document document;
    document.title = "Natural frequency and damping";
    document.number = report_number(result);
    document.subject = article;
    document.date = text_at(result, {"test_sheet", "date"});
    document.creator = text_at(result, {"software", "name"}) + " " + text_at(result, {"software", "version"});
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
    if (const Notes findings = findings_of(result, input.differences); !findings.notes.empty()) {
        blocks.push_back(Heading{2, "Findings"});
        blocks.push_back(findings);
    }
    add_evidence(blocks, result, input, main_figure);
    add_budget(blocks, result);
    add_traceability(blocks, result);
    add_methods_text(blocks);
    add_closing(blocks);
    return document;
}

}  // namespace ringwright::drawing
