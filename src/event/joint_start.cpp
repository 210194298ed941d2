#include "event/joint_start.hpp"

#include <algorithm>
#include <cmath>
#include <numbers>
#include <span>

#include "event/coupled_release.hpp"
#include "event/second_hit.hpp"
#include "event/two_terms.hpp"

namespace ringwright::event_search {
namespace {

/// Blocks a cycle of the decay: a mode of several times its frequency has to show.
constexpr double blocks_a_cycle = 40.0;
constexpr double most_cycles_back = 6.0, cycles_after = 3.0;
constexpr double most_damping = 0.5;
/// What two decays may leave unexplained against the noise, and as a share of the amplitude.
constexpr double as_well = 1.12, tolerated_share = 0.003;
/// Where two decays leave more than this of what follows the start, as a share of the amplitude and against
/// the noise of the rest, there is nothing that could be followed back: neither would be believed.
constexpr double most_left = 0.2, most_noise = 2.5;
/// Of leaving a block out of both decays, in noise variances: as for one decay.
constexpr double cost_of_leaving_out = 5.0;

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
    const double left = rms_after(look);
    const std::optional<RestNoise> rest = noise_of_rest(look.values, look.level, limits.rest);
    if (left > std::max(most_left * start.amplitude, rest ? most_noise * std::sqrt(rest->variance) : 0.0))
        return {};
    look.noise = std::max(left, tolerated_share * start.amplitude);
    // The few blocks after a late start show correlated noise too small; a long rest shows it as it is.
    if (rest && rest->is_long()) look.noise = std::max(look.noise, std::sqrt(rest->variance));
    return look;
}

struct Candidate {
    std::size_t first = 0;
    TwoTermFit fit;
};

std::optional<TwoTermFit> fit_from(const Look& look, std::size_t first,
                                   const std::optional<Candidate>& last) {
    const std::span<const double> points = look.values.subspan(first, look.end - first);
    std::optional<TwoTermFit> further;
    if (last) further = fit_two_terms(points, last->fit.first, last->fit.second);
    // What goes on to the noise needs no search for another pair.
    if (further && further->residual_rms() <= look.noise) return further;
    const std::optional<TwoTermFit> fit = fit_two_terms(points, look.shape);
    return further && (!fit || further->residual_sum < fit->residual_sum) ? further : fit;
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

/// Beyond so many cycles without an explanation lies something else.
constexpr double most_unexplained_cycles = 2.0;

/// Whether two decays leave more of the blocks from here on than they may of all from the last place on that
/// would be tried: a fit of more blocks leaves no less.
bool leaves_too_much(const Look& look, const TwoTermFit& fit, std::size_t since) {
    const double most_blocks =
        static_cast<double>(look.end - since) + most_unexplained_cycles * look.cycle + 1.0;
    return fit.residual_sum > as_well * as_well * look.noise * look.noise * most_blocks;
}

/// Of the places in steps of an eighth of a cycle before the late start, the one from which two decays
/// explain the recording most cheaply; nothing when the late start is the cheapest.
std::optional<Candidate> cheapest_explained(const Look& look) {
    constexpr double step_cycles = 0.125;
    constexpr int sure = 2;  // one of the fits may have gone astray
    int too_much = 0;
    const auto step = std::max<std::size_t>(1, static_cast<std::size_t>(step_cycles * look.cycle));
    const double price = cost_of_leaving_out * look.noise * look.noise;
    const double late_sum = look.noise * look.noise * static_cast<double>(look.end - look.late);
    double least = late_sum + price * static_cast<double>(look.late - look.earliest);
    std::optional<Candidate> best, last;
    for (std::size_t first = look.late; first >= look.earliest + step;) {
        first -= step;
        const std::optional<TwoTermFit> fit = fit_from(look, first, last);
        const std::size_t since = best ? best->first : look.late;
        if (static_cast<double>(since - first) > most_unexplained_cycles * look.cycle) break;
        too_much = fit && leaves_too_much(look, *fit, since) ? too_much + 1 : 0;
        if (too_much == sure) break;
        if (!fit || !apart(*fit) || fit->residual_rms() > as_well * look.noise) continue;
        last = Candidate{first, *fit};
        const double cost = fit->residual_sum + price * static_cast<double>(first - look.earliest);
        if (cost < least && explains_head(look, *last)) best = last, least = cost;
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

/// Position at which a hold ends and the two decays begin: noise lets two decays reach back into what was
/// held. Nothing where no release from a hold explains the recording.
std::optional<std::size_t> end_of_hold(const Look& look, const Candidate& candidate) {
    constexpr double hold_cycles = 0.5, before_cycles = 0.25, after_cycles = 0.5, explained = 1.25;
    const auto hold = static_cast<std::size_t>(hold_cycles * look.cycle);
    if (candidate.first < look.earliest + hold) return {};
    const std::size_t from = candidate.first - hold;
    const double guess = static_cast<double>(hold);
    const std::optional<CoupledRelease> release =
        fit_coupled_release(look.values.subspan(from, look.end - from), candidate.fit.first,
                            guess - before_cycles * look.cycle, guess + after_cycles * look.cycle);
    if (!release || release->residual_rms() > explained * look.noise) return {};
    return position_after(static_cast<double>(from) + release->moment, look.level);
}

/// First position of the two decays.
std::size_t position_of(const Look& look, const Candidate& candidate, const StartLimits& limits) {
    if (!limits.displacement) return refine(look, candidate) << look.level;
    if (const std::optional<std::size_t> released = end_of_hold(look, candidate)) return *released;
    // A plateau turns into decay smoothly: part of it passes for decay.
    return (candidate.first + static_cast<std::size_t>(0.0625 * look.cycle)) << look.level;
}

/// The blocks about an onset that may be a release on the tail of an AC-coupled sensor.
struct TailLook {
    std::span<const double> means;
    std::size_t level = 0, first = 0, onset = 0, end = 0;
    double cycle = 0.0;  ///< blocks
    DecayShape guess;
    [[nodiscard]] std::span<const double> points() const { return means.subspan(first, end - first); }
};

std::optional<TailLook> look_at_tail(const Pyramid& pyramid, const Onset& onset, const StartLimits& limits) {
    constexpr double before_cycles = 0.6;
    TailLook look;
    const DecayShape single = at_level(onset.fit.shape, onset.level, 0);
    look.level = level_of_look(pyramid, 2.0 * std::numbers::pi / single.undamped_angular_frequency);
    look.means = pyramid.level(look.level);
    look.guess = at_level(single, 0, look.level);
    look.cycle = 2.0 * std::numbers::pi / look.guess.undamped_angular_frequency;
    look.onset = onset.position >> look.level;
    const auto before = static_cast<std::size_t>(before_cycles * look.cycle);
    if (look.onset < before + (limits.earliest >> look.level)) return {};
    look.first = look.onset - before;
    look.end = std::min({look.means.size(), limits.latest >> look.level,
                         look.onset + static_cast<std::size_t>(cycles_after * look.cycle)});
    if (look.end < look.onset + 16) return {};
    return look;
}

/// A release that rings with a good part of what is seen and leaves plainly less of it than one decay does:
/// no more than noise, or little of the ring.
std::optional<CoupledRelease> release_on_tail(const TailLook& look, double left_by_one,
                                              const StartLimits& limits) {
    constexpr double around_cycles = 0.4, plainly_less = 0.6, rings = 0.35, share_of_height = 0.3;
    constexpr double left_of_ring = 0.03, as_quiet = 1.25;
    const double middle = static_cast<double>(look.onset - look.first);
    const std::optional<CoupledRelease> release = fit_coupled_release(
        look.points(), look.guess, middle - around_cycles * look.cycle, middle + around_cycles * look.cycle);
    if (!release || release->ring.damping_ratio > rings) return {};
    const auto [low, high] = std::minmax_element(look.points().begin(), look.points().end());
    if (release->ring_amplitude() < share_of_height * (*high - *low)) return {};
    const std::optional<RestNoise> rest = noise_of_rest(look.means, look.level, limits.rest);
    const double quiet = rest ? as_quiet * std::sqrt(rest->variance) : 0.0;
    const double left = release->residual_rms();
    if (left > plainly_less * left_by_one) return {};
    return left < std::max(left_of_ring * release->ring_amplitude(), quiet) ? release : std::nullopt;
}

void take_over(const TailLook& look, const CoupledRelease& release, const StartLimits& limits, Start& start) {
    const double moment = static_cast<double>(look.first) + release.moment;
    start.position = std::max(limits.earliest, position_after(moment, look.level));
    start.shape = at_level(release.ring, look.level, 0);
    start.level = look.level;
    start.fit_block = (start.position + (std::size_t{1} << look.level) - 1) >> look.level;
    start.fit = fit_amplitudes(look.means.subspan(start.fit_block, look.end - start.fit_block), release.ring);
    start.amplitude = release.ring_amplitude();
    start.noise_rms = release.residual_rms();
    start.from_rest = true;
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

bool rings_on_a_tail(const Pyramid& pyramid, const Onset& onset, Start& start, const StartLimits& limits) {
    constexpr double well_followed = 0.06;  // left unexplained of the amplitude
    const bool followed =
        start.shape.damping_ratio < most_damping && start.noise_rms < well_followed * start.amplitude;
    if (followed || !limits.displacement || limits.drop) return false;
    const std::optional<TailLook> look = look_at_tail(pyramid, onset, limits);
    if (!look) return false;
    const std::optional<CoupledRelease> release = release_on_tail(*look, start.noise_rms, limits);
    if (!release) return false;
    take_over(*look, *release, limits, start);
    return true;
}

void go_back_jointly(const Pyramid& pyramid, Start& start, const StartLimits& limits) {
    if (start.shape.damping_ratio > most_damping || limits.drop || !moves_before(pyramid, start)) return;
    const std::optional<Look> look = look_at(pyramid, start, limits);
    if (!look) return;
    const std::optional<Candidate> candidate = cheapest_explained(*look);
    // Less than that is no other decay but the end of a blow or a plateau.
    constexpr double worthwhile = 0.4;  // of a cycle
    if (!candidate || static_cast<double>(look->late - candidate->first) < worthwhile * look->cycle) return;
    start.position = std::max(limits.earliest, position_of(*look, *candidate, limits));
    start.from_rest = false;
    if (candidate->fit.second.damping_ratio < most_damping)
        start.companion = at_level(candidate->fit.second, look->level, 0);
    const double blocks = static_cast<double>(std::size_t{1} << start.level);
    const double ahead =
        (static_cast<double>(start.position) - static_cast<double>(start.fit_block << start.level)) / blocks;
    start.amplitude = start.fit.envelope_at(ahead);
}

}  // namespace ringwright::event_search
