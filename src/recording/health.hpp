#pragma once
// The health of a signal that its samples alone can show: rails, few levels, no motion.

#include <optional>
#include <vector>

#include "ringwright/recording.hpp"

namespace ringwright {

/// Smallest difference between neighbouring samples that differ; 0 when all are equal.
[[nodiscard]] double smallest_step(const std::vector<double>& samples);

/// Ends of the measuring range that a signal meets.
struct Rails {
    std::optional<double> low{}, high{};
};

/// Those of the ends of a whole signal, part of which is `samples`, that this part runs into and out of at
/// speed, with three equal samples or more: a held plateau or the flat top of a coarse signal is none.
[[nodiscard]] Rails rails_met(const std::vector<double>& samples, const Rails& ends, double resolution);

/// All runs of samples at the rails, single ones too: where the range is known to end, what stands there is
/// cut off, however noise breaks it up. In order.
[[nodiscard]] std::vector<SampleRange> runs_at_rails(const std::vector<double>& samples, const Rails& rails);

/// Adds the findings on a signal that runs from `low` to `high`, whose resolution and clipped runs are filled
/// in; the first of these is at `clipped_s`.
void report_health(Recording& recording, double low, double high, double clipped_s);

/// Fills resolution and clipped, and adds the findings.
void examine_health(Recording& recording);

}  // namespace ringwright
