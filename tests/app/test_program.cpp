#include <fmt/format.h>

#include <catch2/catch.hpp>
#include <cmath>
#include <nlohmann/json.hpp>
#include <numbers>

#include "app/run_program.hpp"
#include "support/draws.hpp"

using Catch::Detail::Approx;
using ringwright::test::Bench;
using ringwright::test::Draws;
using ringwright::test::Outcome;
using Json = nlohmann::ordered_json;

namespace {

/// Releases of a plucked article after a quiet stretch: x = 5 mm e^(−ζωt)(cos ω_d t + ζ/√(1−ζ²) sin ω_d t),
/// noise 10 µm.
struct Pluck {
    double frequency_hz = 5.0;
    double damping_ratio = 0.03;
    int releases = 1;
    std::uint64_t seed = 20317;
};

double released(const Pluck& pluck, double t) {
    const double omega = 2.0 * std::numbers::pi * pluck.frequency_hz, zeta = pluck.damping_ratio;
    const double root = std::sqrt(1.0 - zeta * zeta);
    return 5.0 * std::exp(-zeta * omega * t) *
           (std::cos(omega * root * t) + zeta / root * std::sin(omega * root * t));
}

std::string csv_of(const Pluck& pluck) {
    constexpr double rate = 500.0, hold = 1.0, decay = 6.0;
    Draws draws(pluck.seed);
    std::string text = "time (s),laser (mm)\n";
    const double period = hold + decay;
    const int count = static_cast<int>(period * pluck.releases * rate);
    for (int i = 0; i < count; ++i) {
        const double t = i / rate, within = std::fmod(t, period);
        // The hand pulls over 0.4 s and holds; the release comes at 1 s.
        const double pulled =
            within < 0.4 ? 5.0 * (0.5 - 0.5 * std::cos(std::numbers::pi * within / 0.4)) : 5.0;
        const double x = within < hold ? pulled : released(pluck, within - hold);
        text += fmt::format("{:.4f},{:.5f}\n", t, x + 0.01 * draws.normal());
    }
    return text;
}

std::vector<Json> lines_of(const std::string& text) {
    std::vector<Json> documents;
    std::istringstream lines(text);
    for (std::string line; std::getline(lines, line);) documents.push_back(Json::parse(line));
    return documents;
}

bool one_message(const Outcome& outcome) {
    return outcome.err.starts_with("ringwright: ") && outcome.err.find('\n') + 1 == outcome.err.size();
}

}  // namespace

TEST_CASE("identify answers in JSON as the contract says") {
    const Bench bench;
    const std::string file = bench.write("pluck.csv", csv_of({5.0, 0.03, 2}));
    const Outcome outcome = bench.run({"identify", file, "--mass", "2.000(2) kg", "--format", "json"});
    INFO(outcome.err);
    REQUIRE(outcome.status == 0);
    CHECK(outcome.err.empty());
    const Json json = Json::parse(outcome.out);
    CHECK(json["schema"] == "ringwright.identification.v1");
    const Json& result = json["result"];
    CHECK(result["method"] == "curve_fit");
    CHECK(result["event_count"] == 2);
    const Json& quantities = result["quantities"];
    // Reach for a clean record: 1 % of frequency, 3 % of damping; stiffness 2 kg (2π 5 Hz)² = 1973.92 N/m
    // inside its interval.
    CHECK(quantities["natural_frequency"]["value"].get<double>() == Approx(5.0).epsilon(0.01));
    CHECK(quantities["damping_ratio"]["value"].get<double>() == Approx(0.03).epsilon(0.03));
    CHECK(quantities["stiffness"]["interval"][0].get<double>() < 1973.92);
    CHECK(quantities["stiffness"]["interval"][1].get<double>() > 1973.92);
    CHECK(quantities["stiffness"]["unit"] == "N/m");
    CHECK_FALSE(result["budget"].empty());
    for (const Json& event : json["recordings"][0]["events"])
        for (const char* method : {"logarithmic_decrement", "half_power_bandwidth", "curve_fit"}) {
            const Json& answer = event["methods"][method];
            INFO(method << " " << answer.dump());
            REQUIRE(answer["status"] == "ok");
            const Json& frequency = answer["quantities"]["natural_frequency"];
            // Four standard uncertainties, as is held against recordings of known truth.
            CHECK(std::abs(frequency["value"].get<double>() - 5.0) <
                  4.0 * frequency["standard_uncertainty"].get<double>());
        }
}

TEST_CASE("identify answers in text and CSV, to a file and from standard input") {
    const Bench bench;
    const std::string file = bench.write("pluck.csv", csv_of({}));
    const Outcome text = bench.run({"identify", file, "--mass", "2.0 kg"});
    CHECK(text.status == 0);
    for (const char* part : {"natural frequency", "logarithmic decrement", "curve fit", "stiffness",
                             "95 % confidence", "Findings", "Caution:"})
        CHECK(text.out.find(part) != std::string::npos);
    const Outcome csv = bench.run({"identify", "-", "--format", "csv", "-o", bench.path("answer.csv")}, file);
    CHECK(csv.status == 0);
    CHECK(csv.out.empty());
    CHECK(bench.read("answer.csv").starts_with("scope,file,release,"));
}

TEST_CASE("several files are repeats, unless they are kept separate") {
    const Bench bench;
    const std::string first = bench.write("a.csv", csv_of({5.0, 0.03, 1, 1}));
    const std::string second = bench.write("b.csv", csv_of({5.0, 0.03, 1, 2}));
    const Outcome pooled = bench.run({"identify", first, second, "--format", "json"});
    REQUIRE(pooled.status == 0);
    CHECK(Json::parse(pooled.out)["result"]["event_count"] == 2);

    const Outcome separate =
        bench.run({"identify", "--separate", first, bench.path("absent.csv"), second, "--format", "json"});
    CHECK(separate.status == 3);
    CHECK(one_message(separate));
    const std::vector<Json> documents = lines_of(separate.out);
    REQUIRE(documents.size() == 3);
    CHECK(documents[0]["recordings"][0]["file"] == first);
    CHECK(documents[1]["recordings"][0].contains("error"));
    CHECK(documents[2]["recordings"][0]["file"] == second);
    const Outcome alone =
        bench.run({"identify", "--separate", first, second, "--format", "json", "--jobs", "1"});
    const Outcome together =
        bench.run({"identify", "--separate", first, second, "--format", "json", "--jobs", "4"});
    CHECK(alone.status == 0);
    CHECK(alone.out == together.out);
}

TEST_CASE("an added mass belongs to the FILE before it") {
    const Bench bench;
    // 2 kg on 1973.92 N/m: 5 Hz; with 1 kg more 5 √(2/3) Hz.
    const std::string bare = bench.write("bare.csv", csv_of({5.0, 0.03, 1, 3}));
    const std::string loaded = bench.write("loaded.csv", csv_of({5.0 * std::sqrt(2.0 / 3.0), 0.03, 1, 4}));
    const Outcome outcome =
        bench.run({"identify", bare, "--format", "json", loaded, "--added-mass", "1.0000(1) kg"});
    INFO(outcome.err);
    REQUIRE(outcome.status == 0);
    const Json quantities = Json::parse(outcome.out)["result"]["quantities"];
    for (const auto& [name, truth] : {std::pair{"mass", 2.0}, {"stiffness", 1973.92}}) {
        CHECK(quantities[name]["interval"][0].get<double>() < truth);
        CHECK(quantities[name]["interval"][1].get<double>() > truth);
    }
    CHECK(bench.run({"identify", "--added-mass", "1 kg", bare}).status == 2);
    CHECK(bench.run({"identify", bare, "--added-mass", "1 kg", "--added-mass", "2 kg"}).status == 2);
}

TEST_CASE("wrong usage ends with 2 and one message") {
    const Bench bench;
    const std::string file = bench.write("pluck.csv", csv_of({}));
    const std::vector<std::vector<std::string>> cases{
        {},
        {"identify"},
        {"unheard-of"},
        {"identify", file, "--unheard-of"},
        {"identify", file, "--mass", "heavy"},
        {"identify", file, "--mass", "-1 kg"},
        {"identify", file, "--mass", "1 kg", "--inertia", "1 kg m2"},
        {"identify", file, "--confidence", "2"},
        {"identify", file, "--format", "xml"},
        {"identify", file, "--quantity", "temperature"},
        {"identify", file, "--from", "2", "--to", "1"},
        {"identify", file, "--rate", "0"},
        {"identify", file, "--rate", "nan"},
        {"identify", file, "--modes", "1.5"},
        {"identify", file, "--time-base", "200 %"},
        {"identify", file, "-o", file},
        {"identify", file, "-o", bench.path("answer.docx")},
        {"inspect", file, "-o", bench.path("answer.pdf")},
        {"ledger", "unheard-of"},
        {"identify", "-", "-"},
    };
    for (const auto& arguments : cases) {
        const Outcome outcome = bench.run(arguments);
        INFO(fmt::format("{}", fmt::join(arguments, " ")) << "\n" << outcome.err);
        CHECK(outcome.status == 2);
        CHECK(outcome.out.empty());
        CHECK(one_message(outcome));
    }
    CHECK(bench.read("pluck.csv") == csv_of({}));
    const auto message = [&](const std::vector<std::string>& arguments) { return bench.run(arguments).err; };
    const auto names = [](const std::string& text, const char* part) {
        return text.find(part) != std::string::npos;
    };
    CHECK(names(message({"identify", file, "-o", bench.path("answer.docx")}), ".pdf"));
    CHECK(names(message({"identfy", file}), "\"identfy\""));
    CHECK(names(message({"ledger", "--ledger", "a.ledger", "shw"}), "\"shw\""));
    CHECK(names(message({"identify", file, "--from", "50"}), "runs from 0 s to 6.998 s"));
    CHECK(names(bench.run({"ledger", "--help"}).out, "ringwright ledger add --help"));
    CHECK_FALSE(names(bench.run({"ledger", "list", "--help"}).out, "ringwright identify"));
    for (const char* name : {"answer.txt", "answer.csv", "answer.json", "answer"})
        CHECK(bench.run({"identify", file, "-o", bench.path(name)}).status == 0);
}

TEST_CASE("what was said of the article and does not go with the recording is cautioned") {
    const Bench bench;
    const std::string file = bench.write("pluck.csv", csv_of({}));
    const auto codes = [&](const std::vector<std::string>& arguments) {
        std::string found;
        const Json answer = Json::parse(bench.run(arguments).out);
        for (const Json& finding : answer["result"]["findings"])
            found += finding["code"].get<std::string>() + " ";
        return found;
    };
    const std::vector<std::string> plain{"identify", file, "--format", "json"};
    auto with = [&](std::vector<std::string> more) {
        more.insert(more.begin(), plain.begin(), plain.end());
        return codes(more);
    };
    CHECK(with({"--spring-mass", "0.1 kg"}).find("spring_mass_alone") != std::string::npos);
    CHECK(with({"--spring-mass", "0.1 kg", "--mass", "1 kg"}).find("spring_mass_alone") == std::string::npos);
    const std::vector<std::string> angle{"--quantity", "angle", "--unit", "deg"};
    auto mass = angle, inertia = angle;
    mass.insert(mass.end(), {"--mass", "1 kg"});
    inertia.insert(inertia.end(), {"--inertia", "0.01 kg m2"});
    CHECK(with(mass).find("mass_with_angle") != std::string::npos);
    CHECK(with(inertia).find("mass_with_angle") == std::string::npos);
}

TEST_CASE("inputs that cannot be used end with 3, recordings without an answer with 4") {
    const Bench bench;
    std::string constant = "time (s),laser (mm)\n";
    for (int i = 0; i < 2000; ++i) constant += fmt::format("{:.3f},1.0\n", i / 500.0);
    const std::vector<std::pair<std::string, std::string>> unusable{
        {"empty.csv", ""},
        {"cut.wav", "RIFF\x24\x10"},
        {"binary.csv", std::string("\x01\x02\x00\xff\xfe\x00", 6)}};
    for (const auto& [name, bytes] : unusable) {
        const std::string file = bench.write(name, bytes);
        const Outcome outcome = bench.run({"identify", file});
        INFO(name << ": " << outcome.err);
        CHECK(outcome.status == 3);
        CHECK(one_message(outcome));
        CHECK(outcome.err.find(file) != std::string::npos);
    }
    CHECK(bench.run({"identify", bench.path("absent.csv")}).status == 3);
    CHECK(bench.run({"identify", bench.path("")}).status == 3);
    const std::string still = bench.write("constant.csv", constant);
    const Outcome outcome = bench.run({"identify", still, "--format", "json"});
    INFO(outcome.err);
    CHECK(outcome.status == 4);
    CHECK(one_message(outcome));
    CHECK_FALSE(Json::parse(outcome.out)["result"].contains("method"));
    // The reason is said once where answer and messages go to one place.
    const std::string seen = bench.path("seen");
    (void)bench.run({"identify", still}, "/dev/null", ">'" + seen + "' 2>&1");
    const std::string text = bench.read("seen");
    const std::size_t first = text.find("Every sample has the same value. Check the sensor");
    REQUIRE(first != std::string::npos);
    CHECK(text.find("Every sample has the same value. Check the sensor", first + 1) == std::string::npos);
}

TEST_CASE("an output that cannot be written ends with 6; a closed pipe ends quietly") {
    const Bench bench;
    const std::string file = bench.write("pluck.csv", csv_of({}));
    const Outcome nowhere = bench.run({"identify", file, "-o", bench.path("absent/answer.txt")});
    CHECK(nowhere.status == 6);
    CHECK(one_message(nowhere));
    CHECK(bench.run({"identify", file}, "/dev/null", ">/dev/full").status == 6);
    CHECK(bench.run({"--help"}, "/dev/null", ">/dev/full").status == 6);
    CHECK(bench.run({"inspect", file, "-o", "/dev/full"}).status == 6);
    const Outcome closed = bench.run({"inspect", file}, "/dev/null", "| true");
    CHECK(closed.err.empty());
}

TEST_CASE("inspect shows the recording") {
    const Bench bench;
    const std::string file = bench.write("pluck.csv", csv_of({5.0, 0.03, 2}));
    const Outcome text = bench.run({"inspect", file});
    CHECK(text.status == 0);
    for (const char* part : {"laser", "500 Hz", "Events", "▕", "━"})
        CHECK(text.out.find(part) != std::string::npos);
    const Outcome json = bench.run({"inspect", "-", "--format", "json"}, file);
    REQUIRE(json.status == 0);
    const Json inspection = Json::parse(json.out);
    CHECK(inspection["schema"] == "ringwright.inspection.v1");
    CHECK(inspection["file"] == "-");
    CHECK(inspection["events"].size() == 2);
    CHECK(inspection["channels"].size() == 2);
    CHECK(bench.run({"inspect", file, "--format", "csv"}).out.starts_with("file,channel,"));
}

TEST_CASE("help and version") {
    const Bench bench;
    CHECK(bench.run({"--version"}).out.starts_with("ringwright "));
    for (const char* command : {"identify", "inspect"}) {
        const Outcome help = bench.run({command, "--help"});
        CHECK(help.status == 0);
        CHECK(help.out.find(fmt::format("Example: ringwright {}", command)) != std::string::npos);
        CHECK(help.out.find("--channel") != std::string::npos);
    }
}

TEST_CASE("a command waits for no library that it does not need") {
    // Set, this variable makes the loader of glibc list what it loads and end (ld.so(8)).
    const Bench bench;
    const std::string command =
        std::string("LD_TRACE_LOADED_OBJECTS=1 '") + RINGWRIGHT_PROGRAM + "' >'" + bench.path("listed") + "'";
    REQUIRE(std::system(command.c_str()) == 0);
    const std::string listed = bench.read("listed");
    REQUIRE(listed.find("libc.so") != std::string::npos);
    for (const char* library : {"libsndfile", "libFLAC", "libcairo", "libpango", "libplplot"}) {
        INFO(library);
        CHECK(listed.find(library) == std::string::npos);
    }
}

TEST_CASE("a word that names a command is a file behind another command") {
    const Bench bench;
    const Outcome outcome = bench.run({"identify", "verify"});
    CHECK(outcome.status == 3);
    CHECK(outcome.err.find("there is no such file") != std::string::npos);
}
