#pragma once
// What a real sensor and logger make of a motion: coloured noise, hum, steps of the converter.

#include <string>
#include <vector>

#include "motion.hpp"

namespace demo {

/// Everything in the unit of the samples.
struct Disturbance {
    double white = 0.0;             ///< standard deviation of the converter's own noise
    double coloured = 0.0;          ///< standard deviation of slower noise …
    double coloured_corner_hz = 1;  ///< … that falls off above this frequency
    double hum = 0.0;               ///< amplitude at 50 Hz; a fifth of it at 150 Hz
    double step = 0.0;              ///< of the converter; 0: none
};

/// Adds the disturbance to the samples.
void disturb(std::vector<double>& samples, double rate_hz, const Disturbance& disturbance, Random& random);

/// How a text recording is written.
struct TextLayout {
    std::string preamble;  ///< lines before the data, each with its line end
    char separator = ',';
    bool decimal_comma = false;
    std::string line_end = "\n";
    double time_unit_s = 1.0;
    double value_unit = 1.0;  ///< SI units in one unit of the column
    int time_decimals = 3, value_decimals = 4;
};
void write_text(const std::string& path, const std::vector<double>& samples, double rate_hz,
                const TextLayout& layout);

/// One track of 24-bit samples; `full_scale` is the value at digital full scale.
void write_wav24(const std::string& path, const std::vector<double>& samples, int rate_hz, double full_scale);

}  // namespace demo
