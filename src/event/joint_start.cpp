#include "event/joint_start.hpp"

#include <algorithm>
#include <cmath>
#include <numbers>
#include <span>

#include "event/second_hit.hpp"
#include "event/two_terms.hpp"

namespace ringwright::event_search {
namespace {

/// Blocks a cycle of the decay: a mode of several times its frequency has to show.
constexpr double blocks_a_cycle = 40.0;
constexpr double most_cycles_back = 6.0, cycles_after = 3.0;
constexpr double most_damping = 0.5;
/// What two decays may leave unexplained against what they leave after the late start, and as a share of the
/// amplitude.
constexpr double as_well = 1.12, tolerated_share = 0.003;

struct Look {
    std::span<const double> values;
    std::size_t level = 0;
    double cycle = 0.0;  ///< blocks
    std::size_t earliest = 0, late = 0, end = 0;
    DecayShape shape;
    double noise = 0.0;
};

/// Two decays after the late start leave the noise alone: one of them may still hold what the other left.
double rms_after(const Look& look) {
    const std::span<const double> points = look.values.subspan(look.late, look.end - look.late);
    const std::optional<TwoTermFit> fit = fit_two_terms(points, look.shape);
    return fit ? fit->residual_rms() : fit_amplitudes(points, look.shape).residual_rms();
}

std::size_t level_of_look(const Pyramid& pyramid, double cycle) {
    return std::min(static_cast<std::size_t>(std::log2(std::max(1.0, cycle / blocks_a_cycle))),
                    pyramid.levels() - 1);
}

std::optional<Look> look_at(const Pyramid& pyramid, const Start& start, const StartLimits& limits) {
    Look look;
    const double cycle = 2.0 * std::numbers::pi / start.shape.undamped_angular_frequency;
    look.level = level_of_look(pyramid, cycle);
    look.values = pyramid.level(look.level);
    look.shape = at_level(start.shape, 0, look.level);
    look.cycle = 2.0 * std::numbers::pi / look.shape.undamped_angular_frequency;
    const std::size_t block = std::size_t{1} << look.level;
    look.late = (start.position + block - 1) >> look.level;
    look.earliest = (limits.earliest + block - 1) >> look.level;
    const auto back = static_cast<std::size_t>(most_cycles_back * look.cycle);
    look.earliest = std::max(look.earliest, look.late > back ? look.late - back : 0);
    look.end = std::min({look.values.size(), limits.latest >> look.level,
                         look.late + static_cast<std::size_t>(std::ceil(cycles_after * look.cycle))});
    if (look.end < look.late + 16 || look.late < look.earliest + 2) return {};
    look.noise = std::max(rms_after(look), tolerated_share * start.amplitude);
    return look;
}

struct Candidate {
    std::size_t first = 0;
    TwoTermFit fit;
};

std::optional<TwoTermFit> fit_from(const Look& look, std::size_t first,
                                   const std::optional<Candidate>& last) {
    const std::span<const double> points = look.values.subspan(first, look.end - first);
    std::optional<TwoTermFit> fit = fit_two_terms(points, look.shape);
    if (!last) return fit;
    const std::optional<TwoTermFit> other = fit_two_terms(points, last->fit.first, last->fit.second);
    return other && (!fit || other->residual_sum < fit->residual_sum) ? other : fit;
}

/// Whether the two decays also explain the first quarter of a cycle: a few wrong blocks hardly show in all.
bool explains_head(const Look& look, const Candidate& candidate) {
    constexpr double head_cycles = 0.25, head_as_well = 1.5;
    const auto count = std::max<std::size_t>(4, static_cast<std::size_t>(head_cycles * look.cycle));
    double squares = 0.0;
    for (std::size_t k = 0; k < count; ++k) {
        const double r = look.values[candidate.first + k] - candidate.fit.value_at(static_cast<double>(k));
        squares += r * r;
    }
    return std::sqrt(squares / static_cast<double>(count)) < head_as_well * look.noise;
}

/// Whether the second is a decay of its own: it does not ring, or it rings farther from the first than either
/// is wide at half power (2ζω). Two that are closer are one decay that is given more freedom.
bool apart(const TwoTermFit& fit) {
    constexpr double creeps = 0.7;
    if (fit.second.damping_ratio > creeps) return true;
    const double widest = std::max(fit.first.damping_ratio, fit.second.damping_ratio);
    const double tune =
        std::log(fit.second.undamped_angular_frequency / fit.first.undamped_angular_frequency);
    return std::abs(tune) > 2.0 * widest;
}

/// The earliest place, in steps of an eighth of a cycle, from which two decays explain the recording.
std::optional<Candidate> earliest_explained(const Look& look) {
    constexpr double step_cycles = 0.125;
    const auto step = std::max<std::size_t>(1, static_cast<std::size_t>(step_cycles * look.cycle));
    std::optional<Candidate> best;
    for (std::size_t first = look.late; first >= look.earliest + step;) {
        first -= step;
        const std::optional<TwoTermFit> fit = fit_from(look, first, best);
        if (fit && fit->residual_rms() < as_well * look.noise && apart(*fit)) {
            const Candidate candidate{first, *fit};
            if (explains_head(look, candidate)) best = candidate;
        }
        // Beyond two cycles without an explanation lies something else.
        const std::size_t since = best ? best->first : look.late;
        if (static_cast<double>(since - first) > 2.0 * look.cycle) break;
    }
    return best;
}

/// Block by block further back for as long as the two decays go on, within less than a step; two blocks
/// apart from them are the end.
std::size_t refine(const Look& look, const Candidate& candidate) {
    constexpr double deviations = 3.0;
    const auto follows = [&](std::size_t k) {
        const double t = static_cast<double>(k) - static_cast<double>(candidate.first);
        return std::abs(look.values[k] - candidate.fit.value_at(t)) < deviations * look.noise;
    };
    std::size_t first = candidate.first;
    const auto most = static_cast<std::size_t>(0.15 * look.cycle);
    const std::size_t stop = std::max(look.earliest, first > most ? first - most : 0);
    while (first > stop && follows(first - 1)) --first;
    return first;
}

}  // namespace

bool explained_by_two(const Pyramid& pyramid, Start& start, std::size_t limit) {
    constexpr double ringing = 0.1, left_of_single = 0.35, left_of_amplitude = 0.06;
    if (start.shape.damping_ratio > most_damping) return false;
    const double cycle = 2.0 * std::numbers::pi / start.shape.undamped_angular_frequency;
    const std::size_t level = level_of_look(pyramid, cycle), block = std::size_t{1} << level;
    const std::size_t first = (start.position + block - 1) >> level;
    const std::size_t last = std::min(limit, start.position + static_cast<std::size_t>(cycles_after * cycle));
    if ((last >> level) < first + 16) return false;
    const std::span<const double> points = pyramid.level(level).subspan(first, (last >> level) - first);
    const std::optional<TwoTermFit> two = fit_two_terms(points, at_level(start.shape, 0, level));
    if (!two || !apart(*two) || two->second.damping_ratio > ringing) return false;
    const double left = two->residual_rms();
    if (left > left_of_single * start.noise_rms || left > left_of_amplitude * start.amplitude) return false;
    start.companion = at_level(two->second, level, 0);
    start.noise_rms = left;
    return true;
}

void go_back_jointly(const Pyramid& pyramid, Start& start, const StartLimits& limits) {
    if (start.shape.damping_ratio > most_damping || limits.drop || !moves_before(pyramid, start)) return;
    const std::optional<Look> look = look_at(pyramid, start, limits);
    if (!look) return;
    const std::optional<Candidate> candidate = earliest_explained(*look);
    // Less than that is no other decay but the end of a blow or a plateau.
    constexpr double worthwhile = 0.4;  // of a cycle
    if (!candidate || static_cast<double>(look->late - candidate->first) < worthwhile * look->cycle) return;
    // A plateau turns into decay smoothly: part of it passes for decay.
    const auto smooth = static_cast<std::size_t>(0.0625 * look->cycle);
    const std::size_t first = limits.displacement ? candidate->first + smooth : refine(*look, *candidate);
    start.position = std::max(limits.earliest, first << look->level);
    start.from_rest = false;
    if (candidate->fit.second.damping_ratio < most_damping)
        start.companion = at_level(candidate->fit.second, look->level, 0);
    const double blocks = static_cast<double>(std::size_t{1} << start.level);
    const double ahead =
        (static_cast<double>(start.position) - static_cast<double>(start.fit_block << start.level)) / blocks;
    start.amplitude = start.fit.envelope_at(ahead);
}

}  // namespace ringwright::event_search
