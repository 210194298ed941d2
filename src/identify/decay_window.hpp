#pragma once
// The stretch of a recording that a fit looks at, as block means on the fit's own clock.

#include <memory>
#include <utility>
#include <vector>

#include "identify/decay_model.hpp"
#include "ringwright/event.hpp"
#include "ringwright/recording.hpp"

namespace ringwright::identify {

/// Values of which copies are one piece of memory until one of them is changed: a fit is copied for each
/// damping law that is tried, and its window may be nearly the whole recording.
class WindowValues {
  public:
    WindowValues() = default;
    explicit WindowValues(std::vector<double> values)
        : values_(std::make_shared<std::vector<double>>(std::move(values))) {}
    [[nodiscard]] std::size_t size() const { return values_ ? values_->size() : 0; }
    [[nodiscard]] const double* data() const { return values_ ? values_->data() : nullptr; }
    [[nodiscard]] double operator[](std::size_t i) const { return (*values_)[i]; }
    void add_to(std::size_t i, double difference) {
        if (values_.use_count() > 1) values_ = std::make_shared<std::vector<double>>(*values_);
        (*values_)[i] += difference;
    }

  private:
    std::shared_ptr<std::vector<double>> values_;
};

/// Samples [begin, end) of a recording, copied so that spikes can be replaced; times are relative to `begin`.
struct DecayWindow {
    WindowValues value;          ///< units of the recording
    std::vector<double> time_s;  ///< empty when uniform
    double rate_hz = 1.0;
    std::vector<SampleRange> runs;  ///< unbroken in time and not clipped, indices into `value`
    std::size_t begin = 0;          ///< in the recording
    [[nodiscard]] std::size_t size() const { return value.size(); }
    [[nodiscard]] double time_of(std::size_t i) const {
        return time_s.empty() ? static_cast<double>(i) / rate_hz : time_s[i];
    }
};

[[nodiscard]] DecayWindow cut_window(const Recording& recording, std::size_t begin, std::size_t end);

/// Block means over whole blocks of each run; the scale is the largest departure from the median.
[[nodiscard]] DecaySamples block_means(const DecayWindow& window, Eigen::Index block);

/// Largest block for which the fastest pole still turns by no more than 2π/24 (loss of information below 1
/// %), or smaller where fewer than `fewest` blocks would be left; above 8000 blocks coarser, down to 2π/8 (5
/// %).
[[nodiscard]] Eigen::Index block_for(const DecayWindow& window, double fastest_rate, double fewest = 500.0);

}  // namespace ringwright::identify
