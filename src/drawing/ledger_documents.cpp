// What the reports over the ledger say: control chart and gauge study.

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "drawing/document.hpp"
#include "drawing/document_parts.hpp"
#include "drawing/quality_figures.hpp"
#include "drawing/result_reading.hpp"

namespace ringwright::drawing {
namespace {

/// "0.22 … 0.34, 2 of 40 outside"; empty where no limit is known.
std::string specified_text(const Json& chart) {
    const auto low = number_at(chart, {"lower_specification"}),
               high = number_at(chart, {"upper_specification"});
    const std::string range = range_text(low, high), unit = text_at(chart, {"unit"});
    if (range.empty()) return "";
    const auto& values = list_at(chart, {"values"});
    const auto outside = std::ranges::count_if(values, [&](const Json& entry) {
        const auto value = number_at(entry, {"value"});
        return value && ((low && *value < *low) || (high && *value > *high));
    });
    return fmt::format("{}{}, {} of {} outside", range, unit == "1" || unit.empty() ? "" : " " + unit,
                       outside, values.size());
}

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
    add_fact(rows, "Specified", specified_text(chart));
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
