// Budget, traceability and methods.

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "drawing/document.hpp"
#include "drawing/document_parts.hpp"
#include "drawing/identification_parts.hpp"
#include "drawing/result_reading.hpp"
#include "ringwright/measured_value.hpp"

namespace ringwright::drawing {
namespace {

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
    const bool judged = at(result, {"verdict"}).is_object();
    std::string line = judged ? "ringwright verify" : "ringwright identify";
    for (const Json& recording : list_at(result, {"recordings"}))
        line += file_words(text_at(recording, {"file"}), text_at(recording, {"added_mass", "as_written"}));
    return line + closing_words(result);
}

/// Two significant digits, as an uncertainty has them (JCGM 100:2008, 7.2.6).
std::string two_digits(double uncertainty, const std::string& unit) {
    Estimate estimate;
    estimate.value = estimate.standard_uncertainty = uncertainty;
    const std::string text = round_to_uncertainty(estimate).standard_uncertainty;
    return unit == "1" || unit.empty() ? text : text + " " + unit;
}

}  // namespace

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
        table.rows.push_back(
            {key == last ? "" : quantity_name(key), text_at(line, {"source"}), u ? two_digits(*u, unit) : "—",
             contribution ? two_digits(*contribution, result_unit) : "—",
             share ? fmt::format("{:.1f} %", 100.0 * *share) : "—", freedom ? freedom_text(*freedom) : "∞"});
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

void add_traceability(std::vector<Block>& blocks, const Json& result) {
    blocks.push_back(Heading{2, "Traceability"});
    FactRows rows;
    const Json& sheet = at(result, {"test_sheet"});
    add_sensor(rows, result);
    add_fact(rows, "Mass", text_at(result, {"article", "mass", "as_written"}));
    add_fact(rows, "Inertia", text_at(result, {"article", "inertia", "as_written"}));
    add_fact(rows, "Mass of the spring", text_at(result, {"article", "spring_mass", "as_written"}));
    add_fact(rows, "Gravity", text_at(result, {"article", "gravity", "as_written"}));
    add_fact(rows, "Note on the article", text_at(sheet, {"article_note"}));
    add_fact(rows, "Note on the test", text_at(sheet, {"test_note"}));
    add_provenance(rows, result, command_line(result));
    blocks.push_back(Facts{rows, false});
    for (const Json& recording : list_at(result, {"recordings"})) {
        blocks.push_back(Heading{3, "Recording"});
        blocks.push_back(Facts{recording_facts(recording), false});
    }
}

namespace {

constexpr const char* viscous_text =
    "Curve fit: a decaying oscillation, from light to heavy damping in one model, fitted by variable "
    "projection "
    "(Golub and Pereyra, 1973) under an autoregressive model of the noise.";

// The terms that a law's name lists, in words.
std::string terms_of(const std::string& model) {
    const auto named = [&](const char* term) { return model.find(term) != std::string::npos; };
    std::string text =
        named("two-way") ? "one coefficient for compression and one for rebound" : "viscous damping";
    if (named("friction")) text += ", dry friction with a stop where it holds the mass";
    if (named("quadratic")) text += ", damping by the square of the velocity";
    if (named("hardening")) text += ", a spring that stiffens with the cube of its deflection";
    if (named("softening")) text += ", a spring that softens with the cube of its deflection";
    return text;
}

std::string law_text(const std::string& model) {
    return fmt::format(
        "Curve fit ({}): the equation of motion with {}, integrated from reversal to reversal (Dormand and "
        "Prince, 1980) and fitted by least squares under an autoregressive model of the noise. The terms "
        "beside viscous damping were chosen by an information criterion (Schwarz, 1978), the simpler model "
        "in "
        "a tie. The damping ratio is that of the viscous damper that takes the same energy in a cycle at the "
        "amplitude stated (Jacobsen, 1930).",
        model, terms_of(model));
}

// The models that were fitted, each once, in the order of the releases.
std::vector<std::string> models_of(const Json& result) {
    std::vector<std::string> models;
    for (const Json& recording : list_at(result, {"recordings"}))
        for (const Json& event : list_at(recording, {"events"})) {
            const std::string model = text_at(event, {"methods", "curve_fit", "model"});
            if (!model.empty() && std::ranges::find(models, model) == models.end()) models.push_back(model);
        }
    return models;
}

}  // namespace

void add_methods_text(std::vector<Block>& blocks, const Json& result) {
    blocks.push_back(Heading{2, "Methods"});
    const std::vector<std::string> models = models_of(result);
    const bool viscous = std::ranges::find(models, "viscous") != models.end();
    if (models.empty() || viscous) blocks.push_back(Paragraph{viscous_text, false});
    for (const std::string& model : models)
        if (model != "viscous") blocks.push_back(Paragraph{law_text(model), false});
    for (const char* text :
         {"Logarithmic decrement: a weighted straight line through the logarithms of successive swings.",
          "Half-power bandwidth: the width of the spectrum at 1/√2 of its peak, by the exact relation for a "
          "free decay.",
          "Intervals of the two simple methods come from a bootstrap with the fitted noise; repeats are "
          "pooled with a "
          "variance between releases (Mandel and Paule, 1982; Hartung and Knapp, 2001)."})
        blocks.push_back(Paragraph{text, false});
}

}  // namespace ringwright::drawing
