#include "recording/health.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <limits>

#include "ringwright/counting.hpp"

namespace ringwright {
namespace {

void add(Recording& recording, const char* code, Severity severity, std::string message) {
    recording.findings.push_back(Finding{code, severity, std::move(message)});
}

// Steps outward from the edge of a run at the rail. A signal cut off by a rail meets it at speed: the second
// step away from the edge is no smaller than what its curvature near an apex would give, and the steps do not
// grow as they do from the apex of a smooth curve (1 : 3 : 5).
bool steep_edge(double edge, double second, double third, double resolution) {
    const double first_step = std::abs(second - edge), next_step = std::abs(third - second);
    return next_step > 3.0 * resolution && first_step > 0.0 &&
           next_step < 2.9 * std::max(first_step, 0.5 * next_step) &&
           first_step + next_step > 6.0 * resolution;
}

// Edges inside the recording, each with two samples beyond it, and a third to see how the steps grow.
bool runs_into_rail(const std::vector<double>& x, std::size_t begin, std::size_t end, double resolution) {
    if (begin < 3 || end + 3 > x.size()) return false;
    const auto grows_like_apex = [](double a, double b, double c, double d) {
        const double one = std::abs(b - a), two = std::abs(c - b), three = std::abs(d - c);
        // From an apex the steps stand as 1 : 3 : 5; from a rail the later ones are nearly equal.
        return two > 2.2 * one && three > 1.5 * two;
    };
    return steep_edge(x[begin], x[begin - 1], x[begin - 2], resolution) &&
           steep_edge(x[end - 1], x[end], x[end + 1], resolution) &&
           !grows_like_apex(x[begin], x[begin - 1], x[begin - 2], x[begin - 3]) &&
           !grows_like_apex(x[end - 1], x[end], x[end + 1], x[end + 2]);
}

// Lowest and highest sample of each block, so that a rail is sought only where it was reached.
struct Extent {
    double low = 0.0, high = 0.0;
};
constexpr std::size_t block_size = 8192;

// Side by side, so that no comparison waits for the one before.
constexpr std::size_t lanes = 8;

Extent extent_of(const double* begin, const double* end) {
    std::array<double, lanes> low{}, high{};
    low.fill(*begin), high.fill(*begin);
    const auto take = [&](double x, std::size_t lane) {
        low[lane] = x < low[lane] ? x : low[lane];
        high[lane] = x > high[lane] ? x : high[lane];
    };
    const double* x = begin;
    for (; end - x >= static_cast<std::ptrdiff_t>(lanes); x += lanes)
        for (std::size_t lane = 0; lane < lanes; ++lane) take(x[lane], lane);
    for (; x != end; ++x) take(*x, 0);
    return {*std::ranges::min_element(low), *std::ranges::max_element(high)};
}

std::vector<Extent> extents_of(const std::vector<double>& x) {
    std::vector<Extent> extents;
    for (std::size_t at = 0; at < x.size(); at += block_size)
        extents.push_back(extent_of(x.data() + at, x.data() + std::min(at + block_size, x.size())));
    return extents;
}

Extent whole_of(const std::vector<Extent>& extents) {
    Extent whole = extents.front();
    for (const Extent& extent : extents) {
        whole.low = std::min(whole.low, extent.low);
        whole.high = std::max(whole.high, extent.high);
    }
    return whole;
}

// Calls `visit` with each run of samples at the rail, until it says that it has seen enough.
template <typename Visit>
void visit_runs(const std::vector<double>& x, const std::vector<Extent>& extents, double rail, Visit visit) {
    std::size_t i = 0;
    for (std::size_t block = 0; block < extents.size(); ++block) {
        if (extents[block].low != rail && extents[block].high != rail) continue;
        const std::size_t block_end = std::min((block + 1) * block_size, x.size());
        for (i = std::max(i, block * block_size); i < block_end; ++i) {
            if (x[i] != rail) continue;
            std::size_t end = i + 1;
            while (end < x.size() && x[end] == rail) ++end;
            if (!visit(i, end)) return;
            i = end;
        }
    }
}

bool is_met(const std::vector<double>& x, const std::vector<Extent>& extents, double rail,
            double resolution) {
    constexpr std::size_t least = 3;
    bool met = false;
    visit_runs(x, extents, rail, [&](std::size_t begin, std::size_t end) {
        met = end - begin >= least && runs_into_rail(x, begin, end, resolution);
        return !met;
    });
    return met;
}

Rails met_among(const std::vector<double>& x, const std::vector<Extent>& extents, const Rails& ends,
                double resolution) {
    Rails met = ends;
    if (met.low && !is_met(x, extents, *met.low, resolution)) met.low.reset();
    if (met.high && !is_met(x, extents, *met.high, resolution)) met.high.reset();
    return met;
}

std::vector<SampleRange> runs_at(const std::vector<double>& x, const std::vector<Extent>& extents,
                                 const Rails& rails) {
    std::vector<SampleRange> runs;
    const auto keep = [&](std::size_t begin, std::size_t end) {
        runs.push_back({begin, end});
        return true;
    };
    if (rails.high) visit_runs(x, extents, *rails.high, keep);
    if (rails.low) visit_runs(x, extents, *rails.low, keep);
    std::sort(runs.begin(), runs.end(),
              [](const SampleRange& a, const SampleRange& b) { return a.begin < b.begin; });
    return runs;
}

std::size_t samples_in(const std::vector<SampleRange>& runs) {
    std::size_t count = 0;
    for (const SampleRange& run : runs) count += run.end - run.begin;
    return count;
}

void report_clipping(Recording& recording, double at) {
    if (recording.clipped.empty()) return;
    add(recording, "clipped_samples", Severity::caution,
        fmt::format("{} at the end of the measuring range, in {} (first at {:.6g} s): the true motion went "
                    "further. Use a larger range or a weaker excitation.",
                    counted(samples_in(recording.clipped), "sample stands", "samples stand"),
                    counted(recording.clipped.size(), "run"), at));
}

}  // namespace

double smallest_step(const std::vector<double>& samples) {
    constexpr double none = std::numeric_limits<double>::infinity();
    std::array<double, lanes> smallest{};
    smallest.fill(none);
    const auto take = [&](std::size_t i, std::size_t lane) {
        const double step = std::abs(samples[i] - samples[i - 1]), some = step > 0.0 ? step : none;
        smallest[lane] = some < smallest[lane] ? some : smallest[lane];
    };
    std::size_t i = 1;
    for (; i + lanes <= samples.size(); i += lanes)
        for (std::size_t lane = 0; lane < lanes; ++lane) take(i + lane, lane);
    for (; i < samples.size(); ++i) take(i, 0);
    const double least = *std::ranges::min_element(smallest);
    return least == none ? 0.0 : least;
}

Rails rails_met(const std::vector<double>& samples, const Rails& ends, double resolution) {
    if (samples.empty()) return {};
    return met_among(samples, extents_of(samples), ends, resolution);
}

std::vector<SampleRange> runs_at_rails(const std::vector<double>& samples, const Rails& rails) {
    if (samples.empty()) return {};
    return runs_at(samples, extents_of(samples), rails);
}

void report_health(Recording& recording, double low, double high, double clipped_s) {
    const double range = high - low;
    if (range == 0.0) {
        add(recording, "constant_signal", Severity::defect,
            "Every sample has the same value. Check that the sensor was connected and that this is the right "
            "channel "
            "(--channel).");
        return;
    }
    report_clipping(recording, clipped_s);
    const double levels = range / recording.resolution;
    if (levels < 64.0)
        add(recording, "few_levels", levels < 16.0 ? Severity::caution : Severity::note,
            fmt::format(
                "The signal uses only about {:.0f} steps of the recorder's resolution; small motion is lost "
                "between them. Use a smaller measuring range.",
                levels));
}

void examine_health(Recording& recording) {
    const auto& x = recording.samples;
    if (x.empty()) return;
    const std::vector<Extent> extents = extents_of(x);
    const Extent whole = whole_of(extents);
    if (whole.high - whole.low != 0.0) {
        recording.resolution = smallest_step(x);
        recording.clipped =
            runs_at(x, extents, met_among(x, extents, {whole.low, whole.high}, recording.resolution));
    }
    const bool clipped = !recording.clipped.empty();
    report_health(recording, whole.low, whole.high,
                  clipped ? recording.clock.time_of(recording.clipped.front().begin) : 0.0);
}

}  // namespace ringwright
