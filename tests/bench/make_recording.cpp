// Writes a recording of known truth for the benchmarks:
//     make_recording csv|wav SAMPLES RELEASES SECONDS FILE
// An article of 5 Hz and damping ratio 0.03 is held aside by 5 mm at 1/20 of each stretch, let go, and rings
// out in white noise of 10 µm; the stretches share the recording evenly. WAV: 16 bits, full scale 10 mm.

#include <fmt/format.h>

#include <cmath>
#include <cstdio>
#include <cstdlib>
#include <numbers>
#include <string>

#include "support/draws.hpp"

namespace {

struct Plan {
    long samples = 0, releases = 1;
    double seconds = 1.0;
};

double displacement_mm(const Plan& plan, double time) {
    constexpr double zeta = 0.03, omega = 2.0 * std::numbers::pi * 5.0;
    const double stretch = plan.seconds / static_cast<double>(plan.releases), hold = stretch / 20.0;
    const double within = std::fmod(time, stretch);
    if (within < hold / 2.0) return 5.0 * (0.5 - 0.5 * std::cos(std::numbers::pi * within / (hold / 2.0)));
    if (within < hold) return 5.0;
    const double root = std::sqrt(1.0 - zeta * zeta), t = within - hold;
    return 5.0 * std::exp(-zeta * omega * t) *
           (std::cos(omega * root * t) + zeta / root * std::sin(omega * root * t));
}

void put(std::string& bytes, long value, int size) {
    for (int i = 0; i < size; ++i) bytes += static_cast<char>((value >> (8 * i)) & 0xFF);
}

std::string wav_header(const Plan& plan) {
    const long data = 2 * plan.samples, rate = std::lround(static_cast<double>(plan.samples) / plan.seconds);
    std::string bytes = "RIFF";
    put(bytes, 36 + data, 4);
    bytes += "WAVEfmt ";
    put(bytes, 16, 4);
    put(bytes, 1 | 1 << 16, 4);
    put(bytes, rate, 4);
    put(bytes, 2 * rate, 4);
    put(bytes, 2 | 16 << 16, 4);
    bytes += "data";
    put(bytes, data, 4);
    return bytes;
}

}  // namespace

int main(int count, char** arguments) {
    if (count != 6) return 2;
    const bool csv = std::string(arguments[1]) == "csv";
    const Plan plan{std::atol(arguments[2]), std::atol(arguments[3]), std::atof(arguments[4])};
    std::FILE* file = std::fopen(arguments[5], "wb");
    if (file == nullptr) return 6;
    ringwright::test::Draws draws(2031);
    std::string block = csv ? "time (s),laser (mm)\n" : wav_header(plan);
    const double rate = static_cast<double>(plan.samples) / plan.seconds;
    const int digits = static_cast<int>(std::ceil(std::log10(rate))) + 1;
    for (long i = 0; i < plan.samples; ++i) {
        const double time = static_cast<double>(i) / rate;
        const double x = displacement_mm(plan, time) + 0.01 * draws.normal();
        if (csv)
            fmt::format_to(std::back_inserter(block), "{:.{}f},{:.5f}\n", time, digits, x);
        else
            put(block, std::lround(x / 10.0 * 32767.0), 2);
        if (block.size() < (1U << 20U)) continue;
        std::fwrite(block.data(), 1, block.size(), file);
        block.clear();
    }
    std::fwrite(block.data(), 1, block.size(), file);
    return std::fclose(file) == 0 ? 0 : 6;
}
