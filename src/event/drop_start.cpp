#include "event/drop_start.hpp"

#include <algorithm>
#include <cmath>
#include <numbers>
#include <span>

#include "event/contact.hpp"

namespace ringwright::event_search {
namespace {

/// Blocks a cycle on which a drop is read: short bounces have to show.
constexpr double fine_turn = 48.0;
constexpr std::size_t fewest_blocks = 12;

double cycle_of(const DecayShape& shape) {
    return 2.0 * std::numbers::pi / shape.undamped_angular_frequency;
}

/// The recording at the fineness at which bounces are told from the decay.
struct Look {
    std::span<const double> values;
    std::size_t level = 0;
    double step_s = 0.0;
    std::size_t last = 0;  ///< block behind the last that may be fitted

    [[nodiscard]] std::size_t block_at(std::size_t position) const {
        return (position + (std::size_t{1} << level) - 1) >> level;
    }
};

/// Four cycles, or until a damped decay has settled.
std::size_t end_of_look(const DecayShape& shape, std::size_t first, std::size_t last) {
    constexpr double cycles = 4.0, settled = 5.0;
    const double wanted =
        std::max(std::min(cycles * cycle_of(shape), settled / shape.slow_rate()), 1.5 * cycle_of(shape));
    return std::min(last, first + static_cast<std::size_t>(std::ceil(wanted)));
}

/// `single` is the shape a step of the series.
Look look_at(const Pyramid& pyramid, double rate_hz, const DecayShape& single, std::size_t latest) {
    const double wanted = std::log2(std::max(1.0, cycle_of(single) / fine_turn));
    Look look;
    look.level = std::min(static_cast<std::size_t>(wanted), pyramid.levels() - 1);
    look.values = pyramid.level(look.level);
    look.step_s = std::ldexp(1.0, static_cast<int>(look.level)) / rate_hz;
    look.last = std::min(look.values.size(), latest >> look.level);
    return look;
}

std::optional<Onset> onset_after(const Pyramid& pyramid, std::size_t position, std::size_t latest) {
    std::optional<Onset> best;
    for (std::size_t level = 0; level < pyramid.levels(); ++level) {
        const std::size_t block = (position + (std::size_t{1} << level) - 1) >> level;
        if ((latest >> level) < block + fewest_blocks) break;
        const std::optional<Onset> onset = onset_at(pyramid, level, block);
        if (onset && (!best || onset->score > best->score)) best = onset;
    }
    return best;
}

/// The decay from one block on.
struct After {
    std::size_t first = 0;
    DecayFit fit;
    [[nodiscard]] std::size_t end() const { return first + fit.points; }
};

std::optional<After> fit_between(const Look& look, std::size_t first, std::size_t end,
                                 const DecayShape& shape) {
    if (first + fewest_blocks > end) return {};
    const std::optional<DecayFit> fit = fit_decay(look.values.subspan(first, end - first), shape);
    if (!fit) return {};
    return After{first, *fit};
}

std::optional<After> fit_after(const Look& look, std::size_t first, const DecayShape& shape) {
    return fit_between(look, first, end_of_look(shape, first, look.last), shape);
}

/// Sum of squares of a flight about what gravity makes of it: a parabola, a straight line or a level.
double sum_about_flight(std::span<const double> points, MeasuredQuantity quantity) {
    std::array<double, 3> y{};
    double x2 = 0.0, x4 = 0.0, squares = 0.0;
    const auto n = static_cast<double>(points.size());
    const double middle = 0.5 * (n - 1.0);
    for (std::size_t k = 0; k < points.size(); ++k) {
        const double x = static_cast<double>(k) - middle, value = points[k] - points[0];
        y[0] += value, y[1] += x * value, y[2] += x * x * value;
        x2 += x * x, x4 += x * x * x * x, squares += value * value;
    }
    squares -= y[0] * y[0] / n;
    if (quantity != MeasuredQuantity::acceleration && x2 > 0.0) squares -= y[1] * y[1] / x2;
    const double spread = x4 - x2 * x2 / n, joint = y[2] - y[0] * x2 / n;
    if (quantity == MeasuredQuantity::displacement && spread > 0.0) squares -= joint * joint / spread;
    return std::max(squares, 0.0);
}

/// Sum of squares of flight and decay where the mass was held still up to block `release` and swung from
/// there on. Nothing where that cannot be fitted.
std::optional<double> sum_of_release(const Look& look, std::size_t begin, std::size_t end,
                                     std::size_t release, const After& after) {
    const std::optional<After> whole = fit_between(look, release, after.end(), after.fit.shape);
    if (!whole) return {};
    double together = 0.0, mean = 0.0;
    for (std::size_t k = begin; k < release; ++k)
        mean += look.values[k] / static_cast<double>(release - begin);
    for (std::size_t k = begin; k < whole->end(); ++k) {
        if (k >= end && k < after.first) continue;
        const double t = static_cast<double>(k) - static_cast<double>(release);
        const double r = look.values[k] - (k < release ? mean : whole->fit.value_at(t));
        together += r * r;
    }
    return together;
}

/// Whether flight and decay apart explain the recording better than a decay that began with the flight, or
/// within it after a hold, by more than their three further numbers would. An accelerometer shows the same
/// level in a hold as in a flight.
bool is_flight(const Look& look, const Flight& flight, const After& after, MeasuredQuantity quantity) {
    constexpr double surprising = 25.0;
    constexpr std::size_t releases = 12;
    const std::size_t begin = look.block_at(flight.begin), end = flight.end >> look.level;
    if (after.first <= begin) return false;
    if (end < begin + 4) return true;
    const double apart =
        sum_about_flight(look.values.subspan(begin, end - begin), quantity) + after.fit.residual_sum;
    const auto spare = static_cast<double>(end - begin + after.fit.points) - 8.0;
    const double more = 3.0 * surprising * apart / std::max(spare, 4.0);
    const bool held = quantity == MeasuredQuantity::displacement;
    const std::size_t step = held ? std::max<std::size_t>(1, (end - begin) / releases) : end - begin;
    for (std::size_t release = begin; release < end; release += step) {
        const std::optional<double> together = sum_of_release(look, begin, end, release, after);
        if (!together && release == begin) return true;
        if (together && *together - apart <= more) return false;
    }
    return true;
}

/// What gravity looks like to the sensor: as the fall shows it, the less the more noise hides it. A scale is
/// seldom further off than the spread of the prior.
double gravity_seen(const Fall& fall, const After& after, MeasuredQuantity quantity) {
    constexpr double prior = 0.03 * standard_gravity;
    const Flight& first = fall.flights.front();
    const double seen = quantity == MeasuredQuantity::acceleration
                            ? fall.down * (first.level - after.fit.offset)
                            : first.acceleration;
    const double share = prior * prior / (prior * prior + first.uncertainty * first.uncertainty);
    return standard_gravity + share * (seen - standard_gravity);
}

Footing footing_of(const Fall& fall, const After& after, const Look& look, MeasuredQuantity quantity) {
    const double gravity = gravity_seen(fall, after, quantity);
    if (quantity == MeasuredQuantity::acceleration) return {quantity, fall.down, gravity};
    const double step = look.step_s * (quantity == MeasuredQuantity::displacement ? look.step_s : 1.0);
    return {quantity, fall.down, gravity * step};
}

/// The block from which on the decay has spring and damper push without a break, not before `earliest`.
/// `pull` is what they may pull by, as a share of gravity.
double contact_since(const Look& look, const Fall& fall, const After& after, MeasuredQuantity quantity,
                     double earliest, double pull = 0.0) {
    Footing footing = footing_of(fall, after, look, quantity);
    footing.gravity *= 1.0 + pull;
    const auto origin = static_cast<double>(after.first);
    const std::optional<double> free =
        Swing(after.fit, footing).last_free(earliest - origin, static_cast<double>(after.fit.points));
    return free ? origin + *free : earliest;
}

/// The pull at the top of the swing, as a share of gravity, that noise may feign.
double feigned_pull(const Look& look, const Fall& fall, const After& after, MeasuredQuantity quantity) {
    constexpr double deviations = 1.0, blocks = 0.5 * fine_turn;
    const double omega = after.fit.shape.undamped_angular_frequency;
    const double order = quantity == MeasuredQuantity::displacement ? 2.0
                         : quantity == MeasuredQuantity::velocity   ? 1.0
                                                                    : 0.0;
    const double noise = after.fit.residual_rms() * std::pow(omega, order) * std::sqrt(2.0 / blocks);
    return std::min(0.05, deviations * noise / footing_of(fall, after, look, quantity).gravity);
}

/// On to where the motion that is fitted would not have the spring pull any more.
After moved_on(const Look& look, const Fall& fall, After after, MeasuredQuantity quantity, double earliest) {
    constexpr int most_moves = 60;
    for (int move = 0; move < most_moves; ++move) {
        const double since = contact_since(look, fall, after, quantity, earliest);
        const auto wanted = static_cast<std::size_t>(std::max(0.0, std::ceil(since)));
        const auto cycle = static_cast<std::size_t>(cycle_of(after.fit.shape));
        if (wanted <= after.first) break;
        const std::optional<After> later =
            fit_after(look, std::min(wanted, after.first + cycle), after.fit.shape);
        if (!later) break;
        after = *later;
    }
    return after;
}

/// Whether the decay explains the recording from an earlier block on as it does from a later one on.
bool as_well(const After& longer, const After& shorter) {
    constexpr double worse = 2.0, more = 1.15;
    const auto added = static_cast<double>(shorter.first - longer.first);
    const double rms = shorter.fit.residual_rms(), allowed = worse * (added + 4.0) * rms * rms;
    const double kept = static_cast<double>(longer.fit.points) - added;
    return longer.fit.residual_sum < more * std::max(kept, 0.0) * rms * rms + allowed;
}

/// The earliest place from which the decay has spring and damper push and explains the recording as well as
/// it does later.
After moved_back(const Look& look, const Fall& fall, const After& after, MeasuredQuantity quantity,
                 double earliest) {
    const std::size_t step = std::max<std::size_t>(1, static_cast<std::size_t>(fine_turn / 12.0));
    for (auto first = static_cast<std::size_t>(std::max(earliest, 0.0)); first + step <= after.first;
         first += step) {
        const std::optional<After> sooner = fit_after(look, first, after.fit.shape);
        if (!sooner || !as_well(*sooner, after)) continue;
        const double pull = feigned_pull(look, fall, *sooner, quantity);
        const double since = contact_since(look, fall, *sooner, quantity, earliest, pull);
        if (since <= static_cast<double>(first) + 1.0) return *sooner;
    }
    return after;
}

/// Back to the touch itself, as far as the decay explains the recording.
After settled(const Look& look, const Fall& fall, After after, MeasuredQuantity quantity, double earliest) {
    constexpr int most_moves = 8;
    constexpr std::size_t step = 4;
    for (int move = 0; move < most_moves; ++move) {
        const double since = contact_since(look, fall, after, quantity, earliest);
        const auto touch = static_cast<std::size_t>(std::max(0.0, std::ceil(since)));
        if (touch >= after.first) break;
        const std::optional<After> sooner =
            fit_after(look, std::max(touch, after.first - std::min(after.first, step)), after.fit.shape);
        if (!sooner || !as_well(*sooner, after)) break;
        after = *sooner;
    }
    return after;
}

/// The decay from where it has spring and damper push without a break. One that never lifts off began with
/// the first touch, however little of it that explains.
After in_contact(const Look& look, const Fall& fall, const After& after, MeasuredQuantity quantity) {
    constexpr double late = 0.25;
    const std::size_t touch = look.block_at(fall.flights.front().end);
    const double earliest = static_cast<double>(touch) - 2.0;
    const After later = moved_on(look, fall, after, quantity, earliest);
    const After found =
        settled(look, fall, moved_back(look, fall, later, quantity, earliest), quantity, earliest);
    const double gap = static_cast<double>(found.first) - static_cast<double>(touch);
    if (gap < late * cycle_of(found.fit.shape) ||
        contact_since(look, fall, found, quantity, earliest) > earliest)
        return found;
    return fit_after(look, touch, found.fit.shape).value_or(found);
}

std::optional<After> after_last(const Look& look, const Fall& fall, const DecayShape& shape,
                                MeasuredQuantity quantity) {
    const std::size_t first = look.block_at(fall.flights.back().end);
    std::optional<After> after = fit_after(look, first, shape);
    if (!after) return {};
    return in_contact(look, fall, *after, quantity);
}

/// First single value of the decay of an accelerometer, which jumps where the mass touches down.
std::size_t after_jump(const Pyramid& pyramid, const Look& look, const Fall& fall, const After& after,
                       std::size_t touch) {
    constexpr double deviations = 4.0;
    const std::size_t reach = std::size_t{3} << look.level, first = touch - std::min(touch, reach);
    const double noise = after.fit.residual_rms() * std::exp2(0.5 * static_cast<double>(look.level));
    const std::span<const double> values = pyramid.level(0);
    std::size_t position = touch;
    for (std::size_t k = first; k < std::min(touch + reach, values.size()); ++k)
        if (-fall.down * (values[k] - fall.flights.front().level) < deviations * noise) position = k + 2;
    return position;
}

std::size_t first_value(const Pyramid& pyramid, const Look& look, const Fall& fall, const After& after,
                        MeasuredQuantity quantity) {
    const auto first = static_cast<double>(after.first);
    // Of a block that lies half before the touch, the part behind it.
    const double since = contact_since(look, fall, after, quantity, first - 1.0) + 0.5;
    const auto touch = static_cast<std::size_t>(
        std::ceil(std::clamp(since, first - 0.5, first + 1.0) * std::exp2(static_cast<double>(look.level))));
    if (quantity == MeasuredQuantity::acceleration) return after_jump(pyramid, look, fall, after, touch);
    return touch;
}

Start to_start(const Pyramid& pyramid, const Look& look, const After& after, std::size_t position) {
    Start start;
    start.position = position;
    start.shape = at_level(after.fit.shape, look.level, 0);
    start.noise_rms = after.fit.residual_rms();
    // What follows the decay cycle by cycle expects some dozen blocks each.
    const double wanted = std::log2(std::max(1.0, cycle_of(start.shape) / 12.0));
    start.level = std::min(static_cast<std::size_t>(wanted), pyramid.levels() - 1);
    start.fit_block = (start.position + (std::size_t{1} << start.level) - 1) >> start.level;
    const std::span<const double> means = pyramid.level(start.level);
    const std::size_t end = std::min(means.size(), (after.end() << look.level) >> start.level);
    const DecayShape shape = at_level(start.shape, 0, start.level);
    if (end > start.fit_block + 4)
        start.fit = fit_amplitudes(means.subspan(start.fit_block, end - start.fit_block), shape);
    start.amplitude = after.fit.envelope_at(0.0);
    return start;
}

}  // namespace

std::optional<Start> locate_drop_start(const Pyramid& pyramid, Fall& fall, MeasuredQuantity quantity,
                                       double rate_hz, const StartLimits& limits) {
    while (!fall.flights.empty()) {
        const std::size_t end = fall.flights.back().end;
        const std::optional<Onset> onset = onset_after(pyramid, end, limits.latest);
        if (onset) {
            const DecayShape single = at_level(onset->fit.shape, onset->level, 0);
            const Look look = look_at(pyramid, rate_hz, single, limits.latest);
            const DecayShape shape = at_level(single, 0, look.level);
            const std::optional<After> after = after_last(look, fall, shape, quantity);
            if (after && is_flight(look, fall.flights.back(), *after, quantity))
                return to_start(pyramid, look, *after, first_value(pyramid, look, fall, *after, quantity));
            if (!after && fall.flights.size() == 1) return {};
        } else if (fall.flights.size() == 1) {
            return {};
        }
        // Noise after the decay, or a crest of it, may pass for a flight; the fall itself stays.
        fall.flights.pop_back();
    }
    return {};
}

std::optional<Start> start_of_contact(const Pyramid& pyramid, std::size_t position, const DecayShape& shape,
                                      double rate_hz, std::size_t latest) {
    const Look look = look_at(pyramid, rate_hz, shape, latest);
    const std::optional<After> after =
        fit_after(look, look.block_at(position), at_level(shape, 0, look.level));
    if (!after) return {};
    return to_start(pyramid, look, *after, position);
}

}  // namespace ringwright::event_search
