#pragma once
// The recording as the search sees it: equal steps, and averages of it at every power of two.

#include <cstddef>
#include <span>
#include <vector>

#include "ringwright/recording.hpp"

namespace ringwright::event_search {

/// Equally spaced values. Position q stands for the sample `sample_at(q)` of the recording: the same index
/// for an even clock, else the first sample not before the time of q.
class Series {
  public:
    explicit Series(const Recording& recording);
    [[nodiscard]] std::span<const double> values() const { return values_; }
    /// Puts as many other values in the place of these.
    void replace(std::vector<double> values);
    [[nodiscard]] std::size_t size() const { return values_.size(); }
    [[nodiscard]] double rate_hz() const { return rate_hz_; }
    [[nodiscard]] std::size_t sample_at(std::size_t position) const;
    [[nodiscard]] std::size_t position_of(std::size_t sample) const;

  private:
    const Recording* recording_;
    std::vector<double> storage_;  ///< interpolated, or with what is not finite bridged; else empty
    std::span<const double> values_;
    double rate_hz_ = 1.0;
    bool resampled_ = false;
};

/// Means over blocks of 2^level values; level 0 is the series itself. About as many numbers again in all.
class Pyramid {
  public:
    explicit Pyramid(std::span<const double> values);
    [[nodiscard]] std::size_t levels() const { return levels_.size() + 1; }
    [[nodiscard]] std::span<const double> level(std::size_t index) const;

  private:
    std::span<const double> base_;
    std::vector<std::vector<double>> levels_;
};

/// The first position after a moment in blocks of a level: a block mean is centred half a block after its
/// first value.
[[nodiscard]] std::size_t position_after(double moment, std::size_t level);

}  // namespace ringwright::event_search
