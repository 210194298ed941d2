#include "identify/decay_window.hpp"

#include <algorithm>
#include <cmath>
#include <limits>
#include <numbers>
#include <numeric>

namespace ringwright::identify {

using Eigen::Index;

namespace {

constexpr double gap_in_steps = 2.5;  // a longer step is a gap, unless the next is as long
constexpr double finest_turn =
    2.0 * std::numbers::pi / 24.0;  // of the fastest pole, a block: loses 0.6 % of information
constexpr double coarsest_turn = 2.0 * std::numbers::pi / 8.0;  // loses 5 %
constexpr double enough_blocks = 8000.0;
constexpr std::size_t shortest_run = 4;  // samples; shorter runs between clipped ones tell nothing

// Highest and lowest value that is still below the rails; a rail that was never met is infinite.
struct Rails {
    double low = -std::numeric_limits<double>::infinity(), high = std::numeric_limits<double>::infinity();
};

Rails rails_of(const Recording& recording) {
    Rails rails;
    if (recording.clipped.empty()) return rails;
    double lowest = rails.high, highest = rails.low;
    for (const double v : recording.samples) {
        lowest = std::min(lowest, v);
        highest = std::max(highest, v);
    }
    const double middle = 0.5 * (lowest + highest),
                 slack = 0.5 * recording.resolution + 1e-9 * (highest - lowest);
    for (const SampleRange& range : recording.clipped) {
        const double v = recording.samples[range.begin];
        if (v > middle) rails.high = std::min(rails.high, v - slack);
        if (v < middle) rails.low = std::max(rails.low, v + slack);
    }
    return rails;
}

// Clipped samples and their neighbours are left out, single ones at a rail that no run was made of included.
std::vector<char> usable_samples(const Recording& recording, std::size_t begin, std::size_t end) {
    std::vector<char> usable(end - begin, 1);
    const Rails rails = rails_of(recording);
    if (!std::isfinite(rails.low) && !std::isfinite(rails.high)) return usable;
    for (std::size_t i = begin; i < end; ++i) {
        if (recording.samples[i] < rails.high && recording.samples[i] > rails.low) continue;
        for (std::size_t j = std::max(i, begin + 1) - 1; j < std::min(i + 2, end); ++j) usable[j - begin] = 0;
    }
    return usable;
}

// How the samples follow each other in a window.
class Steps {
  public:
    explicit Steps(const DecayWindow& window) : window_(window), longest_(gap_in_steps / window.rate_hz) {}

    // Whether no run goes on from the sample before to this one: time was lost, or the rate changes.
    [[nodiscard]] bool breaks_before(std::size_t i) const {
        if (i == 0 || window_.time_s.empty()) return false;
        if (!is_long(i)) return i > 1 && is_slow(i - 1);
        return !is_slow(i) || (i > 1 && !is_long(i - 1));
    }

  private:
    [[nodiscard]] double step(std::size_t i) const {
        return i > 0 && i < window_.size() ? window_.time_of(i) - window_.time_of(i - 1) : 0.0;
    }
    [[nodiscard]] bool is_long(std::size_t i) const { return step(i) > longest_; }
    // A long step beside another as long is no gap: the recorder went on at a lower rate.
    [[nodiscard]] bool is_slow(std::size_t i) const {
        constexpr double alike = 1.2;
        const auto as_long = [&](std::size_t other) {
            return step(other) < alike * step(i) && step(i) < alike * step(other);
        };
        return is_long(i) && (as_long(i - 1) || as_long(i + 1));
    }

    const DecayWindow& window_;
    double longest_;
};

}  // namespace

DecayWindow cut_window(const Recording& recording, std::size_t begin, std::size_t end) {
    DecayWindow window;
    window.begin = begin;
    window.rate_hz = recording.clock.sample_rate_hz;
    const auto first = static_cast<std::ptrdiff_t>(begin), last = static_cast<std::ptrdiff_t>(end);
    window.value = WindowValues(
        std::vector<double>(recording.samples.begin() + first, recording.samples.begin() + last));
    if (!recording.clock.uniform()) {
        window.time_s.assign(recording.clock.times_s.begin() + first, recording.clock.times_s.begin() + last);
        const double start = window.time_s.empty() ? 0.0 : window.time_s.front();
        for (double& t : window.time_s) t -= start;
    }
    const std::vector<char> usable = usable_samples(recording, begin, end);
    const Steps steps(window);
    SampleRange run{0, 0};
    const auto close = [&](std::size_t at) {
        run.end = at;
        if (run.end - run.begin >= shortest_run) window.runs.push_back(run);
    };
    bool open = false;
    for (std::size_t i = 0; i < window.size(); ++i) {
        if (open && (steps.breaks_before(i) || !usable[i])) {
            close(i);
            open = false;
        }
        if (!open && usable[i]) {
            run.begin = i;
            open = true;
        }
    }
    if (open) close(window.size());
    return window;
}

DecaySamples block_means(const DecayWindow& window, Index block) {
    DecaySamples samples;
    samples.block = block;
    samples.uniform = window.time_s.empty();
    samples.step_s = static_cast<double>(block) / window.rate_hz;
    const auto width = static_cast<std::size_t>(block);
    Index count = 0;
    for (const SampleRange& run : window.runs) {
        const auto blocks = static_cast<Index>((run.end - run.begin) / width);
        if (blocks > 0) samples.stretches.push_back({count, blocks});
        count += blocks;
    }
    samples.time.resize(count);
    samples.value.resize(count);
    const bool fine = block > 1 && !window.time_s.empty();
    const double* value = window.value.data();
    if (fine) samples.fine_time.resize(count * block);
    Index at = 0;
    for (const SampleRange& run : window.runs) {
        for (std::size_t i = run.begin; i + width <= run.end; i += width, ++at) {
            double sum = 0.0, time = 0.0;
            for (std::size_t j = i; j < i + width; ++j) {
                sum += value[j];
                time += window.time_of(j);
                if (fine) samples.fine_time(at * block + static_cast<Index>(j - i)) = window.time_of(j);
            }
            samples.value(at) = sum / static_cast<double>(width);
            samples.time(at) = time / static_cast<double>(width);
        }
    }
    if (count == 0) return samples;
    std::vector<double> sorted(samples.value.begin(), samples.value.end());
    std::nth_element(sorted.begin(), sorted.begin() + count / 2, sorted.end());
    const double median = sorted[static_cast<std::size_t>(count / 2)];
    samples.scale = (samples.value.array() - median).abs().maxCoeff();
    if (!(samples.scale > 0.0)) samples.scale = 1.0;
    samples.value /= samples.scale;
    return samples;
}

Index block_for(const DecayWindow& window, double fastest_rate, double fewest) {
    const auto size = static_cast<double>(window.size());
    const double by_rate = finest_turn * window.rate_hz / fastest_rate;
    const double by_count = size / fewest;
    // Very long decays are read more coarsely, down to eight blocks a cycle.
    const double coarse = std::min(size / enough_blocks, coarsest_turn * window.rate_hz / fastest_rate);
    return std::max<Index>(1, static_cast<Index>(std::floor(std::max(std::min(by_rate, by_count), coarse))));
}

}  // namespace ringwright::identify
