// The four recordings of the demo, made by data-demo/generate.cpp, which shares no code with the library: all
// three methods answer, and the answers agree with the truth that the generator put in.
#include <fmt/format.h>

#include <catch2/catch.hpp>
#include <cmath>
#include <cstdlib>
#include <filesystem>
#include <fstream>
#include <nlohmann/json.hpp>
#include <string>

#include "ringwright/analysis.hpp"

using namespace ringwright;
namespace fs = std::filesystem;

namespace {

/// Generated once, into the build folder.
const fs::path& demo_folder() {
    static const fs::path folder = [] {
        const fs::path program = fs::path(RINGWRIGHT_PROGRAM).parent_path() / "demo_generate";
        const fs::path out = program.parent_path() / "test-demo";
        const std::string command = fmt::format("\"{}\" \"{}\"", program.string(), out.string());
        REQUIRE(std::system(command.c_str()) == 0);
        return out;
    }();
    return folder;
}

struct Truth {
    double natural_frequency = 0.0, damping_ratio = 0.0, stiffness = 0.0, damping_coefficient = 0.0;
};

Truth truth_of(const std::string& article) {
    std::ifstream file(demo_folder() / "truth.json");
    const nlohmann::json truth = nlohmann::json::parse(file).at(article);
    return {truth.at("natural_frequency"), truth.at("damping_ratio"), truth.at("stiffness"),
            truth.at("damping_coefficient")};
}

Identification identified(const std::string& file, const char* mass, const ReadOptions& read = {},
                          const EventOptions& event = {}) {
    AnalysisOptions options;
    options.event = event;
    options.article.mass = parse_measured_value(mass, "mass", Dimension::mass);
    const Recording recording = read_recording((demo_folder() / file).string(), read);
    return identify({RecordingInput{recording, std::nullopt}}, options);
}

bool holds(const Estimate& estimate, double truth) {
    return estimate.interval.low <= truth && truth <= estimate.interval.high;
}

/// Four standard uncertainties: with 60 comparisons and Student tails a false alarm once in some hundred
/// seeds; the seed of the recordings is written.
void check_method(const char* name, const MethodResult& method, const Truth& truth) {
    INFO(name << ": " << method.reason);
    REQUIRE(method.status == MethodStatus::ok);
    const Estimate& frequency = method.quantities.at(Quantity::natural_frequency);
    const Estimate& ratio = method.quantities.at(Quantity::damping_ratio);
    CHECK(std::abs(frequency.value - truth.natural_frequency) < 4.0 * frequency.standard_uncertainty);
    CHECK(std::abs(ratio.value - truth.damping_ratio) < 4.0 * ratio.standard_uncertainty);
}

void check_against(const Identification& identification, const Truth& truth, std::size_t events) {
    REQUIRE(identification.answered());
    REQUIRE(identification.recordings.front().events.size() == events);
    for (const auto& event : identification.recordings.front().events) {
        INFO("event at " << event.start_s << " s");
        check_method("logarithmic decrement", event.logarithmic_decrement, truth);
        check_method("half-power bandwidth", event.half_power_bandwidth, truth);
        check_method("curve fit", event.curve_fit, truth);
    }
    const Quantities& pooled = identification.result.quantities;
    CHECK(pooled.at(Quantity::natural_frequency).value == Approx(truth.natural_frequency).epsilon(0.01));
    CHECK(pooled.at(Quantity::damping_ratio).value == Approx(truth.damping_ratio).epsilon(0.03));
    CHECK(holds(pooled.at(Quantity::stiffness), truth.stiffness));
    CHECK(holds(pooled.at(Quantity::damping_coefficient), truth.damping_coefficient));
}

}  // namespace

TEST_CASE("demo: isolator foot, five releases") {
    check_against(identified("isolator-foot.csv", "6.40(2) kg"), truth_of("isolator-foot"), 5);
}

TEST_CASE("demo: camera bracket, one tap with a second mode") {
    ReadOptions read;
    read.sensitivity.emplace("100 mV/g");
    read.full_scale.emplace("1 V");
    check_against(identified("camera-bracket.wav", "0.385(1) kg", read), truth_of("camera-bracket"), 1);
}

TEST_CASE("demo: sash damper, heavily damped, German logger") {
    check_against(identified("sash-damper.csv", "3.20(1) kg"), truth_of("sash-damper"), 3);
}

TEST_CASE("demo: cushion, a drop with a bounce") {
    EventOptions event;
    event.kind = TestKind::drop;
    check_against(identified("case-cushion.tsv", "4.60(1) kg", {}, event), truth_of("case-cushion"), 1);
}
