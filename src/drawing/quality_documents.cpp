// What the reports of a comparison, a control chart and a gauge study say.

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "drawing/document.hpp"
#include "drawing/document_parts.hpp"
#include "drawing/quality_figures.hpp"
#include "drawing/result_reading.hpp"

namespace ringwright::drawing {
namespace {

std::string with_unit(double value, const std::string& unit, int digits = 6) {
    return fmt::format("{:.{}g}", value, digits) + (unit == "1" || unit.empty() ? "" : " " + unit);
}

std::string p_text(std::optional<double> p) {
    if (!p) return "—";
    return *p < 1e-4 ? "< 0.0001" : fmt::format("{:.4f}", *p);
}

Document opened(const Json& result, const char* kind, const std::string& title) {
    Document document;
    document.kind = kind;
    document.title = title;
    document.number = report_number(result);
    document.subject = article_name(result);
    document.date = text_at(result, {"test_sheet", "date"});
    document.creator = text_at(result, {"software", "name"}) + " " + text_at(result, {"software", "version"});
    return document;
}

void add_software(FactRows& rows, const Json& result) {
    const std::string name = text_at(result, {"software", "name"});
    if (!name.empty()) add_fact(rows, "Software", name + " " + text_at(result, {"software", "version"}));
}

void add_findings(std::vector<Block>& blocks, const Json& result) {
    Notes notes;
    for (const Json& finding : list_at(result, {"findings"}))
        notes.notes.push_back({text_at(finding, {"severity"}), text_at(finding, {"message"})});
    if (notes.notes.empty()) return;
    blocks.push_back(Heading{2, "Findings"});
    blocks.push_back(notes);
}

void add_signature(std::vector<Block>& blocks) {
    blocks.push_back(Heading{2, "Remarks and signature"});
    blocks.push_back(SignatureLines{});
}

// ---- Before and after -------------------------------------------------------------------------------------

std::string side_text(const Json& result, const char* side) {
    const std::size_t count = list_at(result, {side, "recordings"}).size();
    const std::string releases = text_at(result, {side, "event_count"});
    std::string text = fmt::format("{} recording{}", count, count == 1 ? "" : "s");
    if (!releases.empty()) text += fmt::format(", {} release{}", releases, releases == "1" ? "" : "s");
    return text;
}

Facts comparison_facts(const Json& result, const std::string& number) {
    FactRows rows;
    add_fact(rows, "Article", text_at(result, {"test_sheet", "article_type"}));
    add_fact(rows, "Serial number", text_at(result, {"test_sheet", "serial"}));
    add_fact(rows, "Date of test", text_at(result, {"test_sheet", "date"}));
    add_fact(rows, "Tested by", text_at(result, {"test_sheet", "operator"}));
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
            line.append(" ").append(quoted(text_at(recording, {"file"})));
            const std::string added = text_at(recording, {"added_mass"});
            if (!added.empty()) line.append(" --added-mass ").append(quoted(added));
            open = added.empty();
        }
    }
    const std::string sheet = text_at(result, {"test_sheet", "file"});
    if (!sheet.empty()) line.append(" --sheet ").append(quoted(sheet));
    for (const Json& option : list_at(result, {"options"}))
        if (option.is_string()) line.append(" ").append(quoted(option.get<std::string>()));
    return line;
}

void add_comparison_traceability(std::vector<Block>& blocks, const Json& result) {
    blocks.push_back(Heading{2, "Traceability"});
    FactRows rows;
    const Json& sheet = at(result, {"test_sheet"});
    add_fact(rows, "Sensor", text_at(sheet, {"sensor"}));
    add_fact(rows, "Sensor calibrated", text_at(sheet, {"sensor_calibrated"}));
    add_fact(rows, "Calibration due", text_at(sheet, {"sensor_due"}));
    add_fact(rows, "Test sheet", text_at(sheet, {"file"}));
    add_fact(rows, "SHA-256 of the sheet", text_at(sheet, {"sha256"}));
    add_software(rows, result);
    add_fact(rows, "Command", compare_command_line(result));
    if (!rows.empty()) blocks.push_back(Facts{rows, false});
    add_side(blocks, result, "before", "Before");
    add_side(blocks, result, "after", "After");
}

// ---- Over the ledger --------------------------------------------------------------------------------------

Facts chart_facts(const Json& chart, const std::string& number) {
    const auto& values = list_at(chart, {"values"});
    FactRows rows;
    add_fact(rows, "Quantity", quantity_name(text_at(chart, {"quantity"})));
    add_fact(rows, "Entries", fmt::format("{}", values.size()));
    if (!values.empty()) {
        add_fact(rows, "From", text_at(values.front(), {"day"}));
        add_fact(rows, "To", text_at(values.back(), {"day"}));
    }
    for (const auto& [key, name] :
         {std::pair{"article_type", "Article"}, std::pair{"serial", "Serial number"},
          std::pair{"operator", "Tested by"}, std::pair{"decision", "Decision"}})
        add_fact(rows, name, text_at(chart, {"filter", key}));
    add_fact(rows, "Report number", number);
    return {rows, true};
}

Answer chart_answer(const Json& chart) {
    const std::string unit = text_at(chart, {"unit"});
    const std::size_t signals = list_at(chart, {"signals"}).size();
    Answer answer;
    answer.headline =
        signals == 0 ? "No signal" : fmt::format("{} signal{}", signals, signals == 1 ? "" : "s");
    answer.reading =
        signals == 0 ? "The values scatter about their mean as chance would have it, by the rules asked for."
                     : "Values that chance alone seldom makes; look for what was done differently.";
    for (const auto& [key, name] :
         {std::pair{"center", "centre"}, std::pair{"sigma", "sigma"},
          std::pair{"lower_limit", "lower control limit"}, std::pair{"upper_limit", "upper control limit"}})
        if (const auto value = number_at(chart, {key}))
            answer.tiles.push_back({name, with_unit(*value, unit, 4), ""});
    return answer;
}

std::string trend_text(const Json& chart) {
    const Json& slope = at(chart, {"trend", "slope_per_year"});
    if (!slope.is_object()) return "";
    const ShownValue shown = shown_value(slope);
    const std::string unit = text_at(chart, {"unit"});
    std::string text = fmt::format("Trend: {} a year", with_unit(shown.value, unit, 3));
    if (std::isfinite(shown.low))
        text += fmt::format(", between {:.3g} and {:.3g} at {} confidence", shown.low, shown.high,
                            confidence_text(chart));
    return text + fmt::format("; p = {} of no trend.", p_text(number_at(chart, {"trend", "p_value"})));
}

void add_signals(std::vector<Block>& blocks, const Json& chart) {
    const auto& signals = list_at(chart, {"signals"});
    if (signals.empty()) return;
    Table table{{"pattern", "first entry", "last entry"}, {}, {false, true, true}};
    for (const Json& signal : signals)
        table.rows.push_back(
            {text_at(signal, {"rule"}), text_at(signal, {"first_entry"}), text_at(signal, {"last_entry"})});
    blocks.push_back(Heading{2, "Signals"});
    blocks.push_back(table);
}

void add_charted_values(std::vector<Block>& blocks, const Json& chart) {
    const auto& values = list_at(chart, {"values"});
    const std::size_t first = values.size() > most_charted ? values.size() - most_charted : 0;
    Table table{{"entry", "date", "serial number", "tested by", "value", "standard uncertainty"},
                {},
                {true, false, false, false, true, true}};
    for (std::size_t i = first; i < values.size(); ++i) {
        const QuantityText text = quantity_text(text_at(chart, {"quantity"}), values[i]);
        table.rows.push_back({text_at(values[i], {"entry"}), text_at(values[i], {"day"}),
                              cell(text_at(values[i], {"serial"})), cell(text_at(values[i], {"operator"})),
                              text.value, cell(text.uncertainty)});
    }
    const std::string unit = text_at(chart, {"unit"});
    blocks.push_back(Heading{2, unit == "1" || unit.empty() ? "Values" : "Values in " + unit});
    blocks.push_back(table);
    if (first > 0)
        blocks.push_back(Paragraph{
            fmt::format("The last {} of {} entries are listed.", most_charted, values.size()), true});
}

Answer gauge_answer(const Json& study) {
    Answer answer;
    const double share = number_at(study, {"measurement_share_of_sigma"}).value_or(0.0);
    answer.headline = fmt::format("The measurement takes {:.1f} % of the total sigma", 100.0 * share);
    answer.reading = fmt::format("It tells about {:.1f} classes of articles apart.",
                                 number_at(study, {"distinct_classes"}).value_or(0.0));
    return answer;
}

void add_parts(std::vector<Block>& blocks, const Json& study) {
    const std::string unit = text_at(study, {"unit"});
    Table table{{"part of the scatter", unit == "1" || unit.empty() ? "sigma" : "sigma in " + unit,
                 confidence_text(study) + " interval", "share of variance"},
                {},
                {false, true, true, true}};
    for (const VariationPart& part : variation_parts(study))
        table.rows.push_back(
            {part.source, fmt::format("{:.4g}", std::sqrt(part.variance)),
             fmt::format("{:.4g} … {:.4g}", std::sqrt(std::max(0.0, part.low)), std::sqrt(part.high)),
             fmt::format("{:.1f} %", 100.0 * part.share)});
    blocks.push_back(Heading{2, "Parts of the scatter"});
    blocks.push_back(table);
}

void add_variance_table(std::vector<Block>& blocks, const Json& study) {
    Table table{{"source", "sum of squares", "degrees of freedom", "mean square", "F", "p-value"},
                {},
                {false, true, true, true, true, true}};
    const auto number = [](const Json& row, const char* key) {
        const auto value = number_at(row, {key});
        return value ? fmt::format("{:.5g}", *value) : std::string("—");
    };
    for (const Json& row : list_at(study, {"table"}))
        table.rows.push_back({text_at(row, {"source"}), number(row, "sum_of_squares"),
                              number(row, "degrees_of_freedom"), number(row, "mean_square"), number(row, "f"),
                              p_text(number_at(row, {"p_value"}))});
    blocks.push_back(Heading{2, "Analysis of variance"});
    blocks.push_back(table);
}

Facts gauge_facts(const Json& study, const std::string& number) {
    FactRows rows;
    add_fact(rows, "Quantity", quantity_name(text_at(study, {"quantity"})));
    add_fact(rows, "Articles", text_at(study, {"articles"}));
    add_fact(rows, "Operators", text_at(study, {"operators"}));
    add_fact(rows, "Repeats", text_at(study, {"repeats"}));
    add_fact(rows, "Report number", number);
    return {rows, true};
}

}  // namespace

Document comparison_document(const Json& result) {
    Document document = opened(result, "Comparison", "Before against after");
    auto& blocks = document.blocks;
    blocks.push_back(comparison_facts(result, document.number));
    blocks.push_back(comparison_answer(result));
    blocks.push_back(Pictures{{comparison_figure(result)}});
    add_compared(blocks, result);
    add_findings(blocks, result);
    add_comparison_traceability(blocks, result);
    add_signature(blocks);
    return document;
}

Document chart_document(const Json& chart) {
    Document document = opened(chart, "Control chart", "Individuals and moving ranges");
    document.subject = quantity_name(text_at(chart, {"quantity"}));
    if (const auto& values = list_at(chart, {"values"}); !values.empty())
        document.date = text_at(values.back(), {"day"});
    auto& blocks = document.blocks;
    blocks.push_back(chart_facts(chart, document.number));
    blocks.push_back(chart_answer(chart));
    blocks.push_back(Pictures{{chart_figure(chart)}});
    if (const std::string trend = trend_text(chart); !trend.empty())
        blocks.push_back(Paragraph{trend, false});
    add_signals(blocks, chart);
    add_charted_values(blocks, chart);
    blocks.push_back(
        Paragraph{"Sigma is the mean moving range of two over 1.128; control limits stand at three "
                  "sigma (e-Handbook of Statistical Methods, 6.3.2.2), patterns after Nelson "
                  "(1984).",
                  true});
    add_signature(blocks);
    return document;
}

Document gauge_document(const Json& study) {
    Document document = opened(study, "Gauge study", "Repeatability and reproducibility");
    document.subject = quantity_name(text_at(study, {"quantity"}));
    auto& blocks = document.blocks;
    blocks.push_back(gauge_facts(study, document.number));
    blocks.push_back(gauge_answer(study));
    blocks.push_back(Pictures{{gauge_figure(study)}});
    if (const std::string note = text_at(study, {"note"}); !note.empty())
        blocks.push_back(Paragraph{note, true});
    add_parts(blocks, study);
    add_variance_table(blocks, study);
    blocks.push_back(
        Paragraph{"Two-way analysis of variance, all effects random (Montgomery and Runger, 1993); "
                  "intervals by modified large samples (Burdick, Borror and Montgomery, 2003).",
                  true});
    add_signature(blocks);
    return document;
}

}  // namespace ringwright::drawing
