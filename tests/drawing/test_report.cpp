// The report: what it says, that it says it safely, and that it says the same twice.
#include <algorithm>
#include <catch2/catch.hpp>
#include <nlohmann/json.hpp>
#include <set>

#include "drawing/markup.hpp"
#include "drawing/pdf_tools.hpp"
#include "drawing/sample_figures.hpp"
#include "ringwright/error.hpp"
#include "ringwright/report_document.hpp"

using namespace ringwright;
using Json = nlohmann::ordered_json;

namespace {

Json entry(double value, double u, const char* unit) {
    return {{"value", value},
            {"unit", unit},
            {"standard_uncertainty", u},
            {"interval", {value - 2.0 * u, value + 2.0 * u}},
            {"degrees_of_freedom", 12.3}};
}

Json event(double start_s) {
    const Json quantities{{"natural_frequency", entry(4.2003, 0.0019, "Hz")},
                          {"damping_ratio", entry(0.04512, 0.00037, "1")}};
    return {{"start_s", start_s},
            {"end_s", start_s + 4.0},
            {"test", "pluck"},
            {"methods",
             {{"logarithmic_decrement", {{"status", "ok"}, {"quantities", quantities}}},
              {"half_power_bandwidth", {{"status", "not_applicable"}, {"reason", "the record ends early"}}},
              {"curve_fit", {{"status", "ok"}, {"model", "viscous"}, {"quantities", quantities}}}}},
            {"agreement", {{"consistent", true}, {"p_value", 0.41}, {"reading", "The methods agree."}}},
            {"findings", Json::array()}};
}

/// An invented result of the Quillmoor workshop.
Json result() {
    return {{"schema", "ringwright.identification.v1"},
            {"software", {{"name", "ringwright"}, {"version", "0.1.0"}}},
            {"confidence_level", 0.95},
            {"options", {"--mass=3.20(1) kg"}},
            {"recordings",
             {{{"file", "sash-damper.csv"},
               {"sha256", std::string(64, 'b')},
               {"channel", "laser"},
               {"quantity", "displacement"},
               {"unit", "mm"},
               {"sample_rate_hz", 1000.0},
               {"sample_count", 24000},
               {"duration_s", 24.0},
               {"findings", {{{"code", "hum"}, {"severity", "caution"}, {"message", "Hum at 50 Hz."}}}},
               {"events", {event(2.0), event(9.5)}}}}},
            {"result",
             {{"method", "curve_fit"},
              {"event_count", 2},
              {"quantities",
               {{"natural_frequency", entry(4.20031, 0.00194, "Hz")},
                {"damping_ratio", entry(0.0451234, 0.00037, "1")},
                {"stiffness", entry(2228.9, 7.3, "N/m")}}},
              {"budget",
               {{{"quantity", "stiffness"},
                 {"source", "mass"},
                 {"value", 3.2},
                 {"unit", "kg"},
                 {"standard_uncertainty", 0.01},
                 {"contribution", 6.965},
                 {"share", 0.911}}}},
              {"findings", Json::array()}}}};
}

Json with_sheet(Json json) {
    json["test_sheet"] = {{"file", "sash.toml"},
                          {"article_type", "sash damper S2"},
                          {"serial", "0417"},
                          {"operator", "bench 3"},
                          {"date", "2031-04-02"},
                          {"sensor", "laser L-07"},
                          {"sensor_calibrated", "2031-01-15"}};
    json["verdict"] = {{"decision", "does_not_conform"},
                       {"rule", "guarded acceptance"},
                       {"limits",
                        {{{"quantity", "damping_ratio"},
                          {"lower", 0.05},
                          {"value", 0.0451234},
                          {"standard_uncertainty", 0.00037},
                          {"acceptance_lower", 0.0508},
                          {"probability_of_conformity", 0.0},
                          {"decision", "does_not_conform"}}}}};
    return json;
}

ReportInput input_of(const Json& json) {
    ReportInput input{json.dump(), "result.json", {}, {}};
    for (const NamedFigure& named : samples::one_of_each())
        if (named.name.ends_with("-1")) input.figures.push_back(named);
    return input;
}

}  // namespace

TEST_CASE("the report says every number at the digits that its uncertainty supports") {
    // Two significant digits of the standard uncertainty (JCGM 100:2008, 7.2.6), by hand.
    const ReportInput input = input_of(result());
    const std::string html = report_html(input), text = pdf::text_of(report_pdf(input));
    for (const char* number :
         {"4.2003", "0.0019", "4.1964 … 4.2042", "0.04512", "0.00037", "2228.9", "7.3", "91.1 %"}) {
        INFO(number);
        CHECK(html.find(number) != std::string::npos);
        CHECK(text.find(number) != std::string::npos);
    }
}

TEST_CASE("the report says what a test report has to say") {
    const ReportInput input = input_of(with_sheet(result()));
    const std::string html = report_html(input), text = pdf::text_of(report_pdf(input));
    for (const char* said : {"sash damper S2", "0417", "bench 3", "2031-04-02", "laser L-07", "2031-01-15",
                             "Does not conform", "guarded acceptance", "Hum at 50 Hz.", "sash-damper.csv",
                             "bbbbbbbb", "ringwright 0.1.0", "curve fit (viscous)", "the record ends early",
                             "ringwright verify sash-damper.csv --sheet sash.toml", "Name and signature",
                             "no release of the part"}) {
        INFO(said);
        CHECK(html.find(said) != std::string::npos);
        CHECK(text.find(said) != std::string::npos);
    }
}

TEST_CASE("the HTML stands alone") {
    const std::string html = report_html(input_of(with_sheet(result())));
    CHECK(markup::nesting_fault(html, true).empty());
    CHECK(html.find("<script") == std::string::npos);
    CHECK(html.find("src=") == std::string::npos);
    CHECK(html.find("@import") == std::string::npos);
    CHECK(markup::count_of(html, "http") == markup::count_of(html, "http://www.w3.org/"));
    CHECK(html.find("prefers-color-scheme:dark") != std::string::npos);
    CHECK(html.find("@media print") != std::string::npos);
    const auto ids = markup::attribute_values(html, "id");
    CHECK(std::set<std::string>(ids.begin(), ids.end()).size() == ids.size());
    CHECK(markup::count_of(html, "<svg ") == markup::count_of(html, "aria-label="));
}

TEST_CASE("names from outside change nothing but themselves") {
    Json json = with_sheet(result());
    json["test_sheet"]["article_type"] = "<script>alert('x')</script> & Ærø Ω";
    json["test_sheet"]["serial"] = std::string(200, '7');
    json["test_sheet"]["operator"] = "בדיקה 12";
    json["recordings"][0]["file"] = "\"onload=\"alert(1)\" <b>.csv";
    const ReportInput input = input_of(json);
    const std::string html = report_html(input);
    CHECK(markup::nesting_fault(html, true).empty());
    CHECK(html.find("<script") == std::string::npos);
    CHECK(html.find("<b>.csv") == std::string::npos);
    CHECK(html.find("&lt;script&gt;alert(&#39;x&#39;)&lt;/script&gt; &amp; Ærø Ω") != std::string::npos);
    CHECK(html.find("בדיקה 12") != std::string::npos);
    const std::string pdf = report_pdf(input);
    std::string text = pdf::text_of(pdf);
    CHECK(text.find("Ærø Ω") != std::string::npos);
    // The long serial wraps: all its digits are there, on several lines.
    CHECK(std::ranges::count(text, '7') >= 200);
    CHECK(text.find(std::string(200, '7')) == std::string::npos);
}

TEST_CASE("a field that the result does not hold is left out") {
    const std::string html = report_html(input_of(result()));
    for (const char* name :
         {"Serial number", "Tested by", "Date of test", "Sensor", "Statement of conformity", ">null<"}) {
        INFO(name);
        CHECK(html.find(name) == std::string::npos);
    }
}

TEST_CASE("the same input gives the same bytes") {
    const ReportInput input = input_of(with_sheet(result()));
    CHECK(report_html(input) == report_html(input));
    CHECK(report_pdf(input) == report_pdf(input));
}

TEST_CASE("the PDF has its pages, its size, its title and its date from the sheet") {
    const std::string pdf = report_pdf(input_of(with_sheet(result())));
    const std::string facts = pdf::told_by("env TZ=UTC pdfinfo", pdf), text = pdf::text_of(pdf);
    const std::size_t at = facts.find("Pages:");
    REQUIRE(at != std::string::npos);
    const int pages = std::stoi(facts.substr(at + 6));
    CHECK(pages >= 2);
    for (int page = 1; page <= pages; ++page)
        CHECK_THAT(text, Catch::Contains("page " + std::to_string(page) + " of " + std::to_string(pages)));
    CHECK_THAT(facts, Catch::Contains("A4") && Catch::Contains("sash damper S2") && Catch::Contains("2031"));
    CHECK_THAT(pdf::told_by("pdfinfo", report_pdf(input_of(result()), PaperSize::letter)),
               Catch::Contains("letter"));
    CHECK_THAT(pdf::told_by("pdfinfo", report_pdf(input_of(result()))), !Catch::Contains("CreationDate"));
}

TEST_CASE("fonts are in the PDF") {
    const std::string fonts = pdf::told_by("pdffonts", report_pdf(input_of(result())));
    CHECK(markup::count_of(fonts, "\n") > 2);
    CHECK(fonts.find(" no  ") == std::string::npos);  // the column "emb"
}

TEST_CASE("figures that are missing are named") {
    ReportInput input{
        result().dump(), "result.json", {}, {"The figures of sash-damper.csv are missing: gone."}};
    CHECK_THAT(report_html(input), Catch::Contains("The figures of sash-damper.csv are missing: gone."));
    CHECK_THAT(pdf::text_of(report_pdf(input)), Catch::Contains("are missing: gone."));
}

TEST_CASE("figures of the result itself need no recording") {
    const auto names = [](const Json& json) {
        std::vector<std::string> list;
        for (const NamedFigure& figure : figures_of_result(json.dump(), "result.json"))
            list.push_back(figure.name);
        return list;
    };
    CHECK(names(result()) == std::vector<std::string>{"methods"});
    CHECK(names(with_sheet(result())) == std::vector<std::string>{"methods", "verdict"});
}

TEST_CASE("many releases make a report of bounded size") {
    Json json = result();
    for (int i = 0; i < 300; ++i) json["recordings"][0]["events"].push_back(event(20.0 + 5.0 * i));
    json["result"]["event_count"] = 302;
    const std::string html = report_html(input_of(json));
    CHECK_THAT(html, Catch::Contains("The first 10 of 302 releases"));
    CHECK(html.size() < 2'000'000);
}

TEST_CASE("what is no result is refused with file and remedy") {
    for (const char* bad : {"", "{", "[]", "17", "{\"schema\": \"other\"}", "{\"schema\": 3}"}) {
        INFO(bad);
        try {
            (void)report_html({bad, "x.json", {}, {}});
            FAIL("was taken");
        } catch (const InputError& error) {
            CHECK(error.problem().file == "x.json");
            CHECK_FALSE(error.problem().remedy.empty());
        }
    }
}

TEST_CASE("a result that lacks what it should have is still reported") {
    const Json bare{{"schema", "ringwright.identification.v1"}};
    CHECK_THAT(report_html({bare.dump(), "x.json", {}, {}}), Catch::Contains("No method can answer"));
    Json odd = result();
    odd["recordings"] = "none";
    odd["result"]["quantities"]["stiffness"] = 7;
    odd["result"]["budget"] = nullptr;
    CHECK_FALSE(report_pdf({odd.dump(), "x.json", {}, {}}).empty());
}
