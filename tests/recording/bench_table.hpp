#pragma once
// A release of 7 Hz and 2 % damping, sampled at 2 kHz, as the text that loggers make of it.

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <cstdint>
#include <string>
#include <string_view>
#include <vector>

#include "ringwright/recording.hpp"

namespace bench {

inline constexpr double rate_hz = 2000.0;

/// Uniform on [0, 1): xorshift64* (Vigna 2016), seed 20260901.
class Random {
  public:
    double next() {
        state_ ^= state_ >> 12;
        state_ ^= state_ << 25;
        state_ ^= state_ >> 27;
        return static_cast<double>((state_ * 2685821657736338717ULL) >> 11) * 0x1p-53;
    }

  private:
    std::uint64_t state_ = 20260901;
};

/// Displacement in mm: held at 5 until 0.25 s, then released.
inline double position(double t) {
    constexpr double pi = 3.141592653589793;
    const double since = std::max(0.0, t - 0.25);
    return 5.0 * std::exp(-0.02 * 2.0 * pi * 7.0 * since) * std::cos(2.0 * pi * 7.0 * since) + 0.3;
}

inline std::string replaced(std::string text, std::string_view from, std::string_view to) {
    for (std::size_t at = 0; (at = text.find(from, at)) != std::string::npos; at += to.size())
        text.replace(at, from.size(), to);
    return text;
}

/// How the table is written.
struct Form {
    std::string header = "time (s),disp (mm)\n";
    std::string delimiter = ",";
    char decimal = '.';
    std::string end_of_line = "\n";
    std::string trailing = "";  // after the last cell
    double time_factor = 1.0;   // of the times written
    int time_digits = 4;
    std::size_t rows = 4000;
};

inline std::string number(double value, int digits, char decimal) {
    std::string text = fmt::format("{:.{}f}", value, digits);
    std::replace(text.begin(), text.end(), '.', decimal);
    return text;
}

inline std::string table(const Form& form) {
    std::string text = form.header;
    for (std::size_t i = 0; i < form.rows; ++i) {
        const double t = static_cast<double>(i) / rate_hz;
        text += number(t * form.time_factor, form.time_digits, form.decimal) + form.delimiter +
                number(position(t), 4, form.decimal) + form.trailing + form.end_of_line;
    }
    return text;
}

inline bool has_finding(const ringwright::Findings& findings, std::string_view code) {
    return std::any_of(findings.begin(), findings.end(), [&](const auto& f) { return f.code == code; });
}

inline std::string message_of(const ringwright::Findings& findings, std::string_view code) {
    for (const auto& finding : findings)
        if (finding.code == code) return finding.message;
    return {};
}

/// Largest difference between the samples and the truth in mm; 1e9 when their number is another.
inline double worst_error_mm(const ringwright::Recording& recording, std::size_t rows, double unit = 1e-3) {
    if (recording.samples.size() != rows) return 1e9;
    double worst = 0.0;
    for (std::size_t i = 0; i < rows; ++i)
        worst = std::max(worst,
                         std::abs(recording.samples[i] / unit - position(static_cast<double>(i) / rate_hz)));
    return worst;
}

}  // namespace bench
