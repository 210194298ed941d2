// Reports and figures as a user asks for them: from compare, the ledger and a result kept as JSON; with the
// recording gone, with hostile names, and with a result whose numbers do not come out again.

#include <catch2/catch.hpp>

#include "app/bench_recordings.hpp"
#include "app/run_program.hpp"

using namespace ringwright::test;
using Catch::Contains;

namespace {

std::string sheet(const std::string& type, const std::string& serial, const std::string& who = "day") {
    return fmt::format(
        "[article]\ntype = '{}'\nserial = '{}'\nmass = \"3.20(1) kg\"\n[test]\noperator = \"{}\"\n"
        "date = 2031-04-02\n[limits]\ndamping_ratio = {{ min = 0.02 }}\n",
        type, serial, who);
}

/// A result of one number, as short as the ledger takes it.
std::string small_result(double damping_ratio) {
    return fmt::format(
        R"({{"schema":"ringwright.identification.v1","result":{{"method":"curve_fit","event_count":1,)"
        R"("quantities":{{"damping_ratio":{{"value":{},"unit":"1","standard_uncertainty":0.001}}}}}}}})",
        damping_ratio);
}

/// What the forms begin with: HTML Living Standard; ISO 32000-1, 7.5.2; SVG 1.1; PNG (ISO 15948), 5.2.
bool begins_as(const std::string& bytes, const std::string& ending) {
    if (ending == "html") return bytes.starts_with("<!DOCTYPE html>");
    if (ending == "pdf") return bytes.starts_with("%PDF-");
    if (ending == "png") return bytes.starts_with("\x89PNG\r\n");
    return bytes.find("<svg") < 200;
}

/// Runs the command with -o in each form and checks that a file of that form comes of it.
void check_every_form(const Bench& bench, std::vector<std::string> command) {
    for (const char* ending : {"html", "pdf", "svg", "png"}) {
        const std::string name = fmt::format("drawn.{}", ending);
        auto arguments = command;
        arguments.insert(arguments.end(), {"-o", bench.path(name)});
        const Outcome outcome = bench.run(arguments);
        INFO(command.front() << " " << ending << ": " << outcome.err);
        CHECK(outcome.status == 0);
        CHECK(begins_as(bench.read(name), ending));
    }
}

}  // namespace

TEST_CASE("compare is drawn in every form, and the same from its JSON") {
    const Bench bench;
    const std::string before = bench.write("before.csv", pluck_csv(0.05, 1));
    const std::string after = bench.write("after.csv", pluck_csv(0.09, 2));
    const std::vector<std::string> compare{"compare", "--before", before, "--after", after};
    check_every_form(bench, compare);
    const std::string html = bench.read("drawn.html");
    CHECK_THAT(html, Contains("Changed: ") && Contains("damping ratio") && Contains("<svg"));
    auto as_json = compare;
    as_json.insert(as_json.end(), {"--format", "json", "-o", bench.path("comparison.json")});
    REQUIRE(bench.run(as_json).status == 0);
    CHECK(bench.run({"report", bench.path("comparison.json"), "-o", bench.path("again.html")}).status == 0);
    CHECK(bench.read("again.html") == html);
    auto wrong = compare;
    wrong.insert(wrong.end(), {"--figure", "decay-1", "-o", bench.path("wrong.svg")});
    const Outcome refused = bench.run(wrong);
    CHECK(refused.status == 2);
    CHECK_THAT(refused.err, Contains("comparison"));
}

TEST_CASE("compare takes added masses for its files") {
    const Bench bench;
    const std::string bare = bench.write("bare.csv", pluck_csv(0.05, 1, 5.0));
    const std::string loaded = bench.write("loaded.csv", pluck_csv(0.05, 2, 4.0));
    const Outcome outcome =
        bench.run({"compare", "--before", bare, "--added-mass", "0 kg", "--before", loaded, "--added-mass",
                   "1.000(1) kg", "--after", bare, "--added-mass", "0 kg", "--after", loaded, "--added-mass",
                   "1.000(1) kg", "--format", "json"});
    INFO(outcome.err);
    CHECK(outcome.status == 0);
    CHECK_THAT(outcome.out, Contains("\"added_mass\": \"1.000(1) kg\"") && Contains("\"stiffness\""));
    CHECK(bench.run({"compare", "--added-mass", "0 kg", "--before", bare, "--after", loaded}).status == 2);
}

TEST_CASE("the ledger's entry, chart and gauge study are drawn in every form") {
    const Bench bench;
    const std::string ledger = bench.path("shop.ledger");
    double value = 0.05;
    for (const char* serial : {"0417", "0418"})
        for (const char* who : {"day", "night"})
            for (int repeat = 0; repeat < 2; ++repeat) {
                const std::string result = bench.write("small.json", small_result(value += 0.0007));
                const std::string path = bench.write("s.toml", sheet("sash damper S2", serial, who));
                REQUIRE(bench.run({"ledger", "--ledger", ledger, "add", result, "--sheet", path}).status ==
                        0);
            }
    check_every_form(bench, {"ledger", "--ledger", ledger, "show", "3"});
    CHECK_THAT(bench.read("drawn.html"), Contains("sash damper S2") && Contains("0417"));
    check_every_form(bench, {"ledger", "--ledger", ledger, "chart"});
    // The sheets ask for 0.02 at least; --max adds a limit that one of the eight values exceeds.
    CHECK_THAT(bench.read("drawn.html"), Contains("upper control limit") &&
                                             Contains("≥ 0.02, 0 of 8 outside") && Contains(">lower limit<"));
    check_every_form(bench, {"ledger", "--ledger", ledger, "chart", "--max", "0.0555"});
    CHECK_THAT(bench.read("drawn.html"), Contains("≤ 0.0555, 1 of 8 outside") && Contains(">upper limit<"));
    CHECK_THAT(bench.run({"ledger", "--ledger", ledger, "chart"}).out,
               Contains("Specified: ≥ 0.02; 0 of 8 values outside."));
    check_every_form(bench, {"ledger", "--ledger", ledger, "gauge"});
    CHECK_THAT(bench.read("drawn.html"), Contains("repeatability") && Contains("night"));
    CHECK(bench.run({"ledger", "--ledger", ledger, "list", "-o", bench.path("list.pdf")}).status == 2);
}

TEST_CASE("report: from a kept result, one figure, and with the recording gone") {
    const Bench bench;
    const std::string recording = bench.write("pluck.csv", pluck_csv(0.05, 1));
    const std::string path = bench.write("s.toml", sheet("sash damper S2", "0417"));
    const std::string result = bench.path("result.json");
    REQUIRE(bench.run({"identify", recording, "--sheet", path, "--format", "json", "-o", result}).status ==
            0);
    CHECK_THAT(bench.read("result.json"), Contains("\"test_sheet\"") && Contains("\"bytes\""));
    check_every_form(bench, {"report", result});
    CHECK_THAT(bench.read("drawn.html"), !Contains("missing") && !Contains("did not come out"));
    CHECK(bench.run({"report", result, "--figure", "decrement-1", "-o", bench.path("f.svg")}).status == 0);

    std::filesystem::create_directory(bench.path("kept"));
    std::filesystem::rename(recording, bench.path("kept/pluck.csv"));
    const Outcome gone = bench.run({"report", result, "-o", bench.path("gone.html")});
    CHECK(gone.status == 0);
    CHECK_THAT(gone.err, Contains("pluck.csv are missing"));
    CHECK_THAT(bench.read("gone.html"), Contains("pluck.csv are missing"));
    const Outcome figure = bench.run({"report", result, "--figure", "decay-1", "-o", bench.path("g.svg")});
    CHECK(figure.status == 2);
    CHECK_THAT(figure.err, Contains("pluck.csv are missing") && Contains("--recordings"));
    const Outcome found =
        bench.run({"report", result, "--recordings", bench.path("kept"), "-o", bench.path("found.html")});
    CHECK(found.err.empty());
    CHECK(bench.read("found.html") == bench.read("drawn.html"));
}

TEST_CASE("report: says which numbers do not come out again") {
    const Bench bench;
    const std::string recording = bench.write("pluck.csv", pluck_csv(0.05, 1));
    const std::string result = bench.path("result.json");
    REQUIRE(bench.run({"identify", recording, "--format", "json", "-o", result}).status == 0);
    std::string text = bench.read("result.json");
    const std::size_t key = text.rfind("\"natural_frequency\": {");
    REQUIRE(key != std::string::npos);
    const std::size_t digit = text.find("\"value\": ", key) + 9;
    text[digit] = text[digit] == '6' ? '7' : '6';
    bench.write("result.json", text);
    const Outcome outcome = bench.run({"report", result, "-o", bench.path("r.html")});
    CHECK(outcome.status == 0);
    CHECK_THAT(outcome.err, Contains("not all came out as in the result: natural frequency, in the result"));
    CHECK_THAT(bench.read("r.html"),
               Contains("not all came out as in the result: natural frequency, in the result"));
}

TEST_CASE("report: hostile names stay text") {
    const Bench bench;
    const std::string recording = bench.write("<b onload='x'>&amp; ωø.csv", pluck_csv(0.05, 1));
    const std::string type = "<script>alert(1)</script> & Türdämpfer ψ מנחת";
    const std::string path = bench.write("s.toml", sheet(type, std::string(200, 'S')));
    const Outcome outcome = bench.run({"verify", recording, "--sheet", path, "-o", bench.path("r.html")});
    INFO(outcome.err);
    CHECK(outcome.status == 0);
    const std::string html = bench.read("r.html");
    CHECK_THAT(html, !Contains("<script") && !Contains("<b onload"));
    CHECK_THAT(html, Contains("&lt;script&gt;alert(1)&lt;/script&gt; &amp; Türdämpfer ψ מנחת"));
    CHECK_THAT(html, Contains(std::string(200, 'S')));
    CHECK(bench.run({"verify", recording, "--sheet", path, "-o", bench.path("r.pdf")}).status == 0);
}
