#include "event/series.hpp"

#include <algorithm>
#include <cmath>
#include <utility>

namespace ringwright::event_search {
namespace {

/// The clock may wander by this many steps before the values are put on an even grid.
constexpr double tolerated_wander = 0.5;
/// An even grid longer than this many times the samples is not worth having (a gap of hours in the record).
constexpr double largest_growth = 4.0;

bool wanders(const SampleClock& clock) {
    const double step = 1.0 / clock.sample_rate_hz;
    for (std::size_t i = 0; i < clock.times_s.size(); ++i) {
        const double even = clock.times_s.front() + static_cast<double>(i) * step;
        if (std::abs(clock.times_s[i] - even) > tolerated_wander * step) return true;
    }
    return false;
}

std::vector<double> interpolated(const Recording& recording) {
    const std::vector<double>& times = recording.clock.times_s;
    const double step = 1.0 / recording.clock.sample_rate_hz;
    const double span = times.back() - times.front();
    std::vector<double> values(static_cast<std::size_t>(span / step + 1e-6) + 1);
    std::size_t i = 0;
    for (std::size_t q = 0; q < values.size(); ++q) {
        const double t = times.front() + static_cast<double>(q) * step;
        while (i + 2 < times.size() && times[i + 1] < t) ++i;
        const double share = std::clamp((t - times[i]) / (times[i + 1] - times[i]), 0.0, 1.0);
        values[q] = recording.samples[i] + share * (recording.samples[i + 1] - recording.samples[i]);
    }
    return values;
}

/// Holds the last finite value where a value is not finite.
void bridge(std::vector<double>& values) {
    const auto finite = [](double v) { return std::isfinite(v); };
    const auto first = std::find_if(values.begin(), values.end(), finite);
    double last = first == values.end() ? 0.0 : *first;
    for (double& value : values) {
        if (std::isfinite(value)) {
            last = value;
        } else {
            value = last;
        }
    }
}

}  // namespace

Series::Series(const Recording& recording)
    : recording_(&recording), rate_hz_(recording.clock.sample_rate_hz) {
    const SampleClock& clock = recording.clock;
    if (!clock.uniform() && recording.size() > 2 && wanders(clock)) {
        const double span = (clock.times_s.back() - clock.times_s.front()) * rate_hz_;
        resampled_ = span < largest_growth * static_cast<double>(recording.size());
    }
    if (resampled_) storage_ = interpolated(recording);
    const std::vector<double>& source = resampled_ ? storage_ : recording.samples;
    const auto finite = [](double v) { return std::isfinite(v); };
    if (!std::all_of(source.begin(), source.end(), finite)) {
        if (!resampled_) storage_ = recording.samples;
        bridge(storage_);
    }
    values_ =
        storage_.empty() ? std::span<const double>(recording.samples) : std::span<const double>(storage_);
}

void Series::replace(std::vector<double> values) {
    storage_ = std::move(values);
    values_ = storage_;
}

std::size_t Series::sample_at(std::size_t position) const {
    if (!resampled_) return std::min(position, recording_->size());
    if (position >= size()) return recording_->size();
    const std::vector<double>& times = recording_->clock.times_s;
    const double step = 1.0 / rate_hz_;
    const double t = times.front() + (static_cast<double>(position) - 1e-6) * step;
    return static_cast<std::size_t>(std::lower_bound(times.begin(), times.end(), t) - times.begin());
}

std::size_t Series::position_of(std::size_t sample) const {
    if (!resampled_) return std::min(sample, size());
    if (sample >= recording_->size()) return size();
    const std::vector<double>& times = recording_->clock.times_s;
    const double position = (times[sample] - times.front()) * rate_hz_;
    return std::min(static_cast<std::size_t>(std::ceil(position - 1e-6)), size());
}

Pyramid::Pyramid(std::span<const double> values) : base_(values) {
    std::span<const double> below = values;
    while (below.size() / 2 >= 12) {
        std::vector<double> above(below.size() / 2);
        for (std::size_t k = 0; k < above.size(); ++k) above[k] = 0.5 * (below[2 * k] + below[2 * k + 1]);
        levels_.push_back(std::move(above));
        below = levels_.back();
    }
}

std::span<const double> Pyramid::level(std::size_t index) const {
    return index == 0 ? base_ : std::span<const double>(levels_[index - 1]);
}

std::size_t position_after(double moment, std::size_t level) {
    const double position = std::ldexp(moment + 0.5, static_cast<int>(level)) - 0.5;
    return static_cast<std::size_t>(std::max(0.0, std::ceil(position)));
}

}  // namespace ringwright::event_search
