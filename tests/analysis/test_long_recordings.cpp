// Recordings analysed a stretch at a time, beside the same recordings analysed whole: both by this program,
// so that the expected values are those of identify() on the samples in memory.
//
// Tolerances: the same samples of each event go through the same fit. What differs is how much of the quiet
// after a decay the search saw, from which it takes the level of the noise and with it the end of the decay:
// by up to three of its cycles (0.6 s) among the places tried here. Those last cycles stand no higher than
// the noise; what they add moves the answers by up to a twentieth of their standard uncertainty, for which a
// tenth is allowed.
#include <fmt/format.h>
#include <unistd.h>

#include <algorithm>
#include <catch2/catch.hpp>
#include <cmath>
#include <filesystem>
#include <fstream>
#include <memory>
#include <nlohmann/json.hpp>
#include <string>
#include <vector>

#include "ringwright/analysis.hpp"
#include "ringwright/error.hpp"
#include "ringwright/inspection.hpp"
#include "support/draws.hpp"

using namespace ringwright;

namespace {

constexpr double rate_hz = 500.0;
constexpr LongLimits limits{20'000, 40'000};  // 80 s; overlaps of 5,000 samples

/// A release at `at_s` of 5 Hz and 3 %, which is in the noise after 8 s, and after a hold of 1 s.
struct Release {
    double at_s = 0.0;
    double amplitude_mm = 5.0;
    double damping_ratio = 0.03;
};

double motion(const Release& release, double t) {
    const double since = t - release.at_s, omega = 2.0 * 3.141592653589793 * 5.0;
    if (since < -2.0) return 0.0;
    if (since < -1.0) return release.amplitude_mm * 0.5 * (1.0 + std::cos(3.141592653589793 * (since + 1.0)));
    if (since < 0.0) return release.amplitude_mm;
    const double z = release.damping_ratio, root = std::sqrt(1.0 - z * z);
    return release.amplitude_mm * std::exp(-z * omega * since) *
           (std::cos(omega * root * since) + z / root * std::sin(omega * root * since));
}

std::vector<double> samples_mm(const std::vector<Release>& releases, double seconds, std::uint64_t seed) {
    test::Draws draws(seed);
    std::vector<double> samples;
    for (std::size_t i = 0; i < static_cast<std::size_t>(seconds * rate_hz); ++i) {
        double x = 0.01 * draws.normal();
        for (const Release& release : releases) x += motion(release, static_cast<double>(i) / rate_hz);
        samples.push_back(x);
    }
    return samples;
}

class RecordingFile {
  public:
    explicit RecordingFile(const std::vector<double>& samples)
        : path_((std::filesystem::temp_directory_path() / (std::to_string(::getpid()) + "stretches.csv"))
                    .string()) {
        std::string text = "time (s),laser (mm)\n";
        for (std::size_t i = 0; i < samples.size(); ++i)
            text += fmt::format("{:.3f},{:.4f}\n", static_cast<double>(i) / rate_hz, samples[i]);
        std::ofstream(path_, std::ios::binary) << text;
    }
    ~RecordingFile() { std::filesystem::remove(path_); }
    RecordingFile(const RecordingFile&) = delete;
    RecordingFile& operator=(const RecordingFile&) = delete;
    [[nodiscard]] const std::string& path() const { return path_; }

  private:
    std::string path_;
};

Identification analysed(OpenedRecording opened, const AnalysisOptions& options) {
    std::vector<RecordingInput> inputs;
    inputs.push_back({std::move(opened.recording), std::nullopt, std::move(opened.stretches)});
    return identify(std::move(inputs), options);
}

AnalysisOptions quick() {
    AnalysisOptions options;
    options.identify.replicates = 20;  // of the simple methods, which are not compared here
    return options;
}

Identification in_stretches(const std::string& path, const AnalysisOptions& options = quick()) {
    OpenedRecording opened = open_recording(path, {}, limits);
    REQUIRE(opened.stretches);
    return analysed(std::move(opened), options);
}

Identification whole(const std::string& path, const AnalysisOptions& options = quick()) {
    return analysed({read_recording(path), nullptr}, options);
}

std::vector<std::string> codes(const Findings& findings) {
    std::vector<std::string> list;
    for (const Finding& finding : findings) list.push_back(finding.code);
    return list;
}

void check_alike(const Quantities& got, const Quantities& expected) {
    REQUIRE(got.size() == expected.size());
    for (const auto& [quantity, estimate] : expected) {
        CAPTURE(name_of(quantity));
        const double u = estimate.standard_uncertainty;
        CHECK(std::abs(got.at(quantity).value - estimate.value) <= 0.1 * u);
        CHECK(got.at(quantity).standard_uncertainty == Approx(u).epsilon(0.1));
    }
}

void check_event(const EventIdentification& got, const EventIdentification& expected) {
    CAPTURE(expected.start_s);
    CHECK(got.start_s == Approx(expected.start_s).margin(1e-9));
    CHECK(got.end_s == Approx(expected.end_s).margin(0.6));
    CHECK(got.event.begin == expected.event.begin);
    CHECK(got.curve_fit.model == expected.curve_fit.model);
    CHECK(codes(got.findings) == codes(expected.findings));
    check_alike(got.curve_fit.quantities, expected.curve_fit.quantities);
}

void check_same(const Identification& got, const Identification& expected) {
    const RecordingIdentification& stretched = got.recordings.front();
    const RecordingIdentification& held = expected.recordings.front();
    CHECK(stretched.sample_count == held.sample_count);
    CHECK(stretched.duration_s == Approx(held.duration_s).epsilon(1e-12));
    CHECK(codes(stretched.findings) == codes(held.findings));
    REQUIRE(stretched.events.size() == held.events.size());
    for (std::size_t i = 0; i < held.events.size(); ++i) check_event(stretched.events[i], held.events[i]);
    check_alike(got.result.quantities, expected.result.quantities);
}

}  // namespace

TEST_CASE("a recording gives the same events and numbers in stretches as whole") {
    // Stretches end at 80 s and then about every 60 s: releases inside, across the first end (78 s), in the
    // overlap (72 s would be), shortly after a stretch begins, and twice within ten seconds.
    const std::vector<Release> releases = {{20.0}, {78.0, 4.0}, {130.0}, {139.5, 5.5}, {205.0, 4.5}, {390.0}};
    const RecordingFile file(samples_mm(releases, 420.0, 4101));
    const Identification expected = whole(file.path());
    REQUIRE(expected.recordings.front().events.size() == releases.size());
    check_same(in_stretches(file.path()), expected);
}

TEST_CASE("a release at every place about a stretch's end is found once") {
    for (double at = 64.0; at < 84.0; at += 1.7) {
        CAPTURE(at);
        const RecordingFile file(samples_mm({{at}}, 200.0, 4102));
        const Identification expected = whole(file.path());
        REQUIRE(expected.recordings.front().events.size() == 1);
        check_same(in_stretches(file.path()), expected);
    }
}

TEST_CASE("hours of quiet show no event") {
    const RecordingFile file(samples_mm({}, 2 * 3600.0, 4103));
    const Identification identification = in_stretches(file.path());
    CHECK(identification.recordings.front().events.empty());
    CHECK(!identification.recordings.front().reason.empty());
    CHECK(!identification.answered());
}

TEST_CASE("one release in hours of quiet") {
    const RecordingFile file(samples_mm({{3333.3}}, 2 * 3600.0, 4104));
    check_same(in_stretches(file.path()), whole(file.path()));
}

TEST_CASE("a decay longer than a stretch is told by its first part, and a finding says so") {
    const Release release{30.0, 5.0, 0.0005};  // in the noise after 400 s
    const RecordingFile file(samples_mm({release, {560.0}}, 700.0, 4105));
    const Identification identification = in_stretches(file.path());
    const auto& events = identification.recordings.front().events;
    REQUIRE(events.size() == 2);
    const auto& findings = events.front().event.findings;
    CHECK(std::ranges::any_of(findings, [](const Finding& f) { return f.code == "longer_than_a_stretch"; }));
    const Estimate& damping = events.front().curve_fit.quantities.at(Quantity::damping_ratio);
    // One event at four standard uncertainties: a false alarm in ten thousand.
    CHECK(std::abs(damping.value - release.damping_ratio) < 4.0 * damping.standard_uncertainty);
    CHECK(events[1].start_s == Approx(560.0).margin(0.1));
}

TEST_CASE("a window by hand in a long recording") {
    const RecordingFile file(samples_mm({{20.0}, {78.0, 4.0}}, 200.0, 4106));
    AnalysisOptions options = quick();
    options.event.from_s = 78.05;
    options.event.to_s = 84.0;
    check_same(in_stretches(file.path(), options), whole(file.path(), options));
    options.event.from_s = 10.0;
    options.event.to_s = 190.0;
    CHECK_THROWS_AS(in_stretches(file.path(), options), UsageError);
    options.event.from_s = 300.0;
    options.event.to_s.reset();
    CHECK_THROWS_AS(in_stretches(file.path(), options), UsageError);
}

TEST_CASE("an inspection of a long recording says what it does of the recording held") {
    const RecordingFile file(samples_mm({{20.0}, {78.0, 4.0}}, 200.0, 4107));
    Inspection held, stretched;
    held.file = stretched.file = summarise_file(file.path());
    held.recording = read_recording(file.path());
    held.events = find_events(*held.recording);
    OpenedRecording opened = open_recording(file.path(), {}, limits);
    stretched.recording = opened.recording;
    stretched.stretches = opened.stretches;
    stretched.events = find_events(*opened.stretches);
    CHECK(to_json(stretched).dump() == to_json(held).dump());
    // Below the drawing, whose columns are blocks of samples here, nothing differs.
    const auto without_drawing = [](const Inspection& inspection) {
        const std::string text = to_text(inspection);
        return text.substr(0, text.find("\n\n", text.find("Recording\n"))) +
               text.substr(text.find("Events\n"));
    };
    CHECK(without_drawing(stretched) == without_drawing(held));
    CHECK(to_text(stretched).find("━") != std::string::npos);
}
