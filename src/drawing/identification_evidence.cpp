// What the answer rests on, release by release.

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "drawing/document.hpp"
#include "drawing/document_parts.hpp"
#include "drawing/identification_parts.hpp"
#include "drawing/result_reading.hpp"

namespace ringwright::drawing {
namespace {

/// The figures of more releases than this would make a report that nobody reads.
constexpr std::size_t most_releases_drawn = 10;

/// "4.2003(19) [4.1965 … 4.2041]".
std::string release_cell(const Json& holder, const char* key) {
    const Json& entry = at(holder, {key});
    if (!entry.is_object()) return "—";
    const QuantityText text = quantity_text(key, entry);
    const std::string interval = text.interval();
    return interval.empty() ? text.with_uncertainty() : text.with_uncertainty() + " [" + interval + "]";
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
            table.rows.push_back({name, release_cell(at(method, {"quantities"}), "natural_frequency"),
                                  release_cell(at(method, {"quantities"}), "damping_ratio")});
        else {
            table.rows.push_back({name, "does not apply", "does not apply"});
            reasons.push_back(std::string(key.name) + " does not apply: " + text_at(method, {"reason"}));
        }
    }
    blocks.push_back(table);
    for (const std::string& reason : reasons) blocks.push_back(Paragraph{reason, true});
    std::string agreement = text_at(event, {"agreement", "reading"});
    if (const auto p = number_at(event, {"agreement", "p_value"}); p && !agreement.empty()) {
        if (agreement.ends_with('.')) agreement.pop_back();
        agreement += *p < 0.0001 ? " (p < 0.0001)." : fmt::format(" (p = {:.3g}).", *p);
    }
    if (!agreement.empty()) blocks.push_back(Paragraph{agreement, true});
}

void add_modes(std::vector<Block>& blocks, const Json& event) {
    const auto& modes = list_at(event, {"methods", "curve_fit", "modes"});
    if (modes.size() < 2) return;
    Table table{{"mode", "natural frequency in Hz", "damping ratio"}, {}, {false, true, true}};
    for (const Json& mode : modes)
        table.rows.push_back(
            {table.rows.empty() ? "1, of the result" : fmt::format("{}", table.rows.size() + 1),
             release_cell(at(mode, {"quantities"}), "natural_frequency"),
             release_cell(at(mode, {"quantities"}), "damping_ratio")});
    blocks.push_back(table);
}

/// The stretches in numbers where damping or frequency are not the same in all of them.
void add_course(std::vector<Block>& blocks, const Json& event) {
    const Json& course = at(event, {"amplitude_course"});
    if (at(course, {"depends_on_amplitude"}) != true) return;
    const auto& points = list_at(course, {"points"});
    if (points.empty()) return;
    const std::string unit = text_at(points.front(), {"amplitude", "unit"});
    Table table{
        {unit.empty() ? "amplitude" : "amplitude in " + unit, "natural frequency in Hz", "damping ratio"},
        {},
        {true, true, true}};
    for (const Json& point : points) {
        const auto amplitude = number_at(point, {"amplitude", "value"});
        table.rows.push_back({amplitude ? fmt::format("{:.3g}", *amplitude) : "—",
                              release_cell(point, "natural_frequency"),
                              release_cell(point, "damping_ratio")});
    }
    blocks.push_back(table);
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
    add_modes(blocks, event);
    const std::string decay = fmt::format("decay-{}", number);
    if (decay != shown_already) add_picture(blocks, figures, decay);
    add_pairs(blocks, figures,
              {fmt::format("decrement-{}", number), fmt::format("spectrum-{}", number),
               fmt::format("autocorrelation-{}", number), fmt::format("course-{}", number)});
    add_course(blocks, event);
}

}  // namespace

void add_evidence(std::vector<Block>& blocks, const Json& result, const ReportInput& input,
                  const std::string& shown_already) {
    blocks.push_back(Heading{2, "Evidence"});
    blocks.push_back(
        Paragraph{fmt::format("In parentheses the standard uncertainty in the last digits (JCGM 100:2008, "
                              "7.2.2), in brackets the {} interval.",
                              confidence_text(result)),
                  true});
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

}  // namespace ringwright::drawing
