#include <catch2/catch.hpp>
#include <cmath>
#include <vector>

#include "recording/bench_table.hpp"
#include "recording/clock.hpp"
#include "recording/csv_cells.hpp"

using namespace ringwright;

namespace {

Timed clock_of(double step, int count, double rounding, double start = 0.0) {
    std::vector<double> times;
    for (int i = 0; i < count; ++i) {
        const double t = start + step * i;
        times.push_back(rounding > 0.0 ? std::round(t / rounding) * rounding : t);
    }
    return clock_from_stamps(times, std::vector<double>(times.size(), 1.0), rounding);
}

}  // namespace

TEST_CASE("the rate comes from all stamps, however they were rounded") {
    // Rounding is to the last digit printed; the rates are the ones the stamps were made with.
    CHECK(clock_of(0.0005, 4000, 0.001).clock.sample_rate_hz == Approx(2000.0).epsilon(1e-12));
    CHECK(clock_of(0.0005, 4000, 0.001).clock.uniform());
    CHECK(clock_of(1.0 / 44100.0, 20000, 1e-6).clock.sample_rate_hz == Approx(44100.0).epsilon(1e-8));
    CHECK(clock_of(1.0 / 3.0, 3000, 0.01).clock.sample_rate_hz == Approx(3.0).epsilon(1e-6));
    CHECK(clock_of(2.000277970813e-05, 1439, 0.0).clock.sample_rate_hz == Approx(49993.0).epsilon(2e-7));
    CHECK(clock_of(0.001, 5000, 1e-6, 1.7e9).clock.sample_rate_hz == Approx(1000.0).epsilon(1e-9));
    // Whole seconds on 100 Hz sampling, as some loggers stamp: a sample at either end of 9,900.
    CHECK(clock_of(0.01, 10000, 1.0).clock.sample_rate_hz == Approx(100.0).epsilon(2.0 / 9900.0));
    CHECK(clock_of(0.01, 1000, 0.0, 10.0).clock.start_s == 10.0);
}

TEST_CASE("dates and times in cells (ISO 8601 examples worked by hand)") {
    const auto ns = [](const char* text) { return stamp_in_cell(text)->nanoseconds; };
    constexpr std::int64_t s = 1'000'000'000;
    CHECK(ns("1970-01-01T00:00:00Z") == 0);
    CHECK(ns("1970-01-02") == 86400 * s);
    CHECK(ns("2000-03-01T00:00:00") == 951868800 * s);  // `date -u -d 2000-03-01 +%s`
    CHECK(ns("2000-03-01T02:00:00+02:00") == 951868800 * s);
    CHECK(ns("2000-02-29T18:30:00-0530") == 951868800 * s);
    CHECK(ns("01.03.2000 00:00:00,25") == 951868800 * s + s / 4);
    CHECK(ns("3/1/2000 12:00:00.5 AM") == 951868800 * s + s / 2);
    CHECK(ns("12:00:00 PM") == 43200 * s);
    CHECK(ns("10:15:30.123456789") == (10 * 3600 + 15 * 60 + 30) * s + 123456789);
    CHECK(ns("10:15") == (10 * 3600 + 15 * 60) * s);
    CHECK(ns("15:30.5") == (15 * 60 + 30) * s + s / 2);
    for (const char* text :
         {"", "1.5", "2031", "2031-13-01", "10:61", "10:15:30.", "1:2:3:4:5", "2031-04-02Q10:00", "abc"})
        CHECK_FALSE(stamp_in_cell(text));
}

TEST_CASE("numbers in cells") {
    const Dialect point{',', '.', '\0'}, comma{';', ',', '\0'}, english{';', '.', ','}, german{';', ',', '.'};
    CHECK(number_in_cell("1.5", point) == 1.5);
    CHECK(number_in_cell("+1.5e-3", point) == 1.5e-3);
    CHECK(number_in_cell("−2", point) == -2.0);
    CHECK(number_in_cell("1,5", comma) == 1.5);
    CHECK(number_in_cell("1,234,567.5", english) == 1234567.5);
    CHECK(number_in_cell("-1.234,5", german) == -1234.5);
    for (const char* text : {"", "nan", "inf", "1e999", "1.5x", "1 2", "0x10", "1,5"})
        CHECK_FALSE(number_in_cell(text, point));
    for (const char* text : {"12,34.5", "1,23", ",123", "1234,567", "1,2345"})
        CHECK_FALSE(number_in_cell(text, english));
    CHECK(decimals_in_cell("1.250", '.') == 3);
    CHECK(decimals_in_cell("1.250e-03", '.') == 6);
    CHECK(decimals_in_cell("1250", '.') == 0);
}
