#include <fcntl.h>
#include <sys/stat.h>
#include <unistd.h>

#include <catch2/catch.hpp>
#include <cmath>
#include <filesystem>
#include <fstream>
#include <limits>
#include <nlohmann/json.hpp>
#include <sstream>

#include "ringwright/error.hpp"
#include "ringwright/result_csv.hpp"
#include "ringwright/result_json.hpp"
#include "ringwright/result_text.hpp"
#include "ringwright/safe_file.hpp"

using namespace ringwright;
namespace fs = std::filesystem;

namespace {

constexpr double infinite = std::numeric_limits<double>::infinity();

/// One recording with one release; the curve fit answers, its damping ratio without an upper end.
Identification example() {
    Identification identification;
    RecordingIdentification recording;
    recording.recording.origin = {"a,\"b\".csv", "00ff", 10, "laser"};
    recording.recording.unit = {"mm", Dimension::length, 1e-3};
    recording.recording.clock.sample_rate_hz = 2000.0;
    recording.sample_count = 12000;
    recording.duration_s = 6.0;
    recording.findings.push_back({"clipped_samples", Severity::caution, "3 samples are clipped"});
    EventIdentification event;
    event.start_s = 1.234;
    event.end_s = 4.9;
    event.curve_fit.status = MethodStatus::ok;
    event.curve_fit.model = "viscous";
    event.curve_fit.quantities = {{Quantity::natural_frequency, {5.0, 0.01, {4.98, 5.02}, infinite}},
                                  {Quantity::damping_ratio, {0.3, 0.1, {0.2, infinite}, 4.0}},
                                  {Quantity::decay_rate, {NAN, 0.1, {0.2, 0.4}, 4.0}}};
    event.half_power_bandwidth.reason = "Too heavily damped";
    event.logarithmic_decrement.reason = "Fewer than two cycles";
    event.agreement.reading = "Only one method answers";
    recording.events.push_back(event);
    identification.recordings.push_back(recording);
    identification.result.method = "curve_fit";
    identification.result.model = "viscous";
    identification.result.event_count = 1;
    identification.result.quantities = event.curve_fit.quantities;
    identification.result.quantities.erase(Quantity::decay_rate);
    identification.result.budget.push_back(
        {Quantity::natural_frequency, "noise in the record", 5.0, 0.01, "Hz", 1.0, 0.01, 1.0, infinite});
    return identification;
}

fs::path scratch_folder() {
    const fs::path folder = fs::temp_directory_path() / ("ringwright-report-" + std::to_string(::getpid()));
    fs::create_directories(folder);
    return folder;
}

std::string content_of(const fs::path& path) {
    std::ostringstream text;
    text << std::ifstream(path).rdbuf();
    return text.str();
}

}  // namespace

TEST_CASE("the JSON contract") {
    const std::string text = to_text(to_json(example()));
    CHECK(text.find("nan") == std::string::npos);
    CHECK(text.find("inf") == std::string::npos);
    CHECK(text.find("null") == std::string::npos);
    const auto json = nlohmann::ordered_json::parse(text);
    CHECK(json["schema"] == "ringwright.identification.v1");
    CHECK(json["software"]["name"] == "ringwright");
    const auto& recording = json["recordings"][0];
    for (const char* key : {"file", "sha256", "channel", "quantity", "unit", "sample_rate_hz", "sample_count",
                            "duration_s", "findings", "events"})
        CHECK(recording.contains(key));
    CHECK(recording["findings"][0]["severity"] == "caution");
    const auto& event = recording["events"][0];
    for (const char* key : {"start_s", "end_s", "test", "methods", "agreement", "findings"})
        CHECK(event.contains(key));
    CHECK(event["methods"]["half_power_bandwidth"]["status"] == "not_applicable");
    CHECK(event["methods"]["half_power_bandwidth"]["reason"] == "Too heavily damped");
    CHECK(event["methods"]["curve_fit"]["model"] == "viscous");
    const auto& frequency = json["result"]["quantities"]["natural_frequency"];
    CHECK(frequency["value"] == 5.0);
    CHECK(frequency["unit"] == "Hz");
    CHECK(frequency["interval"][1] == 5.02);
    CHECK_FALSE(frequency.contains("degrees_of_freedom"));
    CHECK(json["result"]["budget"][0]["source"] == "noise in the record");
}

TEST_CASE("what does not exist has no key") {
    const auto json = to_json(example());
    const auto& quantities = json["recordings"][0]["events"][0]["methods"]["curve_fit"]["quantities"];
    CHECK_FALSE(quantities.contains("decay_rate"));
    CHECK_FALSE(quantities["damping_ratio"].contains("interval"));
    Identification unanswered = example();
    unanswered.result = {};
    CHECK_FALSE(to_json(unanswered)["result"].contains("method"));
}

TEST_CASE("a file name that is no UTF-8 still gives valid JSON") {
    Identification identification = example();
    identification.recordings[0].recording.origin.file = "bad\xff.csv";
    CHECK(nlohmann::json::accept(to_text(to_json(identification), -1)));
}

TEST_CASE("quantities come back from JSON as they went") {
    const Quantities quantities = example().result.quantities;
    const Quantities back = quantities_from_json(to_json(quantities, false), "x.json");
    CHECK(back.at(Quantity::natural_frequency).interval.low == 4.98);
    CHECK(std::isinf(back.at(Quantity::natural_frequency).degrees_of_freedom));
    CHECK(std::isinf(back.at(Quantity::damping_ratio).interval.high));
    using Json = nlohmann::ordered_json;
    CHECK_THROWS_AS(quantities_from_json(Json::array(), "x.json"), InputError);
    CHECK_THROWS_AS(quantities_from_json({{"damping_ratio", {{"value", "big"}}}}, "x.json"), InputError);
    CHECK_THROWS_AS(quantities_from_json({{"damping_ratio", {{"value", 1.0}}}}, "x.json"), InputError);
    CHECK(quantities_from_json({{"unheard_of", 3}}, "x.json").empty());
}

TEST_CASE("reading a result document") {
    const fs::path file = scratch_folder() / "result.json";
    write_file_safely(file, to_text(to_json(example())));
    CHECK(read_result_json(file, "ringwright.identification.v1")["result"]["method"] == "curve_fit");
    CHECK_THROWS_AS(read_result_json(file, "ringwright.comparison.v1"), InputError);
    write_file_safely(file, "{ not json");
    CHECK_THROWS_AS(read_result_json(file, ""), InputError);
    CHECK_THROWS_AS(read_result_json(file.string() + ".absent", ""), InputError);
}

TEST_CASE("CSV quotes what it must, one row a release, method and quantity") {
    const std::string csv = to_csv(example());
    CHECK(csv.find("release,\"a,\"\"b\"\".csv\",1,1.234,4.9,curve_fit,viscous,natural_frequency,5,Hz,0.01,4."
                   "98,5.02,,"
                   "0.95,ok,\n") != std::string::npos);
    CHECK(csv.find("not_applicable,Too heavily damped\n") != std::string::npos);
    CHECK(csv.find("\nresult,") != std::string::npos);
    CHECK(csv.find("inf") == std::string::npos);
    CHECK(csv.find("nan") == std::string::npos);
}

TEST_CASE("text for people") {
    const std::string text = to_text(example());
    CHECK(text.find("natural frequency  = (5.000 ± 0.020) Hz, 95 % confidence") != std::string::npos);
    CHECK(text.find("does not apply: Too heavily damped") != std::string::npos);
    CHECK(text.find("3 samples are clipped") != std::string::npos);
    CHECK(text.find("Caution:") > text.find("Findings"));
}

TEST_CASE("a file is replaced whole or not at all") {
    const fs::path folder = scratch_folder(), file = folder / "answer.txt";
    write_file_safely(file, "first");
    fs::permissions(file, fs::perms::owner_read | fs::perms::owner_write);
    write_file_safely(file, "second");
    CHECK(content_of(file) == "second");
    CHECK(fs::status(file).permissions() == (fs::perms::owner_read | fs::perms::owner_write));

    SECTION("a link stays a link") {
        const fs::path link = folder / "link.txt";
        fs::remove(link);
        fs::create_symlink(file, link);
        write_file_safely(link, "through the link");
        CHECK(fs::is_symlink(link));
        CHECK(content_of(file) == "through the link");
    }
    SECTION("what cannot be written says so") {
        CHECK_THROWS_AS(write_file_safely(folder / "absent" / "x", "text"), OutputError);
        CHECK_THROWS_AS(write_file_safely(folder, "text"), OutputError);
        CHECK_THROWS_AS(write_file_safely("/dev/full", "text"), OutputError);
    }
    SECTION("nothing is left behind") {
        std::size_t drafts = 0;
        for (const auto& entry : fs::directory_iterator(folder))
            drafts += entry.path().filename().string().starts_with("answer.txt.");
        CHECK(drafts == 0);
    }
}
