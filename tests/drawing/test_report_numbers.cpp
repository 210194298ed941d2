// Every number that a reader needs of a result is found in the text of its report, in HTML and in PDF, at the
// digits that its uncertainty supports: two of the standard uncertainty (JCGM 100:2008, 7.2.6).
#include <fmt/format.h>

#include <algorithm>
#include <catch2/catch.hpp>
#include <cmath>
#include <nlohmann/json.hpp>

#include "drawing/pdf_tools.hpp"
#include "ringwright/analysis.hpp"
#include "ringwright/measured_value.hpp"
#include "ringwright/report_document.hpp"
#include "ringwright/result_json.hpp"
#include "support/simulated_law.hpp"

using namespace ringwright;
using Json = nlohmann::ordered_json;

namespace {

Json identified(double friction, std::vector<NamedFigure>& figures) {
    simulated::Deviates deviates(8101);
    simulated::Law law;
    law.friction = friction;
    simulated::Bench bench;
    std::vector<RecordingInput> inputs;
    for (const char* name : {"first.csv", "second.csv", "third.csv"}) {
        Recording recording = simulated::draw(law, bench, deviates).recording;
        recording.origin.file = name;
        recording.origin.sha256 = std::string(63, 'e') + name[0];
        recording.unit = find_unit("mm").value();
        inputs.push_back({recording, std::nullopt});
    }
    AnalysisOptions options;
    options.identify.pictures = options.keep_samples = true;
    options.identify.replicates = 60;
    options.article.mass = parse_measured_value("5.00(2) kg", "mass", Dimension::mass);
    const Identification identification = identify(std::move(inputs), options);
    figures = figures_of(identification);
    Json json = to_json(identification);
    json["options"] = {"--mass=5.00(2) kg", "--seed=8101"};
    return json;
}

/// Holds the wanted numbers against both texts.
struct Reports {
    std::string html, pdf;
    std::size_t checked = 0;

    void want(const std::string& text, const std::string& where) {
        INFO(where << ": " << text);
        CHECK(html.find(text) != std::string::npos);
        CHECK(pdf.find(text) != std::string::npos);
        ++checked;
    }
    void want_estimate(const Json& entry, const std::string& where, bool with_uncertainty) {
        Estimate estimate;
        estimate.value = entry.at("value");
        estimate.standard_uncertainty = entry.at("standard_uncertainty");
        if (entry.contains("interval")) estimate.interval = {entry["interval"][0], entry["interval"][1]};
        const RoundedEstimate rounded = round_to_uncertainty(estimate);
        want(rounded.value, where);
        if (entry.contains("interval"))
            want(rounded.low, where + ", low"), want(rounded.high, where + ", high");
        // Of a release in the last digits: 4.2003(19).
        const std::string& u = rounded.standard_uncertainty;
        const std::size_t digits = u.find_first_of("123456789");
        want(with_uncertainty ? u : rounded.value + "(" + (u[0] == '0' ? u.substr(digits) : u) + ")",
             where + ", u");
    }
};

void check_numbers(const Json& json, Reports& reports) {
    for (const auto& [key, entry] : json["result"]["quantities"].items())
        reports.want_estimate(entry, key, true);
    for (const Json& line : json["result"]["budget"]) {
        reports.want(fmt::format("{:.1f} %", 100.0 * line["share"].get<double>()), "share");
        reports.want(line["source"].get<std::string>().substr(0, 10), "source");
    }
    for (const Json& recording : json["recordings"]) {
        reports.want(recording["sha256"], "hash");
        reports.want(recording["file"], "file");
        for (const Json& event : recording["events"])
            for (const auto& [name, method] : event["methods"].items())
                for (const char* key : {"natural_frequency", "damping_ratio"})
                    if (method["status"] == "ok")
                        reports.want_estimate(method["quantities"][key], name + " " + key, false);
    }
    for (const Json& option : json["options"]) reports.want(option, "option");
}

Reports reports_of(const Json& json, const std::vector<NamedFigure>& figures) {
    const ReportInput input{json.dump(), "result.json", figures, {}};
    return {report_html(input), pdf::text_of(report_pdf(input))};
}

}  // namespace

TEST_CASE("the report holds every number of a pooled result with its budget") {
    std::vector<NamedFigure> figures;
    const Json json = identified(0.0, figures);
    REQUIRE(json["result"]["event_count"] == 3);
    Reports reports = reports_of(json, figures);
    check_numbers(json, reports);
    CHECK(reports.checked > 60);
    CHECK(reports.html.find("variable projection") != std::string::npos);
    CHECK(reports.html.find("the equation of motion") == std::string::npos);
}

TEST_CASE("the report holds the numbers of a damping law and of its stretches") {
    std::vector<NamedFigure> figures;
    const Json json = identified(6.0, figures);
    const Json& event = json["recordings"][0]["events"][0];
    REQUIRE(event["methods"]["curve_fit"]["model"] == "viscous+friction");
    REQUIRE(json["result"]["quantities"].contains("friction_force"));
    CHECK(std::ranges::find(figures, "course-1", &NamedFigure::name) != figures.end());
    Reports reports = reports_of(json, figures);
    check_numbers(json, reports);
    // The methods are those of the law, not of the viscous fit.
    CHECK(reports.html.find("Curve fit (viscous+friction): the equation of motion") != std::string::npos);
    CHECK(reports.html.find("variable projection") == std::string::npos);
    REQUIRE(event.contains("amplitude_course"));
    for (const Json& point : event["amplitude_course"]["points"])
        for (const char* key : {"natural_frequency", "damping_ratio"})
            reports.want_estimate(point[key], std::string("stretch ") + key, false);
}
