// Makes the recordings and test sheets of the service shop's week: demo_service FOLDER.
// The closing dampers of six fume-hood sashes come back from service; each is tested twice by two people. One
// of them was recorded before service as well. The story is told in data-demo/README.md.

#include <fmt/format.h>

#include <array>
#include <exception>
#include <filesystem>
#include <fstream>
#include <string>

#include "motion.hpp"
#include "sensor.hpp"

using namespace demo;

namespace {

constexpr double mm = 1e-3;  // m
constexpr std::uint64_t seed = 20310507;
constexpr double mass = 3.2;          // kg, as weighed
constexpr double stiffness = 3080.0;  // N/m

/// Damping coefficients, N·s/m: 0411 … 0416 after service, about a damping ratio of 0.28.
constexpr std::array<double, 6> serviced{54.6, 56.9, 55.4, 57.8, 53.9, 56.1};
constexpr double worn = 37.7;  // 0416 before service: a damping ratio of 0.19

/// Each person draws a little differently: the late shift lets the oil settle for less long, 1 % less
/// damping.
constexpr double late_shift = 0.99;

void write_release(const std::filesystem::path& path, double damping, int releases, Random& random) {
    const Oscillator damper{mass, damping, stiffness};
    std::vector<HandPull> pulls;
    for (int i = 0; i < releases; ++i)
        pulls.push_back({1.0 + 4.6 * i + 0.3 * random.uniform(), 0.7 + 0.3 * random.uniform(),
                         0.8 + 0.3 * random.uniform(), (11.0 + 2.0 * random.uniform()) * mm, 12e-6, 0.004});
    const double rate_hz = 250.0;
    auto samples = pulled_motion(damper, pulls, rate_hz, 1.0 + 4.6 * releases, random);
    disturb(samples, rate_hz, {5e-6, 8e-6, 12.0, 4e-6, 2e-6}, random);
    TextLayout layout;
    layout.preamble = "time (s),displacement (mm)\n";
    layout.value_unit = mm;
    layout.value_decimals = 3;
    write_text(path.string(), samples, rate_hz, layout);
}

void write_sheet(const std::filesystem::path& path, const std::string& serial, const std::string& shift,
                 const std::string& date) {
    std::ofstream file(path);
    file << fmt::format(
        "[article]\ntype = \"sash damper S2\"\nserial = \"{}\"\nmass = \"3.20(1) kg\"\n\n[test]\nkind = "
        "\"pluck\"\n"
        "operator = \"{} shift\"\ndate = {}\n\n[recording]\nquantity = \"displacement\"\nunit = \"mm\"\n"
        "sensor = \"laser L-07\"\nsensor_calibrated = 2031-01-15\nsensor_due = 2032-01-15\n\n[limits]\n"
        "decision_rule = \"guarded acceptance\"\ndamping_ratio = {{ min = 0.22, max = 0.34 }}\n"
        "stiffness = {{ nominal = \"3.1 N/mm\", tolerance = \"8 %\" }}\n",
        serial, shift, date);
}

void generate(const std::filesystem::path& folder) {
    std::filesystem::create_directories(folder);
    Random random(seed);
    write_release(folder / "0416-before.csv", worn, 3, random);
    write_sheet(folder / "0416-before.toml", "0416", "early", "2031-05-05");
    for (std::size_t article = 0; article < serviced.size(); ++article)
        for (const char* shift : {"early", "late"})
            for (int repeat = 1; repeat <= 2; ++repeat) {
                const std::string serial = fmt::format("{:04}", 411 + article);
                const std::string name = fmt::format("{}-{}-{}", serial, shift, repeat);
                const double damping = serviced[article] * (shift[0] == 'l' ? late_shift : 1.0) *
                                       (1.0 + 0.004 * random.normal());
                write_release(folder / (name + ".csv"), damping, 3, random);
                write_sheet(folder / (name + ".toml"), serial, shift,
                            fmt::format("2031-05-{:02}", 6 + article));
            }
}

}  // namespace

int main(int argument_count, char** arguments) try {
    if (argument_count != 2) {
        fmt::print(stderr, "usage: demo_service FOLDER\n");
        return 2;
    }
    generate(arguments[1]);
    return 0;
} catch (const std::exception& error) {
    fmt::print(stderr, "demo_service: {}\n", error.what());
    return 1;
}
