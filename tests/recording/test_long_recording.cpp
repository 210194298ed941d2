// Recordings read a stretch at a time, beside the same recordings read whole: the expected values are those
// of read_recording. Samples, their places and counts are equal; times agree to rounding (1e-9 s of
// recordings of minutes, whose times have 1e-14 s), since sums over pieces are made in another order.
#include <sndfile.h>
#include <unistd.h>

#include <catch2/catch.hpp>
#include <cmath>
#include <filesystem>
#include <fstream>
#include <functional>
#include <string>
#include <vector>

#include "recording/bench_table.hpp"
#include "ringwright/error.hpp"
#include "ringwright/long_recording.hpp"
#include "support/draws.hpp"

using namespace ringwright;

namespace {

constexpr LongLimits low_limits{1000, 30'000};
constexpr std::size_t row_count = 160'000;  // 2.5 to 7 MB, three to seven pieces

class TemporaryFile {
  public:
    explicit TemporaryFile(const std::string& bytes, const std::string& name = "long.csv")
        : path_((std::filesystem::temp_directory_path() / (std::to_string(::getpid()) + name)).string()) {
        std::ofstream(path_, std::ios::binary) << bytes;
    }
    ~TemporaryFile() { std::filesystem::remove(path_); }
    TemporaryFile(const TemporaryFile&) = delete;
    TemporaryFile& operator=(const TemporaryFile&) = delete;
    [[nodiscard]] const std::string& path() const { return path_; }

  private:
    std::string path_;
};

using Cell = std::function<std::string(std::size_t)>;

std::string table(const std::string& header, const Cell& row) {
    std::string text = header + "\n";
    for (std::size_t i = 0; i < row_count; ++i) text += row(i) + "\n";
    return text;
}

/// A swing that reaches ±4 mm, with noise; mm with four decimals.
std::string value(std::size_t i, test::Draws& draws) {
    const double t = static_cast<double>(i) / 2000.0;
    return fmt::format("{:.4f}", 4.0 * std::sin(3.0 * t) * std::sin(0.05 * t) + 0.01 * draws.normal());
}

std::vector<std::string> messages(const Recording& recording) {
    std::vector<std::string> list;
    for (const Finding& finding : recording.findings) list.push_back(finding.code + ": " + finding.message);
    return list;
}

void check_ranges(const std::vector<SampleRange>& got, const std::vector<SampleRange>& expected) {
    REQUIRE(got.size() == expected.size());
    for (std::size_t i = 0; i < got.size(); ++i)
        CHECK((got[i].begin == expected[i].begin && got[i].end == expected[i].end));
}

void check_facts(const LongRecording& recording, const Recording& whole) {
    const Recording& facts = recording.facts();
    CHECK(recording.size() == whole.size());
    CHECK(recording.equal_steps() == whole.clock.uniform());
    CHECK(recording.duration_s() == Approx(whole.duration_s()).margin(1e-9));
    CHECK(facts.clock.sample_rate_hz == Approx(whole.clock.sample_rate_hz).epsilon(1e-9));
    CHECK(facts.clock.start_s == Approx(whole.clock.time_of(0)).margin(1e-9));
    CHECK(facts.quantity == whole.quantity);
    CHECK(facts.unit.symbol == whole.unit.symbol);
    CHECK(facts.resolution == whole.resolution);
    CHECK(facts.origin.sha256 == whole.origin.sha256);
    CHECK(facts.origin.file == whole.origin.file);
    CHECK(facts.origin.bytes == whole.origin.bytes);
    CHECK(facts.origin.channel == whole.origin.channel);
    CHECK(messages(facts) == messages(whole));
    check_ranges(facts.clipped, whole.clipped);
    check_ranges(facts.gaps, whole.gaps);
}

void check_stretch(const LongRecording& recording, const Recording& whole, SampleRange range) {
    const Recording part = recording.stretch(range);
    REQUIRE(part.size() == range.end - range.begin);
    std::size_t wrong = 0;
    double furthest = 0.0;
    for (std::size_t i = 0; i < part.size(); ++i) {
        wrong += part.samples[i] == whole.samples[range.begin + i] ? 0 : 1;
        furthest = std::max(furthest, std::abs(part.clock.time_of(i) - whole.clock.time_of(range.begin + i)));
    }
    CHECK(wrong == 0);
    CHECK(furthest < 1e-9);
    CHECK(part.quantity == whole.quantity);
    for (const SampleRange& run : part.clipped) CHECK(run.end <= part.size());
}

/// All of it in stretches of odd length, single samples at the ends, and by time.
void check_beside_whole(const std::string& path, const ReadOptions& options = {}) {
    const Recording whole = read_recording(path, options);
    const auto recording = open_long_recording(path, options, low_limits);
    REQUIRE(recording);
    check_facts(*recording, whole);
    for (std::size_t at = 0; at < whole.size(); at += 29'989)
        check_stretch(*recording, whole, {at, std::min(at + 29'989, whole.size())});
    check_stretch(*recording, whole, {0, 1});
    check_stretch(*recording, whole, {whole.size() - 1, whole.size()});
    for (const std::size_t i : {std::size_t{0}, whole.size() / 3, whole.size() - 1})
        CHECK(recording->sample_at(whole.clock.time_of(i)) == i);
    CHECK(recording->sample_at(whole.clock.time_of(0) - 1.0) == 0);
    CHECK(recording->sample_at(whole.clock.time_of(whole.size() - 1) + 1.0) == whole.size());
}

}  // namespace

TEST_CASE("a long table with a steady clock reads in stretches as it does whole") {
    test::Draws draws(3101);
    const TemporaryFile file(table("time (s),laser (mm)", [&](std::size_t i) {
        return fmt::format("{:.4f},{}", static_cast<double>(i) / 2000.0, value(i, draws));
    }));
    check_beside_whole(file.path());
}

TEST_CASE("a long table without times reads in stretches as it does whole") {
    test::Draws draws(3102);
    const TemporaryFile file(table(
        "laser (mm);load", [&](std::size_t i) { return fmt::format("{};{}", value(i, draws), i % 7); }));
    ReadOptions options;
    options.rate_hz = 2000.0;
    options.channel = "laser";
    check_beside_whole(file.path(), options);
}

TEST_CASE("missing cells of a long table are counted, left out and are gaps in time") {
    test::Draws draws(3103);
    // At the start and the end, alone, in runs, over the border of two pieces and in all of one.
    const auto missing = [](std::size_t i) {
        return i < 5 || i + 3 >= row_count || i == 20'000 || (i > 40'000 && i < 120'000) || i % 9'999 == 0;
    };
    const TemporaryFile file(table("time (s),laser (mm)", [&](std::size_t i) {
        const std::string cell = value(i, draws);
        return fmt::format("{:.4f},{}", static_cast<double>(i) / 2000.0,
                           !missing(i)  ? cell
                           : i % 3 == 0 ? "NaN"
                           : i % 3 == 1 ? ""
                                        : "OVER");
    }));
    check_beside_whole(file.path());
}

TEST_CASE("stamps of a long table that scatter and leave gaps are its clock in stretches too") {
    test::Draws draws(3104);
    double t = 12.5;
    // The usual step is a median; most steps are 0.5 ms so that each piece has the same.
    const TemporaryFile file(table("time (s),laser (mm)", [&](std::size_t i) {
        t += 0.0005;
        if (i % 5 == 1) t += 0.0001 * std::floor(3.0 * draws.uniform() - 1.0);
        if (i % 31'000 == 30'999) t += 4.0;
        const std::string cell = value(i, draws);
        return fmt::format("{:.4f},{}", t, i % 7'001 == 9 ? "" : cell);
    }));
    check_beside_whole(file.path());
}

TEST_CASE("dates and clock times of a long table, over midnight too") {
    test::Draws draws(3105);
    const auto stamp = [](std::size_t i, bool date) {
        const std::size_t ms = 10 * i + 86'400'000 - 700'000;  // midnight after 700 s of 1600
        const std::size_t day = ms / 86'400'000, s = ms / 1000 % 86'400;
        return fmt::format("{}{:02}:{:02}:{:02}.{:03}", date ? fmt::format("2031-04-{:02} ", 2 + day) : "",
                           s / 3600, s / 60 % 60, s % 60, ms % 1000);
    };
    for (const bool date : {true, false}) {
        CAPTURE(date);
        const TemporaryFile file(
            table("clock,laser (mm)", [&](std::size_t i) { return stamp(i, date) + "," + value(i, draws); }));
        check_beside_whole(file.path());
    }
}

TEST_CASE("the runs at the rails of a long recording are found across the borders of its pieces") {
    test::Draws draws(3106);
    const TemporaryFile file(table("time (s),accelerometer (m/s²)", [&](std::size_t i) {
        const double t = static_cast<double>(i) / 2000.0;
        const double x =
            30.0 * std::sin(40.0 * t) * (i / 20'000 % 2 == 0 ? 1.0 : 0.2) + 0.01 * draws.normal();
        return fmt::format("{:.4f},{:.4f}", t, std::clamp(x, -20.0, 20.0));
    }));
    const Recording whole = read_recording(file.path());
    REQUIRE(whole.clipped.size() > 100);
    check_beside_whole(file.path());
}

TEST_CASE("what has to be read whole, and what is short, is not opened as a long recording") {
    test::Draws draws(3107);
    const TemporaryFile backward(table("time (s),laser (mm)", [&](std::size_t i) {
        return fmt::format("{:.4f},{}", static_cast<double>(i == 70'000 ? i - 5 : i) / 2000.0,
                           value(i, draws));
    }));
    CHECK_FALSE(open_long_recording(backward.path(), {}, low_limits));
    CHECK_FALSE(open_long_recording(backward.path()));
    CHECK_THROWS_AS(open_long_recording("there/is/no/such.csv"), InputError);
    const TemporaryFile words("Once upon a time there was a spring.\n");
    CHECK_THROWS_AS(open_long_recording(words.path(), {}, {0, 100}), InputError);
}

TEST_CASE("the overview of a long recording spans it and shows its extremes") {
    test::Draws draws(3108);
    const TemporaryFile file(table("time (s),laser (mm)", [&](std::size_t i) {
        return fmt::format("{:.4f},{}", static_cast<double>(i) / 2000.0,
                           i == 99'999 ? "17.25" : value(i, draws));
    }));
    const Recording whole = read_recording(file.path());
    const auto recording = open_long_recording(file.path(), {}, low_limits);
    REQUIRE(recording);
    const Recording& overview = recording->overview();
    REQUIRE(overview.size() > 2 * row_count / 5000);
    REQUIRE(overview.size() < row_count / 500);
    const auto spike = std::max_element(overview.samples.begin(), overview.samples.end());
    CHECK(*spike == 0.01725);
    const auto at = static_cast<std::size_t>(spike - overview.samples.begin());
    CHECK(overview.clock.time_of(at) == Approx(whole.clock.time_of(99'999)).margin(4096.0 / 2000.0));
    CHECK(std::is_sorted(overview.clock.times_s.begin(), overview.clock.times_s.end()));
}

TEST_CASE("a long sound file reads in stretches as it does whole") {
    constexpr int frames = 700'000;
    const std::string path =
        (std::filesystem::temp_directory_path() / (std::to_string(::getpid()) + "long.wav")).string();
    for (const int format : {SF_FORMAT_WAV | SF_FORMAT_PCM_16, SF_FORMAT_RF64 | SF_FORMAT_PCM_24,
                             SF_FORMAT_W64 | SF_FORMAT_PCM_16, SF_FORMAT_FLAC | SF_FORMAT_PCM_16}) {
        CAPTURE(format);
        SF_INFO info{};
        info.samplerate = 8000;
        info.channels = 2;
        info.format = format;
        SNDFILE* sound = sf_open(path.c_str(), SFM_WRITE, &info);
        REQUIRE(sound != nullptr);
        test::Draws draws(3109);
        std::vector<double> block;
        for (int i = 0; i < frames; ++i) {
            const double t = i / 8000.0;
            block.push_back(0.001 * draws.normal());
            block.push_back(std::clamp(1.1 * std::exp(-std::fmod(t, 20.0)) * std::sin(300.0 * t), -0.9, 0.9));
        }
        REQUIRE(sf_writef_double(sound, block.data(), frames) == frames);
        sf_close(sound);
        const Recording whole = read_recording(path);
        REQUIRE(!whole.clipped.empty());
        check_beside_whole(path);
        CHECK_FALSE(open_long_recording(path));
    }
    std::filesystem::remove(path);
}
