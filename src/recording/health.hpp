#pragma once
// The health of a signal that its samples alone can show: rails, few levels, no motion.

#include "ringwright/recording.hpp"

namespace ringwright {

/// Smallest difference between neighbouring samples that differ; 0 when all are equal.
[[nodiscard]] double smallest_step(const std::vector<double>& samples);

/// Runs of equal samples at the highest or lowest value that the signal runs into and out of at speed: a held
/// plateau or the flat top of a coarse signal is none.
[[nodiscard]] std::vector<SampleRange> clipped_runs(const std::vector<double>& samples, double resolution);

/// The same for part of a signal that runs from `low` to `high` as a whole.
[[nodiscard]] std::vector<SampleRange> clipped_runs_at(const std::vector<double>& samples, double low,
                                                       double high, double resolution);

/// Adds the findings on a signal that runs from `low` to `high`, whose resolution and clipped runs are filled
/// in; the first of these is at `clipped_s`.
void report_health(Recording& recording, double low, double high, double clipped_s);

/// Fills resolution and clipped, and adds the findings.
void examine_health(Recording& recording);

}  // namespace ringwright
