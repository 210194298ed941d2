// Makes the four recordings of the Quillmoor demo and truth.json beside them: demo_generate FOLDER.
// The story and the figures are told in data-demo/README.md.

#include <fmt/format.h>

#include <cstdio>
#include <exception>
#include <filesystem>
#include <fstream>
#include <nlohmann/json.hpp>
#include <numbers>
#include <string>

#include "motion.hpp"
#include "sensor.hpp"

using namespace demo;

namespace {

constexpr double mm = 1e-3;    // m
constexpr double ms = 1e-3;    // s
constexpr double g = 9.80665;  // m/s²
constexpr std::uint64_t seed = 20310417;

nlohmann::json truth_of(const Oscillator& article) {
    return {{"natural_frequency", article.natural_frequency_hz()},
            {"damping_ratio", article.damping_ratio()},
            {"stiffness", article.stiffness},
            {"damping_coefficient", article.damping}};
}

/// Isolator foot under a benchtop centrifuge: a hand pulls it aside five times and lets go. Laser, 500 Hz,
/// CSV.
nlohmann::json isolator_foot(const std::string& path) {
    const Oscillator foot{6.41, 19.4, 7120.0};  // weighed: 6.40(2) kg
    Random random(seed + 1);
    std::vector<HandPull> pulls;
    for (double distance : {5.2 * mm, 4.6 * mm, 5.7 * mm, 4.9 * mm, 5.4 * mm})
        pulls.push_back({1.1 + 7.3 * static_cast<double>(pulls.size()) + 0.4 * random.uniform(),
                         0.5 + 0.3 * random.uniform(), 0.8 + 0.5 * random.uniform(), distance, 12e-6, 0.004});
    const double rate_hz = 500.0;
    auto samples = pulled_motion(foot, pulls, rate_hz, 38.5, random);
    disturb(samples, rate_hz, {3e-6, 5e-6, 20.0, 3e-6, 1e-6}, random);
    TextLayout layout;
    layout.preamble = "time (s),displacement (mm)\n";
    layout.value_unit = mm;
    layout.value_decimals = 3;
    write_text(path, samples, rate_hz, layout);
    return truth_of(foot);
}

/// Bracket that carries a microscope camera: one tap. Accelerometer 100 mV/g into a recorder with 1 V full
/// scale.
nlohmann::json camera_bracket(const std::string& path) {
    const Oscillator bracket{0.3855, 3.25, 58400.0};  // weighed: 0.385(1) kg
    const Oscillator plate{6.0, 340.0, 1.35e7};       // a stiffer part rings along briefly, near 239 Hz
    const Blow blow{0.62, 0.0021, 19.0};
    Random random(seed + 2);
    const int rate_hz = 48000;
    auto samples = struck_acceleration(bracket, blow, rate_hz, 4.0);
    const auto along = struck_acceleration(plate, blow, rate_hz, 4.0);
    for (std::size_t i = 0; i < samples.size(); ++i) samples[i] += along[i];
    disturb(samples, rate_hz, {0.02, 0.012, 400.0, 0.006, 0.0}, random);
    const double volt = 10.0 * g;  // 100 mV/g
    write_wav24(path, samples, rate_hz, 1.0 * volt);
    return truth_of(bracket);
}

/// Closing damper of a fume-hood sash after service, heavily damped: three releases. German logger, 250 Hz.
nlohmann::json sash_damper(const std::string& path) {
    const Oscillator damper{3.204, 59.5, 3080.0};  // weighed: 3.20(1) kg
    Random random(seed + 3);
    std::vector<HandPull> pulls;
    for (double distance : {11.5 * mm, 12.4 * mm, 11.9 * mm})
        pulls.push_back({1.3 + 5.1 * static_cast<double>(pulls.size()) + 0.3 * random.uniform(),
                         0.7 + 0.3 * random.uniform(), 1.0 + 0.4 * random.uniform(), distance, 14e-6, 0.004});
    const double rate_hz = 250.0;
    auto samples = pulled_motion(damper, pulls, rate_hz, 16.8, random);
    disturb(samples, rate_hz, {5e-6, 8e-6, 12.0, 4e-6, 2e-6}, random);
    TextLayout layout;
    layout.preamble =
        "\xEF\xBB\xBF"
        "Werkstatt Quillmoor;Pr\u00fcfstand 2\r\n"
        "Pr\u00fcfling;Schlie\u00dfd\u00e4mpfer S2 Nr. 0417\r\n"
        "Bemerkung;nach Wartung, drei Versuche\r\n"
        "Abtastrate;250 Hz\r\n"
        "\r\n"
        "Zeit [ms];Weg [mm]\r\n";
    layout.separator = ';';
    layout.decimal_comma = true;
    layout.line_end = "\r\n";
    layout.time_unit_s = ms;
    layout.value_unit = mm;
    layout.time_decimals = 1;
    layout.value_decimals = 3;
    write_text(path, samples, rate_hz, layout);
    return truth_of(damper);
}

/// A dummy of an instrument falls on to the cushion of its transport case, bounces, rings. Laser, 1 kHz,
/// tabs.
nlohmann::json case_cushion(const std::string& path) {
    const Oscillator cushion{4.607, 64.0, 11650.0};  // weighed: 4.60(1) kg
    Random random(seed + 4);
    const double rate_hz = 1000.0;
    auto samples = dropped_height(cushion, 12.0 * mm, 1.4, rate_hz, 5.5);
    disturb(samples, rate_hz, {3e-6, 4e-6, 30.0, 2e-6, 1e-6}, random);
    TextLayout layout;
    layout.preamble = "time (ms)\theight (mm)\n";
    layout.separator = '\t';
    layout.time_unit_s = ms;
    layout.value_unit = mm;
    layout.time_decimals = 0;
    layout.value_decimals = 3;
    write_text(path, samples, rate_hz, layout);
    nlohmann::json truth = truth_of(cushion);
    truth["static_deflection"] = cushion.mass * g / cushion.stiffness;
    return truth;
}

void generate(const std::filesystem::path& folder) {
    std::filesystem::create_directories(folder);
    const nlohmann::json truth = {
        {"isolator-foot", isolator_foot((folder / "isolator-foot.csv").string())},
        {"camera-bracket", camera_bracket((folder / "camera-bracket.wav").string())},
        {"sash-damper", sash_damper((folder / "sash-damper.csv").string())},
        {"case-cushion", case_cushion((folder / "case-cushion.tsv").string())}};
    std::ofstream file(folder / "truth.json");
    file << truth.dump(2) << '\n';
    if (!file.flush()) throw std::runtime_error("cannot write truth.json");
}

}  // namespace

int main(int argument_count, char** arguments) try {
    if (argument_count != 2) {
        fmt::print(stderr, "usage: demo_generate FOLDER\n");
        return 2;
    }
    generate(arguments[1]);
    return 0;
} catch (const std::exception& error) {
    fmt::print(stderr, "demo_generate: {}\n", error.what());
    return 1;
}
