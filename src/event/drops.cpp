#include "event/drops.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <span>
#include <utility>

#include "event/drop_start.hpp"
#include "event/whole_drop.hpp"

namespace ringwright::event_search {
namespace {

/// What the decay may leave unexplained: as a share of its amplitude, or against the noise in the fall.
constexpr double misfit = 0.2, misfit_to_noise = 1.5;
constexpr double least_amplitude = 3.0;  ///< against the noise
constexpr std::size_t shortest_decay = 14;
/// Departure of what an accelerometer shows at rest from gravity, as a share of it.
constexpr double off_rest = 0.25;

/// What the sensor shows at rest: the median over three times the time of the fall, beginning one such time
/// after the impact. A swing that has not died away leaves it nearly alone.
double rest_after(std::span<const double> values, const Flight& fall, std::size_t impact,
                  std::size_t latest) {
    const std::size_t time = fall.end - fall.begin;
    const std::size_t begin = std::min(impact + time, latest - 1), end = std::min(begin + 3 * time, latest);
    std::vector<double> rest(values.begin() + static_cast<std::ptrdiff_t>(begin),
                             values.begin() + static_cast<std::ptrdiff_t>(end));
    const auto middle = rest.begin() + static_cast<std::ptrdiff_t>(rest.size() / 2);
    std::nth_element(rest.begin(), middle, rest.end());
    return *middle;
}

/// Gravity along an accelerometer's axis, against standard gravity, where it shows `level`.
double weight_at(const Fall& fall, double level) {
    return -fall.down * (level - fall.flights.front().level) / standard_gravity;
}

/// What the rest of an accelerometer says against a mass on its spring: gravity must then be seen once along
/// its axis.
std::string refusal_of_rest(const Fall& fall, double rest) {
    if (std::abs(weight_at(fall, rest) - 1.0) <= off_rest) return {};
    return fmt::format(
        "but the sensor then rests at {:.2g} times gravity along its axis where it must show "
        "1: the article turned over",
        weight_at(fall, rest));
}

/// Whether an accelerometer shows a push just before the decay: then no flight ended there, and no touch
/// began it.
bool pushed_before(const Found& drop, const Fall& fall, std::span<const double> values) {
    constexpr double part_of_cycle = 1.0 / 24.0, most = 0.5 * standard_gravity, deviations = 4.0;
    constexpr std::size_t jump = 2;
    if (drop.start.shape.damping_ratio < 0.5) return false;
    const auto count = std::max<std::size_t>(3, static_cast<std::size_t>(part_of_cycle * drop.cycle()));
    const std::size_t end = drop.begin() - std::min(drop.begin(), jump);
    if (end < count) return false;
    double mean = 0.0;
    for (std::size_t k = end - count; k < end; ++k) mean += values[k] / static_cast<double>(count);
    const double push = -fall.down * (mean - fall.flights.front().level);
    return push > most + deviations * drop.start.noise_rms;
}

/// Whether what follows a fall that hardly stands out of the noise creeps to rest: a hand or a slipping clamp
/// sets off as abruptly.
bool creeps_after_a_hint(const Found& drop, const Fall& fall, double rate_hz) {
    constexpr double creeps = 0.7, plain = 15.0;
    const Flight& first = fall.flights.front();
    const double time = static_cast<double>(first.end - first.begin) / rate_hz;
    const double bow = first.acceleration * time * time / 8.0;
    return drop.start.shape.damping_ratio > creeps && bow < plain * first.noise;
}

/// The noise of the flights; a single one shows less of it where it is slow.
double noise_in(const Fall& fall) {
    double most = 0.0;
    for (const Flight& flight : fall.flights) most = std::max(most, flight.noise);
    return most;
}

/// Whether the amplitude falls, over the whole course or over the first cycles: slow noise may be as large as
/// the rest of it.
bool dies_away(const Found& drop) {
    constexpr double least = 0.5;  // of ln amplitude: 40 %
    const Start& start = drop.start;
    const double fitted = std::ldexp(static_cast<double>(start.fit.points), static_cast<int>(start.level));
    return drop.course.falls() || start.shape.decay_rate() * fitted > least;
}

/// Why what follows a fall is no decay of a mass on a spring; empty when it is one.
std::string refusal_of(const Found& drop, const Fall& fall, MeasuredQuantity quantity,
                       std::span<const double> values, double rate_hz) {
    const Start& start = drop.start;
    if (quantity == MeasuredQuantity::acceleration && pushed_before(drop, fall, values))
        return "but no touch is seen after which it swings about the rest position";
    if (quantity == MeasuredQuantity::acceleration &&
        std::abs(weight_at(fall, start.fit.offset) - 1.0) > off_rest)
        return "but what follows the impact does not swing about the rest position";
    const bool over = drop.course.end < drop.begin() + shortest_decay;
    if (over || start.amplitude < least_amplitude * start.noise_rms ||
        start.noise_rms > std::max(misfit * start.amplitude, misfit_to_noise * noise_in(fall)))
        return "but what follows the impact does not swing about a rest position as a mass on a spring does";
    if (quantity == MeasuredQuantity::displacement && creeps_after_a_hint(drop, fall, rate_hz))
        return "but what follows the impact creeps to rest, and the noise hides whether anything fell";
    if (start.shape.damping_ratio < 0.5 && !dies_away(drop))
        return "but the motion after the impact does not die away";
    return {};
}

/// How far the mass comes below its rest position after a fall, as the recording shows it.
double lowest_below_rest(const Found& drop, const Fall& fall, std::span<const double> values) {
    double lowest = drop.start.amplitude;
    const std::size_t end = std::min(drop.begin() + static_cast<std::size_t>(drop.cycle()), values.size());
    for (std::size_t k = fall.flights.front().end; k < end; ++k)
        lowest = std::max(lowest, fall.down * (values[k] - drop.start.fit.offset));
    return lowest;
}

/// Whether the swing after a fall, recorded as displacement in m, is larger than that fall can have made it:
/// √((v/ω)² + (g/ω²)²) with the contact velocity v. Then noise in a hold, or the crest of a swing that had
/// died away, passed for the fall.
bool swings_too_far(const Found& drop, const Fall& fall, std::span<const double> values, double rate_hz) {
    constexpr double allowance = 1.5;
    const Flight& first = fall.flights.front();
    const std::size_t last_third = std::max<std::size_t>(1, (first.end - first.begin) / 3);
    const double third_s = static_cast<double>(last_third) / rate_hz;
    // The mean over the last third, and what gravity adds to it in half of that.
    const double speed = std::abs(values[first.end - 1] - values[first.end - 1 - last_third]) / third_s +
                         0.5 * standard_gravity * third_s;
    const double omega = drop.start.shape.undamped_angular_frequency * rate_hz;
    const double largest = std::hypot(speed / omega, standard_gravity / (omega * omega));
    return lowest_below_rest(drop, fall, values) > allowance * largest + least_amplitude * first.noise;
}

/// How far the values of a recording lie apart but for one in two hundred at either end, where something may
/// have knocked against the sensor.
double range_of(std::span<const double> values) {
    constexpr std::size_t left_out = 200;
    std::vector<double> sorted(values.begin(), values.end());
    const auto rank = static_cast<std::ptrdiff_t>(sorted.size() / left_out);
    const auto low = sorted.begin() + rank, high = sorted.end() - 1 - rank;
    std::nth_element(sorted.begin(), low, sorted.end());
    const double lowest = *low;
    std::nth_element(low, high, sorted.end());
    return *high - lowest;
}

/// Whether the article moves so much farther elsewhere in the recording that what passed for a fall is slow
/// noise in a hold or behind a decay: whoever drops an article lifts it about as far as it falls.
bool is_lost_in(double range, const Fall& fall, std::span<const double> values) {
    constexpr double least_share = 0.1;
    const Flight& first = fall.flights.front();
    return std::abs(values[first.end - 1] - values[first.begin]) < least_share * range;
}

/// The decay after a fall, and why it is none; empty where it is one.
struct Attempt {
    std::optional<Found> drop;
    std::string reason = "but nothing rings after the impact";
};

/// Takes from `fall` the flights that are none.
Attempt try_decay(const Pyramid& pyramid, Fall& fall, MeasuredQuantity quantity, double rate_hz,
                  const StartLimits& limits) {
    Attempt attempt;
    const std::optional<Start> start = locate_drop_start(pyramid, fall, quantity, rate_hz, limits);
    if (!start) return attempt;
    Found drop;
    drop.start = *start;
    drop.course = follow_decay(pyramid, drop.start, limits.latest);
    drop.flights = fall.flights;
    drop.hold_seen = fall.hold_seen;
    attempt.reason = refusal_of(drop, fall, quantity, pyramid.level(0), rate_hz);
    attempt.drop = std::move(drop);
    return attempt;
}

/// The same with fewer bounces where there is none otherwise: what passed for the last may have been noise.
Attempt decay_after(const Pyramid& pyramid, Fall& fall, MeasuredQuantity quantity, double rate_hz,
                    const StartLimits& limits) {
    Attempt attempt = try_decay(pyramid, fall, quantity, rate_hz, limits);
    for (Fall fewer = fall; !attempt.reason.empty() && fewer.flights.size() > 1;) {
        fewer.flights.pop_back();
        Fall trial = fewer;
        Attempt other = try_decay(pyramid, trial, quantity, rate_hz, limits);
        if (!other.reason.empty()) continue;
        fall = std::move(trial);
        attempt = std::move(other);
    }
    return attempt;
}

/// The time after an impact in which another decay would be part of the same fall.
std::size_t aftermath(const Fall& fall) {
    constexpr std::size_t falls = 10;
    const Flight& first = fall.flights.front();
    return falls * (first.end - first.begin);
}

}  // namespace

Drops find_drops(const Pyramid& pyramid, double rate_hz, MeasuredQuantity quantity, bool said) {
    std::vector<Fall> falls = find_falls(pyramid, rate_hz, quantity);
    const std::size_t size = pyramid.level(0).size();
    Drops drops;
    const std::span<const double> values = pyramid.level(0);
    const bool displaced = quantity == MeasuredQuantity::displacement;
    const double range = displaced && !falls.empty() ? range_of(values) : 0.0;
    for (std::size_t i = 0; i < falls.size(); ++i) {
        Fall& fall = falls[i];
        const std::size_t begin = fall.flights.front().begin;
        if (!drops.found.empty() && begin < drops.found.back().course.end) continue;
        if (displaced && is_lost_in(range, fall, values)) continue;
        StartLimits limits;
        limits.drop = true;
        limits.latest = i + 1 < falls.size() ? falls[i + 1].flights.front().begin : size;
        const Fall seen = fall;
        Attempt attempt = decay_after(pyramid, fall, quantity, rate_hz, limits);
        if (fall.flights.empty()) continue;
        if (displaced && seen.hold_seen && attempt.drop) {
            const std::size_t earliest = drops.found.empty() ? 0 : drops.found.back().course.end;
            SeenFall whole =
                drop_as_whole(pyramid, seen, *attempt.drop, {earliest, limits.latest, rate_hz, said});
            if (whole.slow_release) continue;
            if (whole.drop && whole.drop->start.amplitude > least_amplitude * whole.drop->start.noise_rms) {
                drops.found.push_back(std::move(*whole.drop));
                continue;
            }
        }
        if (displaced && attempt.drop && swings_too_far(*attempt.drop, seen, values, rate_hz)) continue;
        std::string reason = std::move(attempt.reason);
        if (!reason.empty() && quantity == MeasuredQuantity::acceleration) {
            const double rest =
                rest_after(values, seen.flights.front(), fall.flights.back().end, limits.latest);
            if (std::string at_rest = refusal_of_rest(fall, rest); !at_rest.empty())
                reason = std::move(at_rest);
        }
        if (reason.empty())
            drops.found.push_back(std::move(*attempt.drop));
        else
            drops.refused.push_back(
                {begin, std::min(limits.latest, seen.flights.back().end + aftermath(seen)),
                 fmt::format("A fall of {:.2g} s is seen, {}.",
                             static_cast<double>(seen.flights.front().end - begin) / rate_hz, reason)});
    }
    return drops;
}

}  // namespace ringwright::event_search
