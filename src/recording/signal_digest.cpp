#include "recording/signal_digest.hpp"

#include <algorithm>
#include <cmath>

#include "recording/health.hpp"

namespace ringwright {
namespace {

Extremes extremes_of(std::span<const double> block) {
    Extremes extremes{block.front(), block.front(), true};
    for (const double x : block.subspan(1)) {
        if (x < extremes.low) extremes.low = x, extremes.low_first = false;
        if (x > extremes.high) extremes.high = x, extremes.low_first = true;
    }
    return extremes;
}

void take_smaller(double& smallest, double step) {
    if (step > 0.0 && (smallest == 0.0 || step < smallest)) smallest = step;
}

// Samples beside a part that tell whether a run at its edge is met at speed.
constexpr std::size_t margin = 4;

// The part with what lies beside it, a run at a rail that goes on beyond it followed to its end.
struct Surroundings {
    std::size_t begin = 0;
    std::vector<double> samples;
};

Surroundings read_around(const LongRecording& recording, const DigestedPart& part,
                         const SignalDigest& whole) {
    const std::size_t size = recording.size(), part_end = part.begin + part.digest.count;
    const std::size_t begin = part.begin > margin ? part.begin - margin : 0;
    for (std::size_t more = margin;; more *= 4) {
        const std::size_t end = std::min(size, part_end + more);
        std::vector<double> x = recording.stretch({begin, end}).samples;
        const bool open = end < size && (x.back() == whole.low || x.back() == whole.high);
        if (!open || end - begin >= recording.limits().stretch) return {begin, std::move(x)};
    }
}

bool touches(const SignalDigest& part, const Rails& rails) {
    return part.count > 0 &&
           ((rails.low && part.low == *rails.low) || (rails.high && part.high == *rails.high));
}

// Reads no further than both ends are known to be rails.
Rails rails_of(const LongRecording& recording, const std::vector<DigestedPart>& parts,
               const SignalDigest& whole) {
    Rails met, open{whole.low, whole.high};
    for (const DigestedPart& part : parts) {
        if (!touches(part.digest, open)) continue;
        const Rails here = rails_met(read_around(recording, part, whole).samples, open, whole.smallest_step);
        if (here.low) met.low = here.low, open.low.reset();
        if (here.high) met.high = here.high, open.high.reset();
    }
    return met;
}

}  // namespace

SignalDigest digest_of(std::span<const double> samples) {
    SignalDigest digest;
    if (samples.empty()) return digest;
    digest.count = samples.size();
    digest.first = digest.low = digest.high = samples.front();
    digest.last = samples.back();
    for (std::size_t at = 0; at < samples.size(); at += digest_block) {
        digest.blocks.push_back(
            extremes_of(samples.subspan(at, std::min(digest_block, samples.size() - at))));
        digest.low = std::min(digest.low, digest.blocks.back().low);
        digest.high = std::max(digest.high, digest.blocks.back().high);
    }
    for (std::size_t i = 1; i < samples.size(); ++i)
        take_smaller(digest.smallest_step, std::abs(samples[i] - samples[i - 1]));
    return digest;
}

void append(SignalDigest& digest, const SignalDigest& later) {
    if (later.count == 0) return;
    if (digest.count == 0) {
        digest.first = later.first;
        digest.low = later.low;
        digest.high = later.high;
    } else {
        take_smaller(digest.smallest_step, std::abs(later.first - digest.last));
    }
    take_smaller(digest.smallest_step, later.smallest_step);
    digest.low = std::min(digest.low, later.low);
    digest.high = std::max(digest.high, later.high);
    digest.last = later.last;
    digest.count += later.count;
}

std::vector<SampleRange> clipped_runs(const LongRecording& recording, const std::vector<DigestedPart>& parts,
                                      const SignalDigest& whole) {
    std::vector<SampleRange> runs;
    if (whole.low == whole.high) return runs;
    const Rails rails = rails_of(recording, parts, whole);
    for (const DigestedPart& part : parts) {
        if (!touches(part.digest, rails)) continue;
        const std::size_t part_end = part.begin + part.digest.count;
        const Surroundings around = read_around(recording, part, whole);
        // Those that begin in the part.
        for (const SampleRange& run : runs_at_rails(around.samples, rails))
            if (around.begin + run.begin >= part.begin && around.begin + run.begin < part_end)
                runs.push_back({around.begin + run.begin, around.begin + run.end});
    }
    return runs;
}

void add_overview(const SignalDigest& part, double begin_s, double end_s, Recording& overview) {
    const double step = (end_s - begin_s) / static_cast<double>(std::max<std::size_t>(part.count, 1)) *
                        static_cast<double>(digest_block);
    for (std::size_t i = 0; i < part.blocks.size(); ++i) {
        const Extremes& block = part.blocks[i];
        const double start = begin_s + static_cast<double>(i) * step;
        const double end = std::min(start + step, end_s);
        overview.clock.times_s.push_back(start + 0.25 * (end - start));
        overview.clock.times_s.push_back(start + 0.75 * (end - start));
        overview.samples.push_back(block.low_first ? block.low : block.high);
        overview.samples.push_back(block.low_first ? block.high : block.low);
    }
}

}  // namespace ringwright
