#include "recording/signal_clarity.hpp"

#include <algorithm>
#include <cmath>
#include <limits>
#include <span>

namespace ringwright {
namespace {

// Root mean square about the straight line through the stretch.
double loudness(std::span<const double> x) {
    const auto n = static_cast<double>(x.size());
    const double middle = 0.5 * (n - 1.0);
    double sum = 0.0, weighted = 0.0, squares = 0.0;
    for (std::size_t i = 0; i < x.size(); ++i) {
        const double value = x[i] - x[0];
        sum += value;
        weighted += value * (static_cast<double>(i) - middle);
        squares += value * value;
    }
    const double spread = n * (n * n - 1.0) / 12.0;
    return std::sqrt(std::max(0.0, squares - sum * sum / n - weighted * weighted / spread) / n);
}

double median_of(std::vector<double> values) {
    const auto middle = values.begin() + static_cast<std::ptrdiff_t>(values.size() / 2);
    std::nth_element(values.begin(), middle, values.end());
    return *middle;
}

// Standard deviation of white noise from the median second difference (0.6745·√6 for a normal distribution).
double sample_noise(const std::vector<double>& x) {
    std::vector<double> bends;
    bends.reserve(x.size());
    for (std::size_t i = 2; i < x.size(); ++i) bends.push_back(std::abs(x[i] - 2.0 * x[i - 1] + x[i - 2]));
    return median_of(std::move(bends)) / 1.652;
}

}  // namespace

double signal_clarity(const std::vector<double>& samples) {
    std::vector<double> x;
    x.reserve(samples.size());
    std::copy_if(samples.begin(), samples.end(), std::back_inserter(x),
                 [](double v) { return !std::isnan(v); });
    if (x.size() < 16) return 0.0;
    const auto [low, high] = std::minmax_element(x.begin(), x.end());
    if (*low == *high) return 0.0;
    const std::size_t stretch = std::max<std::size_t>(x.size() / 32, 8);
    std::vector<double> levels;
    for (std::size_t at = 0; at + stretch <= x.size(); at += stretch)
        levels.push_back(loudness({x.data() + at, stretch}));
    const double loudest = *std::max_element(levels.begin(), levels.end());
    const double floor = (*high - *low) * 1e-4;
    const double over_noise = loudest / std::max(sample_noise(x), floor);
    const double over_usual = loudest / std::max(median_of(levels), floor);
    return std::min(over_noise, 1e3) * std::min(over_usual, 1e2);
}

ChannelMerit merit_of(const std::vector<double>& samples) {
    ChannelMerit merit;
    merit.clarity = signal_clarity(samples);
    if (merit.clarity == 0.0) return merit;
    double low = std::numeric_limits<double>::infinity(), high = -low;
    for (const double x : samples) {  // NaN fails both comparisons
        if (x < low) low = x;
        if (x > high) high = x;
    }
    merit.range = high - low;
    return merit;
}

std::size_t best_channel(const std::vector<ChannelMerit>& merits, bool one_unit) {
    std::size_t best = 0;
    double best_score = 0.0;
    for (std::size_t i = 0; i < merits.size(); ++i) {
        const double score = merits[i].clarity * (one_unit ? merits[i].range : 1.0);
        // The first stays unless another is better by a margin, so that equals keep their order.
        if (!(score > 1.25 * best_score)) continue;
        best = i;
        best_score = score;
    }
    return best;
}

}  // namespace ringwright
