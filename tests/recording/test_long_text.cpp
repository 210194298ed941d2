// Texts long enough to be read in pieces by several threads. The expected numbers are those of the C
// library's strtod, the expected clock that of the formula that wrote the times.

#include <fmt/format.h>

#include <algorithm>
#include <catch2/catch.hpp>
#include <cmath>
#include <cstdlib>
#include <span>
#include <stdexcept>
#include <string>
#include <vector>

#include "recording/csv_rows.hpp"
#include "recording/in_pieces.hpp"
#include "recording/stamp_course.hpp"
#include "ringwright/each_index.hpp"
#include "ringwright/recording.hpp"
#include "support/draws.hpp"

using namespace ringwright;

namespace {

constexpr std::size_t row_count = 200'000;  // about 3 MB, three pieces

struct Text {
    std::string text = "time (s),laser (mm)\n";
    std::vector<double> values;  // in mm
    void add(const std::string& time, const std::string& value) {
        text += time + "," + value + "\n";
        values.push_back(std::strtod(value.c_str(), nullptr));
    }
};

Text steady_text() {
    Text text;
    ringwright::test::Draws draws(7001);
    for (std::size_t i = 0; i < row_count; ++i)
        text.add(fmt::format("{:.5f}", static_cast<double>(i) / 20000.0),
                 fmt::format("{:.5f}", draws.normal()));
    return text;
}

}  // namespace

TEST_CASE("every way to write a decimal gives the double that is nearest to it") {
    const char* forms[] = {"0",
                           "-0",
                           "7",
                           "-12",
                           "0.1",
                           "-0.25",
                           ".5",
                           "-.75",
                           "5.",
                           "00012.50",
                           "1e3",
                           "-2.5E-3",
                           "1e22",
                           "1.5e-10",
                           "9007199254740993",
                           "0.30000000000000004",
                           "123456789012345678",
                           "1234567890123456789.25",
                           "0.000000000000000001",
                           "4.35",
                           "2.2250738585072014e-308"};
    std::string text = "x (mm)\n";
    for (int repeat = 0; repeat < 2; ++repeat)
        for (const char* form : forms) text += std::string(form) + "\n";
    ReadOptions options;
    options.rate_hz = 100.0;
    options.unit = "m";
    const Recording recording = read_recording_from_memory(text, "forms.csv", options);
    REQUIRE(recording.samples.size() == 2 * std::size(forms));
    for (std::size_t i = 0; i < std::size(forms); ++i) {
        INFO(forms[i]);
        CHECK(recording.samples[i] == std::strtod(forms[i], nullptr));
        CHECK(std::signbit(recording.samples[i]) == (forms[i][0] == '-'));
    }
}

TEST_CASE("a long text on a steady clock: every value, the rate, and no times kept") {
    const Text text = steady_text();
    const Recording recording = read_recording_from_memory(text.text, "steady.csv");
    CHECK(recording.clock.uniform());
    CHECK(recording.clock.sample_rate_hz == 20000.0);
    CHECK(recording.clock.start_s == 0.0);
    REQUIRE(recording.samples.size() == row_count);
    std::size_t wrong = 0;
    for (std::size_t i = 0; i < row_count; ++i)
        wrong += std::abs(recording.samples[i] - 1e-3 * text.values[i]) > 1e-18
                     ? 1
                     : 0;  // rounding of the scaling
    CHECK(wrong == 0);
}

TEST_CASE("a long text whose clock stops late, or jitters from the start, keeps its times") {
    const std::size_t at = GENERATE(row_count - 1000, std::size_t{100});
    Text text;
    for (std::size_t i = 0; i < row_count; ++i) {
        const double lost = i >= at ? 0.5 : 0.0;
        text.add(fmt::format("{:.5f}", static_cast<double>(i) / 20000.0 + lost), fmt::format("{}", i % 100));
    }
    const Recording recording = read_recording_from_memory(text.text, "gap.csv");
    REQUIRE(recording.clock.times_s.size() == row_count);
    CHECK(recording.clock.times_s.back() == Approx(static_cast<double>(row_count - 1) / 20000.0 + 0.5));
    REQUIRE(recording.gaps.size() == 1);
    CHECK(recording.gaps.front().end == at);
}

TEST_CASE("rows of another dress in the midst of a long text are read as ever") {
    Text text;
    std::size_t lines = 0;
    for (std::size_t i = 0; i < row_count; ++i) {
        const std::string time = fmt::format("{:.5f}", static_cast<double>(i) / 20000.0);
        if (i % 50'000 == 7) text.text += "\n", ++lines;
        if (i % 50'000 == 20) {
            text.text += fmt::format("\"{}\" , \"+{}\"\r\n", time, 0.5);
            text.values.push_back(0.5);
        } else {
            text.add(time, i % 50'000 == 30   ? "-1.25e-1"
                           : i % 50'000 == 40 ? " 3.5"
                                              : fmt::format("{}", i % 90));
        }
    }
    text.text += "9.99995,4.5";  // no end of line
    text.values.push_back(4.5);
    std::string& whole = text.text;
    whole.replace(whole.rfind("9.99995,4.5"), 7, "10.0000");
    const Recording recording = read_recording_from_memory(whole, "dress.csv");
    CHECK(lines == 4);
    REQUIRE(recording.samples.size() == row_count + 1);
    CHECK(recording.clock.uniform());
    std::size_t wrong = 0;
    for (std::size_t i = 0; i <= row_count; ++i)
        wrong += std::abs(recording.samples[i] - 1e-3 * text.values[i]) > 1e-17 ? 1 : 0;
    CHECK(wrong == 0);
}

TEST_CASE("thousands marks that come late in a long text are seen") {
    std::string text = "time;force (N)\n";
    for (std::size_t i = 0; i < row_count; ++i)
        text += fmt::format("{:.5f};{}\n", static_cast<double>(i) / 20000.0,
                            i + 500 > row_count ? std::string("1,234.50")
                                                : fmt::format("{:.2f}", static_cast<double>(i % 90)));
    ReadOptions options;
    options.unit = "m";
    options.quantity = MeasuredQuantity::displacement;
    const Recording recording = read_recording_from_memory(text, "late.csv", options);
    REQUIRE(recording.samples.size() == row_count);
    CHECK(recording.samples.back() == 1234.5);
}

TEST_CASE("the answer of a reader in pieces does not depend on the number of threads") {
    const Text text = steady_text();
    const std::string_view rows = std::string_view(text.text).substr(text.text.find('\n') + 1);
    RowPlan plan;
    plan.time_source = TimeSource::number;
    plan.value_column = 1;
    const Rows one = read_rows(rows, plan, 1), three = read_rows(rows, plan, 3);
    CHECK(one.values == three.values);
    CHECK(one.times == three.times);
    const auto alone = read_steady_rows(rows, plan, 1.0, 1e-5, 1);
    const auto together = read_steady_rows(rows, plan, 1.0, 1e-5, 3);
    REQUIRE((alone && together));
    CHECK(alone->rows.values == one.values);
    CHECK(together->rows.values == one.values);
    CHECK(together->rows.times.empty());
    CHECK(alone->clock.sample_rate_hz == together->clock.sample_rate_hz);
}

TEST_CASE("a failure in the midst of a reading in pieces comes out, and no thread waits for ever") {
    const Text text = steady_text();
    const std::string_view rows = std::string_view(text.text).substr(text.text.find('\n') + 1);
    RowPlan plan;
    plan.time_source = TimeSource::number;
    plan.value_column = 1;
    const auto stop = [](double) { throw std::runtime_error("stopped"); };
    CHECK_THROWS_AS(read_rows(rows, plan, 3, stop), std::runtime_error);
    CHECK_THROWS_AS(for_each_index(100, 4,
                                   [](std::size_t i, unsigned) {
                                       if (i == 50) throw std::runtime_error("stopped");
                                   }),
                    std::runtime_error);
}

TEST_CASE("the band of stamps about a line is that of all of them, in pieces too") {
    // A steady clock, one that slows down and one that speeds up: the hull of a bend is all of its stamps.
    const double bend = GENERATE(0.0, 2e-8, -2e-8);
    ringwright::test::Draws draws(7002);
    std::vector<double> times;
    for (std::size_t i = 0; i < 5000; ++i) {
        const double index = static_cast<double>(i), scatter = bend == 0.0 ? 1e-4 : 1e-9;
        const double time = 3.0 + index / 777.0 + bend * index * index + scatter * draws.normal();
        times.push_back(bend == 0.0 ? std::round(1e5 * time) / 1e5 : time);
    }
    std::sort(times.begin(), times.end());
    const std::span<const double> all(times);
    StampCourse course = course_of(all.first(1700));
    append(course, course_of(all.subspan(1700, 1)));
    append(course, course_of(all.subspan(1701)));
    REQUIRE(course.forward);
    for (const double step : {1.0 / 777.0, 1.0 / 776.9, 1.0 / 777.3, 0.0}) {
        double low = 1e9, high = -1e9;
        for (std::size_t i = 0; i < times.size(); ++i) {
            const double distance = times[i] - 3.0 - step * static_cast<double>(i);
            low = std::min(low, distance);
            high = std::max(high, distance);
        }
        const Band band = band_about(course, 3.0, step);
        CHECK(band.low == Approx(low).margin(1e-12));  // rounding of the hull's corners
        CHECK(band.high == Approx(high).margin(1e-12));
    }
    append(course, course_of(all.first(1)));
    CHECK_FALSE(course.forward);
}
