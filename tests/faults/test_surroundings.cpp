// Nothing around the program changes an answer, and it changes nothing around it.

#include <sys/inotify.h>

#include <catch2/catch.hpp>

#include "faults/archive.hpp"

using namespace ringwright::test;
using Catch::Contains;

namespace {

/// A logger's file with dates and clock times, decimal commas: what a locale or time zone could touch.
std::string dated_csv() {
    std::string text = "Zeit;Weg [mm]\n";
    const std::vector<std::string> rows = lines_of(pluck_csv(0.05, 3));
    for (std::size_t i = 1; i < rows.size(); ++i) {
        std::string value = rows[i].substr(rows[i].find(',') + 1);
        std::ranges::replace(value, '.', ',');
        const std::size_t ms = 2 * (i - 1);
        text += fmt::format("2031-03-30T01:59:{:02}.{:03};{}\n", 57 + ms / 1000, ms % 1000, value);
    }
    return text;
}

std::string bytes_from_hex(const std::string& digits) {
    std::string bytes;
    for (std::size_t i = 0; i + 1 < digits.size(); i += 2)
        bytes += static_cast<char>(std::stoi(digits.substr(i, 2), nullptr, 16));
    return bytes;
}

}  // namespace

TEST_CASE("locale, time zone and working folder do not change an answer") {
    const Workplace place;
    const std::string file = place.write("dated.csv", dated_csv());
    const std::vector<std::vector<std::string>> commands{{"identify", file, "--mass", "3.20(1) kg"},
                                                         {"identify", file, "--format", "json"},
                                                         {"identify", file, "--format", "csv"},
                                                         {"inspect", file, "--format", "json"},
                                                         {"inspect", file}};
    for (const std::vector<std::string>& command : commands) {
        CHECK(run(command, {place.path("expected"), place.path("err")}).status == 0);
        for (const std::vector<std::string>& environment :
             {std::vector<std::string>{"LC_ALL=de_DE.UTF-8", "LANG=de_DE.UTF-8"},
              {"LC_ALL=tr_TR.UTF-8"},
              {"LC_NUMERIC=fr_FR.UTF-8", "LANGUAGE=fr"},
              {"LC_ALL=C"},
              {"LC_ALL=no_such_locale"},
              {"TZ=Pacific/Kiritimati"},
              {"TZ=Europe/Berlin"},  // The stamps run into the hour that summer time leaves out.
              {"TZ=nonsense"},
              {"COLUMNS=20", "TERM=dumb", "HOME=/nonexistent", "TMPDIR=/nonexistent"}}) {
            INFO(environment.front());
            CHECK(run(command, {place.path("out"), place.path("err"), {}, environment}).status == 0);
            CHECK(place.read("out") == place.read("expected"));
        }
        CHECK(run(command, {place.path("out"), place.path("err"), "/"}).status == 0);
        CHECK(place.read("out") == place.read("expected"));
    }
}

TEST_CASE("a file may have any name") {
    const Workplace place;
    for (const std::string name :
         {"caf\xe9.csv", "\xff\xfe\x80.csv", "two\nlines.csv", "\x1b[31mred.csv", "quote\"'`$(x).csv",
          "-dash.csv", " blank .csv", "\xed\xa0\x80surrogate.csv", "\xc0\xaf.csv", "τρία.csv", "*.csv",
          "=1+1.csv"}) {
        const std::string path = place.write("names/" + name, pluck_csv(0.05, 4));
        INFO(name);
        for (const std::string& asked : {path, place.path("names")}) {
            const Circumstances told{place.path("out"), place.path("err")};
            CHECK(run({"identify", "--separate", asked, "--format", "json", "--resume",
                       place.path("run.jsonl")},
                      told)
                      .status == 0);
            const Json recording = Json::parse(place.read("out"))["recordings"][0];
            const std::string shown = recording["file"];
            CHECK((recording.contains("file_hex") ? bytes_from_hex(recording["file_hex"]) : shown) == path);
            // Continued: the line is known again by its name.
            CHECK(run({"identify", "--separate", asked, "--resume", place.path("run.jsonl")}, told).status ==
                  0);
            CHECK(lines_of(place.read("out")).size() == 1);
            CHECK(run({"inspect", path, "--format", "json"}, told).status == 0);
            CHECK(Json::parse(place.read("out"))["file"] == shown);
            CHECK(run({"identify", path, "--format", "csv"}, told).status == 0);
            CHECK(Json(place.read("out")).dump().size() > 1000);  // throws for what is no UTF-8
            for (const char* command : {"identify", "inspect"}) {
                CHECK(run({command, path}, told).status == 0);
                CHECK(place.read("out").find('\x1b') == std::string::npos);
            }
            std::filesystem::remove(place.path("run.jsonl"));
        }
        std::filesystem::remove_all(place.path("names"));
    }
}

TEST_CASE("a recording is opened for reading only, and nothing is written but what was asked") {
    const Workplace place;
    const std::string file = place.write("recordings/pluck.csv", pluck_csv(0.05, 5));
    std::filesystem::create_directories(place.path("here"));
    const int watch = ::inotify_init1(IN_NONBLOCK);
    REQUIRE(watch >= 0);
    for (const char* folder : {"recordings", "here"})
        REQUIRE(::inotify_add_watch(
                    watch, place.path(folder).c_str(),
                    IN_MODIFY | IN_ATTRIB | IN_CLOSE_WRITE | IN_CREATE | IN_DELETE | IN_MOVE) >= 0);
    const Circumstances here{place.path("out"),
                             place.path("err"),
                             place.path("here"),
                             {"HOME=" + place.path("here"), "TMPDIR=" + place.path("here")}};
    CHECK(run({"identify", file}, here).status == 0);
    CHECK(run({"identify", "--separate", place.path("recordings")}, here).status == 0);
    CHECK(run({"inspect", file}, here).status == 0);
    CHECK(run({"identify", file, "-o", place.path("answer.json"), "--format", "json"}, here).status == 0);
    alignas(inotify_event) char events[4096];
    CHECK(::read(watch, events, sizeof events) < 0);
    ::close(watch);
    CHECK(place.read("recordings/pluck.csv") == pluck_csv(0.05, 5));
}
