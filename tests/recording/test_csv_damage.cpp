// Tables with holes, disorder and rubbish in them; and files that are no recordings.
#include <unistd.h>

#include <catch2/catch.hpp>
#include <cstdio>
#include <cstdlib>
#include <filesystem>
#include <fstream>

#include "recording/bench_table.hpp"
#include "recording/input_bytes.hpp"
#include "ringwright/error.hpp"

using namespace ringwright;
using bench::has_finding;
using bench::message_of;

namespace {

std::vector<std::string> good_rows(std::size_t count = 4000) {
    std::vector<std::string> rows;
    for (std::size_t i = 0; i < count; ++i) {
        const double t = static_cast<double>(i) / bench::rate_hz;
        rows.push_back(fmt::format("{:.4f},{:.4f}\n", t, bench::position(t)));
    }
    return rows;
}

Recording read(const std::vector<std::string>& rows, const std::string& after = "") {
    std::string text = "time (s),disp (mm)\n";
    for (const std::string& row : rows) text += row;
    return read_recording_from_memory(text + after, "damaged.csv");
}

// Every sample stands at its own time, whatever was left out.
void check_samples_at_their_times(const Recording& recording) {
    double worst = 0.0;
    for (std::size_t i = 0; i < recording.size(); ++i)
        worst = std::max(worst,
                         std::abs(recording.samples[i] * 1e3 - bench::position(recording.clock.time_of(i))));
    CHECK(worst < 5.1e-5);  // four decimals printed
}

struct TemporaryFile {
    std::filesystem::path path;
    TemporaryFile(const char* name, const std::string& bytes)
        : path(std::filesystem::temp_directory_path() / (std::to_string(::getpid()) + "-reading-" + name)) {
        std::ofstream(path, std::ios::binary) << bytes;
    }
    ~TemporaryFile() { std::filesystem::remove(path); }
    TemporaryFile(const TemporaryFile&) = delete;
    TemporaryFile& operator=(const TemporaryFile&) = delete;
};

}  // namespace

TEST_CASE("missing and overloaded cells are left out, their times kept") {
    auto rows = good_rows();
    const char* marks[] = {"",     "NaN", "nan",  "-",      "--",      "---",     "OVER", "OL",
                           "####", "Inf", "-Inf", "1.#INF", "1.#QNAN", "9.9E+37", "n/a",  "Overflow"};
    std::size_t at = 100;
    for (const char* mark : marks) {
        rows[at] = fmt::format("{:.4f},{}\n", static_cast<double>(at) / bench::rate_hz, mark);
        at += 50;
    }
    const Recording recording = read(rows);
    CHECK(recording.size() == 4000 - std::size(marks));
    CHECK_FALSE(recording.clock.uniform());
    check_samples_at_their_times(recording);
    CHECK(message_of(recording.findings, "missing_values").find("8 of 4000") != std::string::npos);
    CHECK(message_of(recording.findings, "missing_values").find("line 102") != std::string::npos);
    CHECK(message_of(recording.findings, "overflow_markers").find("8 rows") != std::string::npos);
    CHECK(recording.gaps.size() == std::size(marks));
}

TEST_CASE("missing cells at the ends cost nothing") {
    auto rows = good_rows();
    for (const std::size_t i : {0U, 1U, 3998U, 3999U})
        rows[i] = fmt::format("{:.4f},\n", static_cast<double>(i) / bench::rate_hz);
    const Recording recording = read(rows);
    CHECK(recording.size() == 3996);
    CHECK(recording.clock.uniform());
    CHECK(recording.clock.start_s == Approx(0.001).epsilon(1e-9));
    check_samples_at_their_times(recording);
}

TEST_CASE("gaps, repeated, backward and stray stamps are mended and told") {
    auto rows = good_rows();
    SECTION("a gap") {
        rows.erase(rows.begin() + 1000, rows.begin() + 1100);
        const Recording recording = read(rows);
        CHECK(recording.size() == 3900);
        REQUIRE(recording.gaps.size() == 1);
        CHECK(recording.gaps.front().begin == 999);
        CHECK(recording.gaps.front().end == 1000);
        CHECK(has_finding(recording.findings, "gaps"));
        check_samples_at_their_times(recording);
    }
    SECTION("a repeated row") {
        rows.insert(rows.begin() + 500, rows[499]);
        const Recording recording = read(rows);
        CHECK(recording.size() == 4000);
        CHECK(recording.clock.uniform());
        CHECK(message_of(recording.findings, "repeated_time_stamps").find("1 row repeats") !=
              std::string::npos);
    }
    SECTION("a stamp that runs backward") {
        rows[500] = rows[100];
        const Recording recording = read(rows);
        CHECK(recording.size() == 3999);
        CHECK(has_finding(recording.findings, "backward_time_stamps"));
        check_samples_at_their_times(recording);
    }
    SECTION("a stamp far ahead") {
        rows[500] = "900.0000,1.0\n";
        const Recording recording = read(rows);
        CHECK(recording.size() == 3999);
        CHECK(has_finding(recording.findings, "backward_time_stamps"));
        check_samples_at_their_times(recording);
    }
    SECTION("a clock that was set back") {
        const auto again = good_rows(1000);
        rows.insert(rows.end(), again.begin(), again.end());
        const Recording recording = read(rows);
        CHECK(recording.size() == 5000);
        CHECK(has_finding(recording.findings, "clock_set_back"));
        CHECK(recording.duration_s() == Approx(4999 / bench::rate_hz).epsilon(1e-9));
    }
    SECTION("a footer and a remark") {
        rows.insert(rows.begin() + 2000, "operator pressed the button\n");
        const Recording recording = read(rows, "End of data\n\n");
        CHECK(recording.size() == 4000);
        CHECK(recording.clock.uniform());
        CHECK(message_of(recording.findings, "unreadable_rows").find("2 lines") != std::string::npos);
        CHECK(message_of(recording.findings, "unreadable_rows").find("line 2002") != std::string::npos);
    }
    SECTION("a line of zero bytes") {
        rows.insert(rows.begin() + 900, std::string(64, '\0') + "\n");
        const Recording recording = read(rows);
        CHECK(recording.size() == 4000);
        CHECK(recording.clock.uniform());
        CHECK(message_of(recording.findings, "unreadable_rows").find("1 line is no row") !=
              std::string::npos);
        CHECK(message_of(recording.findings, "unreadable_rows").find("line 902") != std::string::npos);
    }
    SECTION("zero bytes where the power failed") {
        const Recording recording = read(rows, std::string(512, '\0'));
        CHECK(recording.size() == 4000);
        CHECK(has_finding(recording.findings, "cut_file"));
    }
}

TEST_CASE("stamps that jitter are used as they are") {
    bench::Random random;
    std::string text = "time (s),disp (mm)\n";
    for (int i = 0; i < 4000; ++i) {
        const double t = i / bench::rate_hz + 1e-4 * (random.next() - 0.5);
        text += fmt::format("{:.6f},{:.4f}\n", t, bench::position(t));
    }
    const Recording recording = read_recording_from_memory(text, "jitter.csv");
    CHECK_FALSE(recording.clock.uniform());
    CHECK(has_finding(recording.findings, "jittering_time_stamps"));
    // Printed values (5e-5 mm) and printed times (5e-7 s at up to 0.22 mm/ms).
    double worst = 0.0;
    for (std::size_t i = 0; i < recording.size(); ++i)
        worst = std::max(worst,
                         std::abs(recording.samples[i] * 1e3 - bench::position(recording.clock.time_of(i))));
    CHECK(worst < 5.1e-5 + 5e-7 * 230.0);
}

TEST_CASE("what is no recording is refused with the file and a remedy") {
    std::string binary(20000, '\0');
    bench::Random random;
    for (char& byte : binary) byte = static_cast<char>(static_cast<int>(256.0 * random.next()) - 128);
    const std::string cases[] = {"",
                                 "hello world\n",
                                 "time,x\n",
                                 "time (s),x (mm)\n0,1\n",
                                 "time (s),x (mm)\n0,1\n1,2\n2,3\n",
                                 binary,
                                 std::string("PK\x03\x04") + binary,
                                 "%PDF-1.7\n1 0 obj\n",
                                 std::string(100, '\n'),
                                 std::string(100, ','),
                                 "a;b;c\nd;e;f\n",
                                 "\xFF\xFE",
                                 "0",
                                 "RIFF",
                                 "RIFF\x10\0\0\0WAVEfmt ",
                                 std::string(1000, '\0'),
                                 "time (s),x (mm)\n" + std::string(5000, '9') + "\n"};
    for (const std::string& bytes : cases) {
        INFO(bytes.substr(0, 40));
        try {
            (void)read_recording_from_memory(bytes, "rubbish.csv");
            FAIL("it was accepted");
        } catch (const InputError& error) {
            CHECK(error.problem().file == "rubbish.csv");
            CHECK_FALSE(error.problem().found.empty());
            CHECK_FALSE(error.problem().remedy.empty());
        }
    }
    CHECK_THROWS_AS(read_recording("/nonexistent/bench.csv"), InputError);
    CHECK_THROWS_AS(read_recording("/"), InputError);
    CHECK_THROWS_AS(read_recording(std::string("a\0b", 3)), InputError);
}

TEST_CASE("a time column that stands still is refused") {
    std::string text = "time (s),x (mm)\n";
    for (int i = 0; i < 100; ++i) text += fmt::format("1.0,{}\n", i % 7);
    CHECK_THROWS_AS(read_recording_from_memory(text, "still.csv"), InputError);
}

namespace {

Problem refusal_of(const std::string& text) {
    try {
        (void)read_recording_from_memory(text, "refused.csv");
    } catch (const InputError& error) {
        return error.problem();
    }
    FAIL("it was accepted: " << text.substr(0, 60));
    return {};
}

bool holds(const std::string& text, const char* part) {
    return text.find(part) != std::string::npos;
}

}  // namespace

TEST_CASE("what is refused is refused for its true cause") {
    std::string backward = "time,x\n", missing = "time,x\n", still = "time,x\n", infinite = "time,x\n", wide;
    for (int i = 0; i < 400; ++i) {
        const double x = std::sin(0.2 * i);
        backward += fmt::format("{:.3f},{:.5f}\n", 8.0 - 0.01 * i, x);
        missing += fmt::format("{:.3f},NaN\n", 0.01 * i);
        still += fmt::format("1.0,{:.5f}\n", x);
        infinite += fmt::format("{:.3f},{}\n", 0.01 * i, i % 3 == 0 ? "1e308" : "inf");
    }
    for (int row = 0; row < 40; ++row) {
        for (int i = 0; i < 5000; ++i) wide += std::to_string(row) + ",";
        wide += "1\n";
    }
    CHECK(holds(refusal_of(backward).found, "runs backward"));
    CHECK(refusal_of(backward).place == "column time");
    CHECK(holds(refusal_of(missing).found, "no row holds a number"));
    CHECK(refusal_of(missing).place == "column x");
    CHECK(holds(refusal_of(still).found, "does not go forward"));
    CHECK(refusal_of(still).place == "column time");
    CHECK(holds(refusal_of("time,x\n0,1\n").found, "only 1 row"));
    CHECK(holds(refusal_of(infinite).found, "overloaded"));
    CHECK(holds(refusal_of(infinite).remedy, "range"));
    CHECK(holds(refusal_of(wide).found, "5001 columns"));
    CHECK(holds(refusal_of(wide).found, "4096"));
}

TEST_CASE("a constant channel is read and called so") {
    std::string text = "time (s),x (mm)\n";
    for (int i = 0; i < 100; ++i) text += fmt::format("{:.3f},1.5\n", i / 1000.0);
    const Recording recording = read_recording_from_memory(text, "flat.csv");
    CHECK(recording.size() == 100);
    CHECK(has_finding(recording.findings, "constant_signal"));
}

TEST_CASE("a file is hashed and read as its bytes are") {
    // SHA-256 of "abc": FIPS 180-4 example, NIST.
    CHECK(sha256_hex("abc") == "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad");
    std::string text = "time (s),disp (mm)\n";
    for (const std::string& row : good_rows()) text += row;
    const TemporaryFile file("hash.csv", text);
    const Recording from_file = read_recording(file.path.string());
    const Recording from_memory = read_recording_from_memory(text, "hash.csv");
    CHECK(from_file.samples == from_memory.samples);
    CHECK(from_file.origin.sha256 == sha256_hex(text));
    CHECK(from_file.origin.bytes == text.size());
    const FileSummary summary = summarise_file(file.path.string());
    CHECK(summary.format == "CSV");
    REQUIRE(summary.channels.size() == 2);
    CHECK(summary.channels[0].role == "time");
    CHECK(summary.channels[1].role == "signal");
    CHECK(summary.channels[1].values == 4000);
    CHECK(summary.channels[1].unit == "mm");
}

// Bytes changed, lost, doubled and cut at random: an answer or one of the two exceptions, never anything
// else.
TEST_CASE("damaged bytes never do more than throw") {
    std::string text = "Prüfung;x\nZeit [s];Weg [mm]\n";
    for (const std::string& row : good_rows(300)) text += bench::replaced(row, ",", ";");
    bench::Random random;
    const auto below = [&](std::size_t n) {
        return static_cast<std::size_t>(random.next() * static_cast<double>(n));
    };
    std::size_t read_well = 0;
    for (int trial = 0; trial < 2000; ++trial) {
        std::string damaged = text;
        for (std::size_t k = 1 + below(20); k-- > 0 && !damaged.empty();) {
            const std::size_t at = below(damaged.size());
            switch (below(4)) {
                case 0:
                    damaged[at] = static_cast<char>(below(256));
                    break;
                case 1:
                    damaged.erase(at, 1 + below(60));
                    break;
                case 2:
                    damaged.insert(at, damaged.substr(below(damaged.size()), below(80)));
                    break;
                default:
                    if (below(8) == 0) damaged.resize(at);
            }
        }
        try {
            const Recording recording = read_recording_from_memory(damaged, "damaged");
            CHECK(recording.size() >= 16);
            CHECK(std::isfinite(recording.clock.sample_rate_hz));
            CHECK(std::all_of(recording.samples.begin(), recording.samples.end(),
                              [](double v) { return std::isfinite(v); }));
            ++read_well;
        } catch (const InputError& error) {
            CHECK_FALSE(error.problem().remedy.empty());
        }
    }
    CHECK(read_well > 500);  // most damage leaves a table
}
