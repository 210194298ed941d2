// Verdict, comparison and charts as people and programs read them.

#include <catch2/catch.hpp>
#include <limits>
#include <nlohmann/json.hpp>

#include "report/terminal_chart.hpp"
#include "ringwright/ledger_report.hpp"
#include "ringwright/verdict_report.hpp"

using namespace ringwright;

namespace {

Estimate estimate(double value, double u) {
    return {value, u, {value - 2.0 * u, value + 2.0 * u}, std::numeric_limits<double>::infinity()};
}

}  // namespace

TEST_CASE("a verdict in JSON has the keys of the contract and no more than exists") {
    const Quantities quantities{{Quantity::damping_ratio, estimate(0.27, 0.01)}};
    const Verdict verdict =
        judge(quantities, {{Quantity::damping_ratio, 0.22, {}}, {Quantity::stiffness, 1.0, 2.0}}, {});
    const auto json = to_json(verdict, false);
    CHECK(json["decision"] == "undecided");
    CHECK(json["rule"] == "guarded acceptance");
    const auto& measured = json["limits"][0];
    CHECK(measured["quantity"] == "damping_ratio");
    CHECK(measured["lower"] == 0.22);
    CHECK_FALSE(measured.contains("upper"));
    CHECK(measured["decision"] == "conforms");
    CHECK(measured.contains("consumer_risk"));
    const auto& absent = json["limits"][1];
    CHECK(absent["decision"] == "undecided");
    CHECK_FALSE(absent.contains("value"));
    CHECK_FALSE(absent.contains("probability_of_conformity"));
    CHECK(json.dump().find("null") == std::string::npos);
    CHECK(to_text(verdict, false).find("not measured") != std::string::npos);
}

TEST_CASE("a torsion test is judged in units of torsion") {
    const Quantities quantities{{Quantity::stiffness, estimate(2.0, 0.01)}};
    const Verdict verdict = judge(quantities, {{Quantity::stiffness, 1.0, 3.0}}, {});
    CHECK(to_json(verdict, true)["limits"][0]["unit"] == "N·m/rad");
    CHECK(to_text(verdict, true).find("N·m/rad") != std::string::npos);
}

TEST_CASE("a comparison in JSON has the keys of the contract") {
    const Quantities before{{Quantity::damping_ratio, estimate(0.27, 0.01)}};
    const Quantities after{{Quantity::damping_ratio, estimate(0.19, 0.01)}};
    const auto json = to_json(compare(before, after), false);
    const auto& damping = json["damping_ratio"];
    for (const char* key : {"before", "after", "difference", "ratio", "changed", "p_value"})
        CHECK(damping.contains(key));
    CHECK(damping["changed"] == true);
    CHECK(damping["difference"]["value"].get<double>() == Approx(-0.08));
}

TEST_CASE("a run of values is drawn one column each, at the heights of their values") {
    const report::ChartPoints points{{1.0, 3.0, 2.0}, {false, true, false}};
    const std::string drawn = report::draw_run(points, {{2.0, "center"}}, 72, 5);
    // Five rows: 3 at the top, 2 in the middle on the line of the center, 1 at the bottom.
    CHECK(drawn ==
          "           │ ◆ \n"
          "           │   \n"
          "  center 2 │╌╌•\n"
          "           │   \n"
          "           │•  \n");
    // Only the last ones where there are too many; a single height does not divide by nothing.
    CHECK(report::draw_run({std::vector<double>(100, 4.0), std::vector<bool>(100, false)}, {}, 10, 3) ==
          "   │          \n   │••••••••••\n   │          \n");
}

TEST_CASE("a chart in JSON names the entries of a signal") {
    LedgerChart chart;
    chart.quantity = Quantity::damping_ratio;
    for (int i = 0; i < 10; ++i) {
        LedgerValue value;
        value.number = 100 + i;
        value.day = "2031-04-02";
        value.unit = "1";
        value.value = i == 9 ? 2.0 : 1.0 + 0.01 * (i % 2);
        chart.values.push_back(value);
    }
    std::vector<double> numbers;
    for (const auto& value : chart.values) numbers.push_back(value.value);
    chart.chart = individuals_chart(numbers);
    chart.signals = run_signals(chart.chart, {RunRule::one_beyond_three_sigma});
    const auto json = to_json(chart);
    REQUIRE(json["signals"].size() == 1);
    CHECK(json["signals"][0]["last_entry"] == 109);
    CHECK(to_text(chart).find("entry 109: one point beyond three sigma") != std::string::npos);
}

TEST_CASE("text from a sheet cannot steer the terminal") {
    EntrySummary entry;
    entry.number = 1;
    entry.article_type = "damper\x1b[2J";
    CHECK(list_text({entry}).find('\x1b') == std::string::npos);
}
