#include "ringwright/long_recording.hpp"

#include <algorithm>
#include <cmath>

namespace ringwright {

Recording LongRecording::like_facts(SampleRange range) const {
    Recording part;
    part.clock.sample_rate_hz = facts_.clock.sample_rate_hz;
    part.clock.start_s = facts_.clock.start_s;
    part.quantity = facts_.quantity;
    part.unit = facts_.unit;
    part.scaled = facts_.scaled;
    part.quantity_known = facts_.quantity_known;
    part.origin = facts_.origin;
    part.resolution = facts_.resolution;
    part.findings = facts_.findings;
    for (const SampleRange& run : facts_.clipped)
        if (run.end > range.begin && run.begin < range.end)
            part.clipped.push_back(
                {std::max(run.begin, range.begin) - range.begin, std::min(run.end, range.end) - range.begin});
    for (const SampleRange& gap : facts_.gaps)
        if (gap.begin >= range.begin && gap.end < range.end)
            part.gaps.push_back({gap.begin - range.begin, gap.end - range.begin});
    return part;
}

void LongRecording::name(const std::string& file, const std::string& sha256) {
    for (Recording* recording : {&facts_, &overview_}) {
        recording->origin.file = file;
        recording->origin.sha256 = sha256;
    }
}

double LongRecording::time_of(std::size_t sample) const {
    return equal_steps_ ? facts_.clock.time_of(sample) : stretch({sample, sample + 1}).clock.time_of(0);
}

std::size_t LongRecording::sample_at(double time_s) const {
    const SampleClock& clock = facts_.clock;
    const double position = std::ceil((time_s - clock.start_s) * clock.sample_rate_hz - 1e-6);
    if (position >= static_cast<double>(size_)) return size_;
    return static_cast<std::size_t>(std::max(0.0, position));
}

}  // namespace ringwright
