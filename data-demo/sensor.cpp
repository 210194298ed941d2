#include "sensor.hpp"

#include <fmt/format.h>
#include <sndfile.h>

#include <algorithm>
#include <cmath>
#include <fstream>
#include <numbers>
#include <stdexcept>

namespace demo {

void disturb(std::vector<double>& samples, double rate_hz, const Disturbance& disturbance, Random& random) {
    const double omega = 2.0 * std::numbers::pi * 50.0 / rate_hz;
    const double keep = std::exp(-2.0 * std::numbers::pi * disturbance.coloured_corner_hz / rate_hz);
    const double feed = disturbance.coloured * std::sqrt(1.0 - keep * keep);
    double coloured = disturbance.coloured * random.normal();
    for (std::size_t i = 0; i < samples.size(); ++i) {
        const double turn = omega * static_cast<double>(i);
        samples[i] += disturbance.white * random.normal() + coloured;
        samples[i] += disturbance.hum * (std::sin(turn + 0.4) + 0.2 * std::sin(3.0 * turn + 1.9));
        coloured = keep * coloured + feed * random.normal();
        if (disturbance.step > 0.0) samples[i] = disturbance.step * std::round(samples[i] / disturbance.step);
    }
}

void write_text(const std::string& path, const std::vector<double>& samples, double rate_hz,
                const TextLayout& layout) {
    std::ofstream file(path, std::ios::binary);
    file << layout.preamble;
    for (std::size_t i = 0; i < samples.size(); ++i) {
        const double time = static_cast<double>(i) / rate_hz / layout.time_unit_s;
        std::string line = fmt::format("{:.{}f}{}{:.{}f}", time, layout.time_decimals, layout.separator,
                                       samples[i] / layout.value_unit, layout.value_decimals);
        if (layout.decimal_comma) std::replace(line.begin(), line.end(), '.', ',');
        file << line << layout.line_end;
    }
    if (!file.flush()) throw std::runtime_error("cannot write " + path);
}

void write_wav24(const std::string& path, const std::vector<double>& samples, int rate_hz,
                 double full_scale) {
    SF_INFO info{};
    info.samplerate = rate_hz;
    info.channels = 1;
    info.format = SF_FORMAT_WAV | SF_FORMAT_PCM_24;
    SNDFILE* file = sf_open(path.c_str(), SFM_WRITE, &info);
    if (file == nullptr) throw std::runtime_error("cannot write " + path + ": " + sf_strerror(nullptr));
    std::vector<double> scaled(samples.size());
    std::transform(samples.begin(), samples.end(), scaled.begin(), [&](double x) { return x / full_scale; });
    const auto count = static_cast<sf_count_t>(scaled.size());
    const bool complete = sf_write_double(file, scaled.data(), count) == count;
    if (sf_close(file) != 0 || !complete) throw std::runtime_error("cannot write " + path);
}

}  // namespace demo
