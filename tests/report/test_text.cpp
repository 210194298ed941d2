#include <catch2/catch.hpp>
#include <limits>

#include "report/finding_text.hpp"
#include "report/number_text.hpp"
#include "report/text_table.hpp"
#include "ringwright/inspection.hpp"

using namespace ringwright;
using namespace ringwright::report;

namespace {

constexpr double infinite = std::numeric_limits<double>::infinity();

std::vector<std::string> lines_of(const std::string& text) {
    std::vector<std::string> lines(1);
    for (const char character : text) {
        if (character == '\n')
            lines.emplace_back();
        else
            lines.back() += character;
    }
    lines.pop_back();
    return lines;
}

Recording recording_of(std::vector<double> samples) {
    Recording recording;
    recording.samples = std::move(samples);
    recording.clock.sample_rate_hz = 100.0;
    recording.unit = {"mm", Dimension::length, 1e-3};
    return recording;
}

}  // namespace

TEST_CASE("columns on a terminal") {
    // Widths after Unicode Standard Annex 11.
    CHECK(display_width("mm") == 2);
    CHECK(display_width("µm/s²") == 5);
    CHECK(display_width("a\u0301") == 1);
    CHECK(display_width("測定") == 4);
    CHECK(display_width("\xff") == 1);
    CHECK(printable("a\x1b[2Jb\xffµ\u202e") == "a?[2Jb?µ?");
}

TEST_CASE("tables line up whatever the characters") {
    const TextTable table{{Align::left, Align::right}, {{"name", "value"}, {"µ", "1"}, {"測定", "22"}}, true};
    CHECK(to_text(table, 1) == " name  value\n ────  ─────\n µ         1\n 測定     22\n");
    const TextTable spanning{{}, {{"a", "b", "c"}, {"d", "a sentence that runs on"}}, false};
    CHECK(to_text(spanning, 0) == "a  b  c\nd  a sentence that runs on\n");
}

TEST_CASE("sentences are wrapped at blanks") {
    CHECK(wrapped("> ", "one two three", 9) == "> one two\n  three\n");
    CHECK(wrapped("> ", "unbreakable-and-long", 9) == "> unbreakable-and-long\n");
    // A number, its ± and its unit stay together.
    CHECK(wrapped("> ", "is 95 % sure", 8) == "> is\n  95 %\n  sure\n");
    CHECK(wrapped("", "about (3.2 ± 0.1) Hz, low", 14) == "about\n(3.2 ± 0.1) Hz,\nlow\n");
    CHECK(wrapped("", "so (p = 0.0044), then", 8) == "so\n(p = 0.0044),\nthen\n");
    CHECK(wrapped("", "rows 12 of them", 8) == "rows 12\nof them\n");
}

TEST_CASE("results as they are copied into a test record") {
    CHECK(with_interval({5.01234, 0.0011, {5.01014, 5.01454}, 40.0}, "Hz") == "(5.0123 ± 0.0022) Hz");
    CHECK(with_interval({0.0312, 0.0005, {0.0302, 0.0322}, 40.0}, "1") == "0.03120 ± 0.00100");
    CHECK(with_interval({3.1, 0.3, {2.7, 4.2}, 5.0}, "Hz") == "3.10 Hz, between 2.70 Hz and 4.20 Hz");
    CHECK(with_interval({3.1, 0.3, {2.7, infinite}, 5.0}, "Hz") == "about 3.10 Hz, at least 2.70 Hz");
    CHECK(in_table({3.1, 0.3, {2.7, 4.2}, 5.0}) == "3.10 [2.70, 4.20]");
    CHECK(in_table({3.1, 0.3, {2.7, infinite}, 5.0}) == "3.10 [2.70, —]");
}

TEST_CASE("a finding that recurs is said once, the grave ones first") {
    GatheredFindings gathered;
    gathered.add({{"hum", Severity::note, "Hum at 50 Hz"}}, std::size_t{1});
    gathered.add({{"hum", Severity::note, "Hum at 50 Hz"}, {"clipped", Severity::defect, "Clipped"}},
                 std::size_t{2});
    CHECK(gathered.text() ==
          "Findings\n  defect   release 2: Clipped\n  note     releases 1, 2: Hum at 50 Hz\n");
    CHECK(GatheredFindings().text().empty());
    CHECK(numbered_places("release", {3}) == "release 3");
    CHECK(numbered_places("release", {1, 2, 3, 4, 6, 8, 9}) == "releases 1 to 4, 6, 8, 9");
}

TEST_CASE("a drawing never skips a spike") {
    // One sample in 100,000 stands out; the curve is 2 mm high and drawn in 10 rows.
    std::vector<double> samples(100000, 0.0);
    samples[54321] = 0.002;
    const std::vector<std::string> lines = lines_of(draw(recording_of(samples), {}, 80, 10));
    REQUIRE(lines.size() == 11);
    CHECK(lines.front().find("2▕") == 2);
    std::size_t marked = 0;
    for (std::size_t i = 0; i < 9; ++i)
        if (lines[i].find_first_not_of(" 2m▕\xe2\xa0\x80\x95") != std::string::npos) ++marked;
    CHECK(marked == 9);
    for (const std::string& line : lines) CHECK(display_width(line) <= 80);
}

TEST_CASE("a drawing of few, constant or missing samples") {
    CHECK(draw(recording_of({}), {}, 80, 10).empty());
    CHECK(lines_of(draw(recording_of({1.0}), {}, 80, 4)).size() == 5);
    CHECK(lines_of(draw(recording_of({1.0, 1.0, 1.0}), {}, 10, 4)).size() == 5);
    Event event;
    event.begin = 1;
    event.end = 3;
    CHECK(lines_of(draw(recording_of({0.0, 1.0, -1.0}), {event}, 60, 4))[4].find("1") != std::string::npos);
}

TEST_CASE("a drawing of samples at the end of the range of doubles") {
    // 3·10³⁰⁸ apart is more than a double can say; damaged sound files of 64-bit floats hold such samples.
    Recording recording = recording_of({1.5e308, -1.5e308, 1.5e308});
    recording.unit = {"m", Dimension::length, 1.0};
    const std::vector<std::string> apart = lines_of(draw(recording, {}, 60, 4));
    REQUIRE(apart.size() == 5);
    CHECK(apart[0].starts_with("  1.5e+308▕"));
    CHECK(apart[3].starts_with(" -1.5e+308▕"));
    for (const double end : {std::numeric_limits<double>::max(), std::numeric_limits<double>::denorm_min()}) {
        recording.samples = {end, end, end};
        const std::string constant = draw(recording, {}, 60, 4);
        CHECK(lines_of(constant).size() == 5);
        CHECK(constant.find("nan") == std::string::npos);
        CHECK(constant.find("inf") == std::string::npos);
    }
}
