// One recording in the many dresses that loggers give it. The truth is the formula in bench_table.hpp; values
// are printed with four decimals, so that half of the last digit (5e-5 mm) and a rounding of doubles is all
// that may differ.
#include <catch2/catch.hpp>

#include "recording/bench_table.hpp"
#include "ringwright/error.hpp"

using namespace ringwright;
using bench::Form;
using bench::has_finding;
using bench::table;

namespace {

constexpr double print_error = 5.1e-5;

std::string utf16(const std::string& utf8, bool big_endian, bool mark) {
    // Enough for the letters used here: one or two bytes in UTF-8.
    std::string out = mark ? (big_endian ? "\xFE\xFF" : "\xFF\xFE") : "";
    for (std::size_t i = 0; i < utf8.size(); ++i) {
        unsigned code = static_cast<unsigned char>(utf8[i]);
        if (code >= 0xC0) code = ((code & 0x1F) << 6) | (static_cast<unsigned char>(utf8[++i]) & 0x3F);
        const char high = static_cast<char>(code >> 8), low = static_cast<char>(code & 0xFF);
        out += big_endian ? high : low;
        out += big_endian ? low : high;
    }
    return out;
}

void check_dress(const std::string& text, const ReadOptions& options = {}) {
    const Recording recording = read_recording_from_memory(text, "dress.csv", options);
    CHECK(recording.clock.uniform());
    CHECK(recording.clock.sample_rate_hz == Approx(bench::rate_hz).epsilon(1e-9));
    CHECK(recording.quantity == MeasuredQuantity::displacement);
    CHECK(recording.quantity_known);
    CHECK(recording.scaled);
    CHECK(recording.unit.symbol == "mm");
    CHECK(bench::worst_error_mm(recording, 4000) < print_error);
}

}  // namespace

TEST_CASE("headers, delimiters and decimal marks are recognised") {
    struct Dress {
        const char* what;
        Form form;
    };
    const Dress dresses[] = {
        {"comma", {}},
        {"semicolon, decimal comma, German, ms", {"Zeit [ms];Weg [mm]\n", ";", ',', "\n", "", 1000.0, 1}},
        {"tab", {"Time ( s )\tPosition ( mm )\r\n", "\t", '.', "\r\n"}},
        {"blanks with a comment sign", {"# time(s), \t \t position(mm)\n", "   "}},
        {"blanks and words with units", {"Time (s) Travel (mm)\n", " "}},
        {"bars", {"t [s] | x [mm]\n", " | "}},
        {"trailing separators", {"t [s];x [mm];\n", ";", ',', "\r\n", ";"}},
        {"units in a row of their own", {"Time,Laser\ns,mm\n"}},
        {"units in a row of their own, bracketed", {"Time;Laser\n[s];[mm]\n", ";", ','}},
        {"unit behind a slash", {"Zeit/s;Weg/mm\n", ";", ','}},
        {"unit behind a slash, in parentheses", {"t / (ms),x / (mm)\n", ",", '.', "\n", "", 1000.0, 2}},
        {"unit behind 'in'", {"Zeit in s;Weg in mm\n", ";", ','}},
        {"unit behind an underscore", {"time_s,disp_mm\n"}},
        {"unit behind a blank", {"Time ms\tdisp mm\n", "\t", '.', "\n", "", 1000.0, 3}},
        {"units alone", {"s,mm\n"}},
        {"header of commas above tabs", {"time (s),disp (mm)\n", "\t"}},
        {"quoted header", {"\"time (s)\",\"disp (mm)\"\n"}},
        {"microseconds", {"Time [µs],x [mm]\n", ",", '.', "\n", "", 1e6, 0}},
        {"minutes", {"Time [min],x [mm]\n", ",", '.', "\n", "", 1.0 / 60.0, 9}},
        {"French", {"temps (s);déplacement (mm)\n", ";", ','}},
        {"Spanish", {"tiempo (s);desplazamiento (mm)\n", ";", ','}},
        {"old line ends", {"time (s),disp (mm)\r", ",", '.', "\r"}},
        {"one blank line below the units", {"Time,Channel A\n(ms),(mm)\n\n", ",", '.', "\n", "", 1000.0, 4}},
        {"a word before the units", {"Name;Zeit;Weg\nEinheit;ms;mm\n;", ";", ',', "\n;", "", 1000.0, 4}},
        {"a comma inside a quoted name", {"Time (s),\"Weg, links (mm)\"\n"}},
        {"words for units", {"Elapsed Time;Position\nseconds;millimeters\n", ";"}},
        {"a line that names the separator", {"sep=;\nZeit [s];Weg [mm]\n", ";", ','}},
        {"comment signs before header", {"% recorded on bench 3\n% t [s]   x [mm]\n", "   "}},
        {"names end before an empty column",
         {"Time\t10:15:30\nX_Value [s]\tlaser [mm]\tComment\n", "\t", '.', "\n", "\t"}},
        {"times printed to the millisecond only", {"time (s),disp (mm)\n", ",", '.', "\n", "", 1.0, 3}},
    };
    for (const Dress& dress : dresses) {
        INFO(dress.what);
        check_dress(table(dress.form));
    }
}

TEST_CASE("encodings are recognised") {
    const std::string text = table({"Zeit [s];Weg Prüfling [mm]\r\n", ";", ',', "\r\n"});
    check_dress(text);
    check_dress("\xEF\xBB\xBF" + text);
    for (const bool big_endian : {false, true})
        for (const bool mark : {false, true}) check_dress(utf16(text, big_endian, mark));
    const std::string latin1 = bench::replaced(text, "ü", "\xFC");
    check_dress(latin1);
    CHECK(read_recording_from_memory(latin1, "x").origin.channel == "Weg Prüfling");
}

TEST_CASE("a preamble of any length is passed over") {
    std::string settings = "Recorder report\nOperator;bench 3\nDate;2031-04-02\n\n";
    for (int i = 0; i < 3000; ++i) settings += fmt::format("Setting {};{}\n", i, 0.5 * i);
    check_dress(settings + table({"Zeit [s];Weg [mm]\n", ";", ','}));
    // A short list of numbers, then words, then the table.
    std::string calibration = "Calibration\n";
    for (int i = 0; i < 40; ++i) calibration += fmt::format("{};{}\n", i, 2 * i);
    check_dress(calibration + "\n" + table({"Zeit [s];Weg [mm]\n", ";"}));
    check_dress("Sample rate;2000\nSamples;4000\n" + table({"Zeit [s];Weg [mm]\n", ";", ','}));
}

TEST_CASE("dates and clock times make a clock") {
    std::string iso = "Timestamp,laser/mm\n", apart = "Date;Time;Weg [mm]\n", clock = "Uhrzeit;Weg [mm]\n",
                zone = "stamp;Weg [mm]\n", german = "Datum Uhrzeit;Weg [mm]\n";
    for (int i = 0; i < 4000; ++i) {
        const double t = i / bench::rate_hz;
        const std::string x = bench::number(bench::position(t), 4, '.');
        const double of_minute = 59.0 + t;  // midnight comes after one second
        const bool next = of_minute >= 60.0;
        const std::string seconds = fmt::format("{:07.4f}", next ? of_minute - 60.0 : of_minute);
        const std::string time = (next ? "00:00:" : "23:59:") + seconds;
        iso += (next ? "2032-03-01T" : "2032-02-29T") + time + "Z," + x + "\n";
        zone +=
            (next ? "2031-01-01 " : "2030-12-31 ") + time + "+02:00;" + bench::replaced(x, ".", ",") + "\n";
        apart += (next ? "2031-04-03;" : "2031-04-02;") + bench::replaced(time + ";" + x, ".", ",") + "\n";
        clock += bench::replaced(time + ";" + x, ".", ",") + "\n";
        german += (next ? "01.04.2031 " : "31.03.2031 ") + bench::replaced(time + ";" + x, ".", ",") + "\n";
    }
    for (const std::string* text : {&iso, &zone, &apart, &clock, &german}) {
        INFO(text->substr(0, 80));
        check_dress(*text);
        CHECK(read_recording_from_memory(*text, "stamps.csv").clock.start_s == 0.0);
    }
}

TEST_CASE("without a header the unit of the time is judged and the judgement is told") {
    const Recording ms = read_recording_from_memory(table({"", "\t", '.', "\n", "", 1000.0, 3}), "ms.txt");
    CHECK(ms.clock.sample_rate_hz == Approx(2000.0).epsilon(1e-9));
    CHECK(bench::message_of(ms.findings, "time_unit_assumed").find("milliseconds") != std::string::npos);
    CHECK(bench::message_of(ms.findings, "time_unit_assumed").find("--rate") != std::string::npos);
    CHECK(has_finding(ms.findings, "quantity_assumed"));
    CHECK_FALSE(ms.quantity_known);
    CHECK_FALSE(ms.scaled);

    const Recording seconds = read_recording_from_memory(table({"", "\t"}), "s.txt");
    CHECK(seconds.clock.sample_rate_hz == Approx(2000.0).epsilon(1e-9));
    CHECK(has_finding(seconds.findings, "time_unit_assumed"));

    ReadOptions rate;
    rate.rate_hz = 2000.0;
    rate.unit = "mm";
    check_dress(table({"", "\t", '.', "\n", "", 1000.0, 3}), rate);

    std::string counted;
    for (int i = 0; i < 4000; ++i)
        counted +=
            fmt::format("{},{:.4f},{:.4f}\n", i, i / bench::rate_hz, bench::position(i / bench::rate_hz));
    const Recording with_counter = read_recording_from_memory(counted, "n.csv");
    CHECK(with_counter.origin.channel == "3");
    CHECK(with_counter.clock.sample_rate_hz == Approx(2000.0).epsilon(1e-9));

    std::string epoch = "timestamp;Weg [mm]\n";
    for (int i = 0; i < 4000; ++i)
        epoch += fmt::format("{:.1f};{:.4f}\n", 1.9e12 + 0.5 * i, bench::position(i / bench::rate_hz));
    check_dress(epoch);
    CHECK(read_recording_from_memory(epoch, "epoch.csv").clock.start_s == 0.0);
}

TEST_CASE("without a time column the rate is asked for") {
    std::string column = "Weg [mm]\n";
    for (int i = 0; i < 4000; ++i)
        column += bench::number(bench::position(i / bench::rate_hz), 4, ',') + "\n";
    try {
        (void)read_recording_from_memory(column, "one.csv");
        FAIL("a recording without a clock was accepted");
    } catch (const InputError& error) {
        CHECK(error.problem().file == "one.csv");
        CHECK(error.problem().remedy.find("--rate") != std::string::npos);
    }
    ReadOptions options;
    options.rate_hz = 2000.0;
    check_dress(column, options);
    for (const char* line : {"Abtastrate;2000\n", "Sample rate: 2 kHz\n", "Sample interval (ms) = 0,5\n",
                             "\"Sampling Rate\",\"2000 S/s\"\n"}) {
        INFO(line);
        check_dress(line + column);
        CHECK(has_finding(read_recording_from_memory(line + column, "x").findings, "rate_from_preamble"));
    }
    options.rate_hz = -1.0;
    CHECK_THROWS_AS(read_recording_from_memory(column, "x", options), UsageError);
}

TEST_CASE("thousands are told from decimals where that is possible, and said where it is not") {
    std::string german = "Zeit [ms];Weg [µm]\n", english = "Time [ms];x [µm]\n", open = "Zeit [s];Weg [mm]\n";
    for (int i = 0; i < 4000; ++i) {
        const double t = i / bench::rate_hz, x = 1000.0 * bench::position(t);
        const auto grouped = [](double value, int digits, const char* group, char mark) {
            std::string text = bench::number(std::abs(value), digits, mark);
            for (std::size_t at = text.find(mark); at > 3 && at != std::string::npos;)
                text.insert(at -= 3, group);
            return (value < 0.0 ? "-" : "") + text;
        };
        german += grouped(1000.0 * t, 1, ".", ',') + ";" + grouped(x, 1, ".", ',') + "\n";
        english += grouped(1000.0 * t, 1, ",", '.') + ";" + grouped(x, 1, ",", '.') + "\n";
        open += fmt::format("{};{}\n", bench::number(1.0 + t, 3, ','),
                            bench::number(4.0 + 0.1 * x / 1000.0, 3, ','));
    }
    for (const std::string* text : {&german, &english}) {
        const Recording recording = read_recording_from_memory(*text, "grouped.csv");
        CHECK(bench::worst_error_mm(recording, 4000) < print_error);  // 0.1 µm printed
        CHECK(recording.clock.sample_rate_hz == Approx(2000.0).epsilon(1e-9));
    }
    const Recording assumed = read_recording_from_memory(open, "open.csv");
    CHECK(has_finding(assumed.findings, "decimal_comma_assumed"));
    CHECK(assumed.samples.front() == Approx(4.53e-3).epsilon(1e-12));
}

// Found by hand: a release from rest in micrometres, and times in milliseconds, pass 1000 far down.
TEST_CASE("marks before the thousands that first stand far down are taken out") {
    const auto grouped = [](double value, const char* group, char mark) {
        std::string text = bench::number(std::abs(value), 2, mark);
        for (std::size_t at = text.find(mark); at > 3 && at != std::string::npos;)
            text.insert(at -= 3, group);
        return (value < 0.0 ? "-" : "") + text;
    };
    std::string german = "Zeit (ms);Weg (µm)\n", english = "Time (ms),Disp (µm)\n", swiss = german;
    for (int i = 0; i < 3000; ++i) {
        const double t = 5.0 * i, x = i < 600 ? 0.1 * (i % 7) : 1000.0 * bench::position(i / 2000.0);
        german += grouped(t, ".", ',') + ";" + grouped(x, ".", ',') + "\n";
        english += "\"" + grouped(t, ",", '.') + "\",\"" + grouped(x, ",", '.') + "\"\n";
        swiss += grouped(t, "'", '.') + ";" + grouped(x, "'", '.') + "\n";
    }
    for (const std::string* text : {&german, &english, &swiss}) {
        const Recording recording = read_recording_from_memory(*text, "late.csv");
        INFO(text->substr(0, 20));
        REQUIRE(recording.samples.size() == 3000);
        CHECK(recording.clock.sample_rate_hz == Approx(200.0).epsilon(1e-9));
        for (const std::size_t i : {0U, 700U, 1500U, 2999U}) {
            const double truth = i < 600 ? 0.1e-6 * static_cast<double>(i % 7)
                                         : 1e-3 * bench::position(static_cast<double>(i) / 2000.0);
            CHECK(std::abs(recording.samples[i] - truth) < 0.0051e-6);  // 0.01 µm printed
        }
        CHECK(recording.findings.empty());
    }
}

TEST_CASE("a mark that is no clear thousands mark is refused with its line") {
    std::string whole = "ms;x\n", mixed = "t (ms);x (mm)\n";
    for (int i = 0; i < 600; ++i) {
        const bool late = i >= 300;
        whole += fmt::format("{};{}\n", i, late ? "1,234" : std::to_string(i % 9));
        mixed += fmt::format("{}.5;{}\n", i, !late ? "0.25" : i % 2 == 0 ? "1,234" : "12,5");
    }
    for (const std::string* text : {&whole, &mixed}) {
        try {
            (void)read_recording_from_memory(*text, "unclear.csv");
            FAIL("it was accepted");
        } catch (const InputError& error) {
            CHECK(error.problem().place == "line 302");
            CHECK(error.problem().found.find("1,234") != std::string::npos);
            CHECK(error.problem().remedy.find("thousands") != std::string::npos);
        }
    }
}

TEST_CASE("numbers that say what they are raise no doubt") {
    std::string decimals = "Uhrzeit;Weg [mm]\n", whole = "t[us],a[mg]\n";
    for (int i = 0; i < 600; ++i) {
        // No group of thousands begins with a zero.
        decimals += fmt::format("23:59:57,{:03d};{}0,{:03d}\n", i, i % 3 == 0 ? "-" : "", 13 + i % 80);
        whole += fmt::format("{},{}\n", 1250 * i, (i * 7) % 11 - 5);
    }
    for (const std::string* text : {&decimals, &whole}) {
        const Recording recording = read_recording_from_memory(*text, "clear.csv");
        CHECK(recording.samples.size() == 600);
        CHECK_FALSE(has_finding(recording.findings, "decimal_comma_assumed"));
    }
}

TEST_CASE("commas with two meanings are refused") {
    try {
        (void)read_recording_from_memory(table({"Zeit [s],Weg [mm]\n", ",", ','}), "commas.csv");
        FAIL("it was accepted");
    } catch (const InputError& error) {
        CHECK(error.problem().place == "line 2");
        CHECK(error.problem().remedy.find("semicolons") != std::string::npos);
    }
}

TEST_CASE("numbers with exponents keep their digits, not their decimals") {
    std::string text = "Time(s),Disp(mm)\n";
    for (int i = 0; i < 4000; ++i)
        text += fmt::format("{:.2e},{:.8e}\n", i / bench::rate_hz, bench::position(i / bench::rate_hz));
    check_dress(text);
}

TEST_CASE("stamps far coarser than the sampling are told") {
    std::string text = "Time,x (mm)\n";
    for (int i = 0; i < 8000; ++i)
        text += fmt::format("2031-04-02 10:00:{:02d},{:.4f}\n", (i + 700) / 2000,
                            bench::position(i / bench::rate_hz));
    const Recording recording = read_recording_from_memory(text, "coarse.csv");
    CHECK(recording.size() == 8000);
    CHECK(has_finding(recording.findings, "coarse_time_stamps"));
    // 6,000 samples between the first and the last change of the stamp, each certain to a sample.
    CHECK(recording.clock.sample_rate_hz == Approx(2000.0).epsilon(2.0 / 6000.0));
}

TEST_CASE("of axes in one unit the one that moves is taken") {
    std::string text = "Time [s];Acc X [g];Acc Y [g];Acc Z [g];Temp [°C]\n";
    for (int i = 0; i < 4000; ++i) {
        const double x = bench::position(i / bench::rate_hz);
        text += fmt::format("{:.4f};{:.6f};{:.4f};{:.6f};21.3\n", i / bench::rate_hz, 0.01 * x, x,
                            1.0 + 0.001 * x);
    }
    CHECK(read_recording_from_memory(text, "axes.csv").origin.channel == "Acc Y");
}

TEST_CASE("the channel is chosen and the choice is told") {
    std::string wide = "t [s]";
    for (int c = 0; c < 300; ++c) wide += fmt::format(";ch{} [V]", c);
    wide += "\n";
    bench::Random random;
    for (int i = 0; i < 1500; ++i) {
        wide += bench::number(i / bench::rate_hz, 4, '.');
        for (int c = 0; c < 300; ++c)
            wide += ";" + bench::number(c == 137 ? bench::position(i / bench::rate_hz) : 0.01 * random.next(),
                                        4, '.');
        wide += "\n";
    }
    const Recording clearest = read_recording_from_memory(wide, "wide.csv");
    CHECK(clearest.origin.channel == "ch137");
    CHECK(bench::message_of(clearest.findings, "channel_chosen").find("--channel") != std::string::npos);
    CHECK_FALSE(clearest.scaled);
    ReadOptions options;
    options.channel = "ch5";
    CHECK(read_recording_from_memory(wide, "wide.csv", options).origin.channel == "ch5");
    options.channel = "7";  // the seventh column
    CHECK(read_recording_from_memory(wide, "wide.csv", options).origin.channel == "ch5");
    options.channel = "302";
    CHECK_THROWS_AS(read_recording_from_memory(wide, "wide.csv", options), UsageError);

    std::string mixed = "t [s];Temp [°C];Weg [mm];U [V]\n";
    for (int i = 0; i < 4000; ++i)
        mixed += fmt::format("{:.4f};21.{};{:.4f};{:.3f}\n", i / bench::rate_hz, i % 10,
                             bench::position(i / bench::rate_hz), 0.001 * (i % 7));
    check_dress(mixed);
    options.channel = "weg";
    check_dress(mixed, options);
}
