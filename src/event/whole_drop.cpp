#include "event/whole_drop.hpp"

#include <algorithm>
#include <cmath>
#include <numbers>
#include <span>

#include "event/drop_motion.hpp"
#include "event/drop_start.hpp"
#include "event/ramped_release.hpp"

namespace ringwright::event_search {
namespace {

/// Blocks a cycle: short bounces have to show.
constexpr double blocks_a_cycle = 48.0;
constexpr double cycles_before = 3.0, cycles_after = 3.0;
constexpr std::size_t fewest_before = 16, fewest_after = 16;

/// The recording from before the release to some cycles of the decay, as blocks.
struct Look {
    std::span<const double> points;
    std::size_t level = 0, first = 0;  ///< first block of the points
    std::size_t decay = 0;             ///< point at which the decay was found to begin
    double gravity = 0.0;              ///< units a block²
    DropSearch search;

    [[nodiscard]] double point_at(std::size_t position) const {
        return std::ldexp(static_cast<double>(position), -static_cast<int>(level)) -
               static_cast<double>(first);
    }
    [[nodiscard]] std::size_t position_of(double moment) const {
        return position_after(static_cast<double>(first) + moment, level);
    }
};

/// The stretch from position `from` to some cycles after the decay begins; nothing where it holds too little
/// before or after that.
std::optional<Look> look_at(const Pyramid& pyramid, const Found& decay, std::size_t from,
                            const WholeDropLimits& limits) {
    Look look;
    look.level = std::min(static_cast<std::size_t>(std::log2(std::max(1.0, decay.cycle() / blocks_a_cycle))),
                          pyramid.levels() - 1);
    const auto on = static_cast<std::size_t>(cycles_after * decay.cycle());
    const std::span<const double> means = pyramid.level(look.level);
    look.first = (from + (std::size_t{1} << look.level) - 1) >> look.level;
    const std::size_t start = decay.begin() >> look.level;
    const std::size_t end = std::min(std::min(limits.latest, decay.begin() + on) >> look.level, means.size());
    if (start < look.first + fewest_before || end < start + fewest_after) return {};
    look.decay = start - look.first;
    look.points = means.subspan(look.first, end - look.first);
    const double step_s = std::ldexp(1.0, static_cast<int>(look.level)) / limits.rate_hz;
    look.gravity = standard_gravity * step_s * step_s;
    look.search.like.rest = decay.start.fit.offset;
    look.search.like.shape = at_level(decay.start.shape, 0, look.level);
    return look;
}

/// The mean of the first points is taken for the hold to begin with.
void expect_hold(Look& look, std::size_t count) {
    for (std::size_t k = 0; k < count; ++k)
        look.search.like.hold += look.points[k] / static_cast<double>(count);
}

/// Whether a fall from the hold would stand out of the noise by its bow alone.
bool would_be_seen(const Look& look, double noise) {
    constexpr double plain = 15.0;
    // g t²/8 of a fall that takes t is a quarter of its height.
    return 0.25 * DropMotion(look.search.like, look.gravity).height() > plain * noise;
}

using ReleaseFit = MotionFit<RampedRelease>;

std::optional<ReleaseFit> fit_release(const Look& look) {
    const DropNumbers& like = look.search.like;
    return fit_ramped_release(look.points, {like.hold, like.rest, look.search.latest, 1.0, like.shape},
                              look.search.earliest, look.search.latest);
}

/// Twice the logarithm by which the drop is likelier than a release from the hold: the sums of squares of
/// what neighbours do not tell of each other, in the variances of what the drop leaves. A slow release can
/// look like a fall, but whoever wants to see an article ring lets go within a part of a cycle.
double evidence_for(const DropFit& drop, const ReleaseFit& release) {
    constexpr double usual_ramp = 0.2;  // standard deviation of a release's time, cycles; common practice
    const double correlation = std::clamp(correlation_of(drop.residuals), 0.0, 0.95);
    const double left = whitened_sum(drop.residuals, correlation);
    const auto points = static_cast<double>(drop.residuals.size());
    const RampNumbers& numbers = release.motion.numbers();
    const double slow =
        numbers.ramp * numbers.shape.undamped_angular_frequency / (2.0 * std::numbers::pi * usual_ramp);
    const double one_number_more = std::log(points);  // Schwarz's criterion
    return (whitened_sum(release.residuals, correlation) - left) * points / left + slow * slow +
           one_number_more;
}
/// Likelier by 90 times.
constexpr double plain_evidence = 9.0;

/// Whether a fit leaves no more than the scatter of what is held before its release, or of the rest after the
/// decay, whichever is larger.
template <typename Fit>
bool leaves_noise(const Pyramid& pyramid, const Look& look, const Fit& fit, const Course& course) {
    constexpr double as_quiet = 1.2, deviations = 3.0;
    const auto held = std::max(2.0, std::floor(fit.motion.numbers().release));
    double squares = 0.0;
    for (std::size_t k = 0; k < std::min(static_cast<std::size_t>(held), look.points.size()); ++k) {
        const double r = look.points[k] - fit.motion.numbers().hold;
        squares += r * r / held;
    }
    const std::optional<RestNoise> rest =
        noise_of_rest(pyramid.level(look.level), look.level, SampleRange{course.end, course.rest_end});
    // What is held tells the noise the less exactly the more neighbours go together.
    const double correlation = correlation_of(fit.residuals),
                 squared = std::min(0.9, correlation * correlation);
    const double independent = held * (1.0 - squared) / (1.0 + squared);
    const double allowed = as_quiet + deviations / std::sqrt(2.0 * independent);
    return fit.residual_rms() < allowed * std::sqrt(std::max(squares, rest ? rest->variance : 0.0));
}

std::optional<Found> to_found(const Pyramid& pyramid, const Look& look, const DropFit& drop,
                              const WholeDropLimits& limits) {
    const std::optional<Start> start =
        start_of_contact(pyramid, look.position_of(drop.motion.contact_since()),
                         at_level(drop.motion.numbers().shape, look.level, 0), limits.rate_hz, limits.latest);
    if (!start) return {};
    Found found;
    found.start = *start;
    found.course = follow_decay(pyramid, found.start, limits.latest);
    found.hold_seen = true;
    for (const DropMotion::Free& free : drop.motion.flights()) {
        Flight flight;
        flight.begin = look.position_of(free.begin), flight.end = look.position_of(free.end);
        flight.acceleration = standard_gravity;
        flight.noise = drop.residual_rms();
        found.flights.push_back(flight);
    }
    return found;
}

}  // namespace

DropBehind drop_behind(const Pyramid& pyramid, const Found& pluck, const WholeDropLimits& limits) {
    constexpr double hold_share = 0.25, later = 0.3;  // cycles after the start for the release
    constexpr double other_frequency = 0.05;          // share
    const auto back = static_cast<std::size_t>(cycles_before * pluck.cycle());
    const std::size_t from = std::max(limits.earliest, pluck.begin() - std::min(pluck.begin(), back));
    std::optional<Look> look = look_at(pyramid, pluck, from, limits);
    if (!look) return {};
    expect_hold(*look, static_cast<std::size_t>(hold_share * static_cast<double>(look->decay)));
    if (!(DropMotion(look->search.like, look->gravity).height() > 0.0)) return {};
    if (would_be_seen(*look, pluck.start.noise_rms)) return {};
    const double latest = look->point_at(pluck.begin() + static_cast<std::size_t>(later * pluck.cycle()));
    look->search.earliest = 2.0;
    look->search.latest = std::min(latest, static_cast<double>(look->points.size()));
    const std::optional<DropFit> drop = fit_drop(look->points, look->search, look->gravity);
    if (!drop || drop->motion.flights().empty() || !leaves_noise(pyramid, *look, *drop, pluck.course))
        return {};
    const std::optional<ReleaseFit> release = fit_release(*look);
    const double evidence = release ? evidence_for(*drop, *release) : 2.0 * plain_evidence;
    if (evidence > plain_evidence || limits.said) return {to_found(pyramid, *look, *drop, limits), false};
    // Where both are much the same motion it does not matter which it was.
    const DecayShape fallen = at_level(drop->motion.numbers().shape, look->level, 0);
    const double tune =
        std::log(fallen.undamped_angular_frequency / pluck.start.shape.undamped_angular_frequency);
    return {{}, evidence > -plain_evidence && std::abs(tune) > other_frequency};
}

SeenFall drop_as_whole(const Pyramid& pyramid, const Fall& fall, const Found& decay,
                       const WholeDropLimits& limits) {
    constexpr double off = 0.4;  // of the time of the fall, by which the moment of release may be
    const Flight& first = fall.flights.front();
    const std::size_t time = first.end - first.begin;
    const std::size_t from = std::max(limits.earliest, first.begin - std::min(first.begin, 2 * time));
    std::optional<Look> look = look_at(pyramid, decay, from, limits);
    if (!look) return {};
    const double begin = look->point_at(first.begin);
    const double held = std::floor(0.5 * begin);
    if (held < 4.0) return {};
    expect_hold(*look, static_cast<std::size_t>(held));
    const double reach = off * std::ldexp(static_cast<double>(time), -static_cast<int>(look->level));
    look->search.earliest = std::max(2.0, begin - reach);
    look->search.latest = begin + reach;
    const std::optional<DropFit> drop = fit_drop(look->points, look->search, look->gravity);
    if (!drop) return {};
    const std::optional<ReleaseFit> release = limits.said ? std::nullopt : fit_release(*look);
    if (release && evidence_for(*drop, *release) < -plain_evidence)
        return {{}, leaves_noise(pyramid, *look, *release, decay.course)};
    if (drop->motion.flights().empty() || !leaves_noise(pyramid, *look, *drop, decay.course)) return {};
    return {to_found(pyramid, *look, *drop, limits), false};
}

}  // namespace ringwright::event_search
