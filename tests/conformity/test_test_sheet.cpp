#include <catch2/catch.hpp>
#include <string>

#include "ringwright/error.hpp"
#include "ringwright/test_sheet.hpp"

using namespace ringwright;
using namespace std::chrono_literals;
using Catch::Detail::Approx;

namespace {

TestSheet read(const std::string& text) {
    return read_test_sheet_from_memory(text, "shop/sheet.toml");
}

/// The problem that reading this text ends in; fails when it reads.
Problem problem_of(const std::string& text) {
    try {
        (void)read(text);
    } catch (const InputError& error) {
        return error.problem();
    }
    FAIL("read without error: " << text);
    return {};
}

const std::string full = R"([article]
type = "sash damper S2"
serial = "0417"
mass = "3.20(1) kg"
[test]
kind = "pluck"
operator = "bench 3, day shift"
date = 2031-04-02
[recording]
quantity = "displacement"
unit = "mm"
channel = "laser"
sensor = "laser L-07"
sensor_calibrated = 2031-01-15
sensor_due = 2032-01-15
[limits]
decision_rule = "guarded acceptance"
damping_ratio = { min = 0.22, max = 0.34 }
stiffness = { nominal = "3.1 N/mm", tolerance = "8 %" }
natural_frequency = { min = "4.0 Hz" }
[[recordings]]
file = "a.csv"
[[recordings]]
file = "b.csv"
added_mass = "0.500(1) kg"
)";

}  // namespace

TEST_CASE("a full sheet is read in SI units") {
    const TestSheet sheet = read(full);
    CHECK(sheet.text == full);
    CHECK(sheet.article_type == "sash damper S2");
    CHECK(sheet.serial == "0417");
    CHECK(sheet.mass->value == Approx(3.2));
    CHECK(sheet.mass->standard_uncertainty == Approx(0.01));
    CHECK(sheet.test_operator == "bench 3, day shift");
    CHECK(to_text(*sheet.date) == "2031-04-02");
    CHECK(sheet.decision.rule == DecisionRule::guarded_acceptance);
    REQUIRE(sheet.limits.size() == 3);
    CHECK(sheet.limits[0].limit.lower == 0.22);
    CHECK(sheet.limits[1].limit.quantity == Quantity::stiffness);
    // 3.1 N/mm ± 8 %: 2852 … 3348 N/m, worked by hand.
    CHECK(*sheet.limits[1].limit.lower == Approx(2852.0));
    CHECK(*sheet.limits[1].limit.upper == Approx(3348.0));
    CHECK(sheet.limits[1].torsional == false);
    CHECK(sheet.limits[2].limit.lower == 4.0);
    CHECK_FALSE(sheet.limits[2].limit.upper);
    REQUIRE(sheet.recordings.size() == 2);
    CHECK(sheet.recordings[0].path == "shop/a.csv");
    CHECK(sheet.recordings[1].added_mass->value == Approx(0.5));
    CHECK(sheet_findings(sheet, 2031y / 4 / 3).empty());
}

TEST_CASE("everything is optional") {
    CHECK(read("").limits.empty());
    CHECK(read("[limits]\n").limits.empty());
}

TEST_CASE("the template reads, as it is and with every comment that holds an entry taken in") {
    const std::string text(test_sheet_template());
    const TestSheet sheet = read(text);
    CHECK(sheet.limits.size() == 1);
    CHECK(sheet.recordings.empty());
    std::string all;
    for (std::size_t begin = 0; begin < text.size();) {
        const std::size_t end = text.find('\n', begin);
        std::string line = text.substr(begin, end - begin);
        const bool entry =
            line.rfind("# ", 0) == 0 && (line.find(" = ") != std::string::npos || line.rfind("# [[", 0) == 0);
        all += (entry ? line.substr(2) : line) + "\n";
        begin = end + 1;
    }
    const TestSheet everything = read(all);
    CHECK(everything.limits.size() == 4);
    CHECK(everything.recordings.size() == 2);
    CHECK(everything.decision.coverage_factor == 2.0);
    CHECK(*everything.rate_hz == 2000.0);
}

TEST_CASE("an unknown key is refused by line, name and nearest known key") {
    const Problem problem =
        problem_of("[limits]\ndecision_rule = \"simple acceptance\"\ndamping_ration = { min = 0.2 }\n");
    CHECK(problem.file == "shop/sheet.toml");
    CHECK(problem.place == "line 3, key limits.damping_ration");
    CHECK(problem.remedy.find("damping_ratio") != std::string::npos);
    CHECK(problem_of("[artcle]\ntype = \"x\"\n").place == "line 1, key artcle");
    CHECK(problem_of("[limits]\ndamping_ratio = { mim = 0.2 }\n").place ==
          "line 2, key limits.damping_ratio.mim");
    CHECK(problem_of("[[recordings]]\nfile = \"a\"\nmass = \"1 kg\"\n").place ==
          "line 3, key recordings.mass");
}

TEST_CASE("what cannot be used is refused with its place") {
    const std::pair<const char*, const char*> rows[] = {
        {"[limits]\ndamping_ratio = { min = 0.3, max = 0.2 }\n", "line 2, key limits.damping_ratio.min"},
        {"[limits]\ndamping_ratio = { nominal = 0.3, min = 0.2 }\n", "line 2, key limits.damping_ratio.min"},
        {"[limits]\ndamping_ratio = { nominal = 0.3 }\n", "line 2, key limits.damping_ratio.nominal"},
        {"[limits]\ndamping_ratio = { tolerance = \"5 %\" }\n", "line 2, key limits.damping_ratio.tolerance"},
        {"[limits]\ndamping_ratio = { nominal = 0.3, tolerance = \"-5 %\" }\n",
         "line 2, key limits.damping_ratio.tolerance"},
        {"[limits]\ndamping_ratio = {}\n", "line 2, key limits.damping_ratio"},
        {"[limits]\ndamping_ratio = 0.2\n", "line 2, key limits.damping_ratio"},
        {"[limits]\ndamping_ratio = { min = inf }\n", "line 2, key limits.damping_ratio.min"},
        {"[limits]\nnatural_frequency = { min = 4.0 }\n", "line 2, key limits.natural_frequency.min"},
        {"[limits]\nnatural_frequency = { min = \"4 kg\" }\n", "line 2, key limits.natural_frequency.min"},
        {"[limits]\nstiffness = { nominal = \"3.1(1) N/mm\", tolerance = \"8 %\" }\n",
         "line 2, key limits.stiffness.nominal"},
        {"[limits]\nstiffness = { min = \"3 N/m\", max = \"4 N m/rad\" }\n",
         "line 2, key limits.stiffness.max"},
        {"[limits]\ncubic_stiffness = { min = \"3 N/m\" }\n", "line 2, key limits.cubic_stiffness.min"},
        {"[limits]\ndecision_rule = \"strict\"\n", "line 2, key limits.decision_rule"},
        {"[limits]\nguard_band = -1.0\n", "line 2, key limits.guard_band"},
        {"[article]\nmass = 3.2\n", "line 2, key article.mass"},
        {"[article]\nmass = \"3.2 mm\"\n", "line 2, key article.mass"},
        {"[article]\nmass = \"-3.2 kg\"\n", "line 2, key article.mass"},
        {"[article]\nmass = \"3 kg\"\ninertia = \"1 kg m2\"\n", "line 3, key article.inertia"},
        {"[test]\nkind = \"shake\"\n", "line 2, key test.kind"},
        {"[test]\ndate = \"2031-02-30\"\n", "line 2, key test.date"},
        {"[recording]\nquantity = \"velocity\"\nunit = \"mm\"\n", "line 3, key recording.unit"},
        {"[recording]\nunit = \"furlongs\"\n", "line 2, key recording.unit"},
        {"[recording]\nrate = 0\n", "line 2, key recording.rate"},
        {"[recording]\nsensor_calibrated = 2031-01-15\nsensor_due = 2030-01-15\n",
         "line 3, key recording.sensor_due"},
        {"recordings = 3\n", "line 1, key recordings"},
        {"[[recordings]]\nadded_mass = \"1 kg\"\n", "line 1, key recordings.file"},
        {"article = 3\n", "line 1, key article"},
    };
    for (const auto& [text, place] : rows) {
        INFO(text);
        CHECK(problem_of(text).place == place);
    }
}

TEST_CASE("what is no TOML is refused with line and column") {
    CHECK(problem_of("[article\n").place.rfind("line 1, column", 0) == 0);
    // The parser of the library asserts on the first and runs into what it calls unreachable on the second.
    CHECK(problem_of("\uFEF7# [article]\n").place.rfind("line 1, column", 0) == 0);
    CHECK(problem_of("[*[recordings]]\n").place.rfind("line 1, column", 0) == 0);
    CHECK(problem_of("[article]\ntype = \"a\"\ntype = \"b\"\n").place.rfind("line 3, column", 0) == 0);
    CHECK(problem_of(std::string("[article]\ntype = \"\xff\"\n")).place.rfind("line 2", 0) == 0);
    CHECK_THROWS_AS(read_test_sheet("/nonexistent/sheet.toml"), InputError);
    CHECK_THROWS_AS(read_test_sheet("/"), InputError);
}

TEST_CASE("limits in torsion, per cent and cubic units") {
    const TestSheet sheet = read(
        "[limits]\nstiffness = { min = \"2 N m/rad\" }\ncubic_stiffness = { max = \"2e6 N/m^3\" }\n"
        "damping_ratio = { nominal = \"20 %\", tolerance = 0.02 }\n");
    CHECK(sheet.limits[0].torsional == true);
    CHECK(*sheet.limits[1].limit.upper == 2e6);
    CHECK(*sheet.limits[2].limit.lower == Approx(0.18));
    CHECK_NOTHROW(require_same_motion(sheet, true));
    CHECK_THROWS_AS(require_same_motion(sheet, false), InputError);
}

TEST_CASE("a sensor past its due date is told against the day of the test") {
    const auto codes = [](const std::string& text, Date today) {
        std::string all;
        for (const Finding& finding : sheet_findings(read(text), today)) all += finding.code + " ";
        return all;
    };
    const std::string sensor = "[recording]\nsensor_due = 2031-04-02\n";
    CHECK(codes(sensor, 2031y / 4 / 2) == "no_limits ");
    CHECK(codes(sensor, 2031y / 4 / 3) == "sensor_overdue no_limits ");
    // The sheet's own date wins over today's.
    CHECK(codes("[test]\ndate = 2031-04-01\n" + sensor, 2033y / 1 / 1) == "no_limits ");
    CHECK(codes("[recording]\nsensor_calibrated = 2031-05-01\n", 2031y / 4 / 2) ==
          "sensor_calibrated_later no_limits ");
    CHECK(codes("[limits]\ndamping_ratio = { min = 0.2 }\n", 2031y / 4 / 2) == "rule_not_stated ");
}

TEST_CASE("dates of the calendar only") {
    CHECK(date_from_text("2032-02-29"));
    for (const char* text :
         {"2031-02-29", "2031-13-01", "2031-4-02", "2031/04/02", "", "2031-04-0x", "+031-04-02"})
        CHECK_FALSE(date_from_text(text));
}
