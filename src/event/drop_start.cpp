#include "event/drop_start.hpp"

#include <algorithm>
#include <cmath>
#include <numbers>
#include <span>

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
    std::size_t end = 0;  ///< block, of what is fitted

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

Look look_at(const Pyramid& pyramid, double rate_hz, const Onset& onset, std::size_t latest) {
    const DecayShape single = at_level(onset.fit.shape, onset.level, 0);
    const double wanted = std::log2(std::max(1.0, cycle_of(single) / fine_turn));
    Look look;
    look.level = std::min(static_cast<std::size_t>(wanted), pyramid.levels() - 1);
    look.values = pyramid.level(look.level);
    look.step_s = std::ldexp(1.0, static_cast<int>(look.level)) / rate_hz;
    const DecayShape shape = at_level(single, 0, look.level);
    look.end =
        end_of_look(shape, look.block_at(onset.position), std::min(look.values.size(), latest >> look.level));
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
    [[nodiscard]] double value_at(std::size_t block) const {
        return fit.value_at(static_cast<double>(block) - static_cast<double>(first));
    }
};

std::optional<After> fit_after(const Look& look, std::size_t first, const DecayShape& shape) {
    if (first + fewest_blocks > look.end) return {};
    const std::optional<DecayFit> fit = fit_decay(look.values.subspan(first, look.end - first), shape);
    if (!fit) return {};
    return After{first, *fit};
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
    const std::optional<After> whole = fit_after(look, release, after.fit.shape);
    if (!whole) return {};
    double together = 0.0, mean = 0.0;
    for (std::size_t k = begin; k < release; ++k)
        mean += look.values[k] / static_cast<double>(release - begin);
    for (std::size_t k = begin; k < look.end; ++k) {
        if (k >= end && k < after.first) continue;
        const double r = look.values[k] - (k < release ? mean : whole->value_at(k));
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
    if (end < begin + 4 || after.first <= begin) return true;
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

/// Push of spring and damper as the recording shows it at each block: how far a displacement lies below first
/// touch, or an accelerometer above free fall. Nothing for a velocity.
struct Push {
    double sign = 0.0, zero = 0.0;
    [[nodiscard]] bool known() const { return sign != 0.0; }
    [[nodiscard]] double at(double value) const { return sign * (value - zero); }
};

Push push_of(const Fall& fall, const After& after, const Look& look, MeasuredQuantity quantity) {
    const Flight& first = fall.flights.front();
    if (quantity == MeasuredQuantity::acceleration) return {-fall.down, first.level};
    if (quantity != MeasuredQuantity::displacement) return {};
    const double omega = after.fit.shape.undamped_angular_frequency / look.step_s;
    return {fall.down, after.fit.offset - fall.down * first.acceleration / (omega * omega)};
}

/// Whether nothing pushes at a block. Displacement passes first touch slowly and is taken two blocks at a
/// time. An accelerometer cannot show less than nothing: there it is where it shows no more than noise.
bool is_free(const Look& look, const Push& push, std::size_t block, double noise, MeasuredQuantity quantity) {
    constexpr double deviations = 3.0;
    const double here = push.at(look.values[block]), next = push.at(look.values[block + 1]);
    if (quantity == MeasuredQuantity::acceleration) return here < deviations * noise;
    return 0.5 * (here + next) < -deviations * noise / std::numbers::sqrt2;
}

/// The next block to begin at: after the flight in which `first` lies, else after the last flight; `first`
/// when it pushes all along. The block in which an accelerometer jumps is neither flight nor contact.
std::size_t after_flight(const Look& look, const Push& push, std::size_t first, double noise,
                         MeasuredQuantity quantity) {
    const std::size_t jump = quantity == MeasuredQuantity::acceleration ? 1 : 0;
    std::size_t after = first;
    while (after + 1 < look.end && is_free(look, push, after, noise, quantity)) ++after;
    if (after > first) return after + jump;
    for (std::size_t k = first; k + 1 < look.end; ++k)
        if (is_free(look, push, k, noise, quantity)) after = k + 1 + jump;
    return after;
}

/// Moves the decay on until the spring pushes all along it, or one decay explains the recording as well as
/// free fall explained the fall.
After in_contact(const Look& look, const Fall& fall, After after, MeasuredQuantity quantity) {
    constexpr int most_bounces = 40;
    constexpr double as_well = 1.2;
    const double noise = fall.flights.front().noise;
    for (int bounce = 0; bounce < most_bounces; ++bounce) {
        const Push push = push_of(fall, after, look, quantity);
        if (!push.known() || after.fit.residual_rms() < as_well * noise) return after;
        const std::size_t next = after_flight(look, push, after.first, after.fit.residual_rms(), quantity);
        if (next == after.first) return after;
        const std::optional<After> later = fit_after(look, next, after.fit.shape);
        if (!later) return after;
        after = *later;
    }
    return after;
}

std::optional<After> after_last(const Look& look, const Fall& fall, const DecayShape& shape,
                                MeasuredQuantity quantity) {
    const std::size_t first = look.block_at(fall.flights.back().end);
    std::optional<After> after = fit_after(look, first, shape);
    if (!after) return {};
    return in_contact(look, fall, *after, quantity);
}

/// First single value of the decay of an accelerometer, which jumps where the mass touches down.
std::size_t after_jump(const Pyramid& pyramid, const Look& look, const Push& push, const After& after) {
    constexpr double deviations = 4.0;
    const std::size_t first = after.first << look.level, end = (after.first + 3) << look.level;
    const double noise = after.fit.residual_rms() * std::exp2(0.5 * static_cast<double>(look.level));
    const std::span<const double> values = pyramid.level(0);
    std::size_t position = first;
    for (std::size_t k = first; k < std::min(end, values.size()); ++k)
        if (push.at(values[k]) < deviations * noise) position = k + 2;
    return position;
}

/// First single value of the decay of a displacement: back from the first block for as long as the decay
/// explains the recording and the mass has touched.
std::size_t since_touch(const Look& look, const Push& push, const After& after, const Flight& last) {
    constexpr double deviations = 3.0;
    const std::size_t earliest = look.block_at((last.begin + last.end) / 2);
    std::size_t first = after.first;
    while (first > earliest && push.at(look.values[first - 1]) > 0.0 &&
           std::abs(look.values[first - 1] - after.value_at(first - 1)) <
               deviations * after.fit.residual_rms())
        --first;
    return first << look.level;
}

std::size_t first_value(const Pyramid& pyramid, const Look& look, const Fall& fall, const After& after,
                        MeasuredQuantity quantity) {
    const Push push = push_of(fall, after, look, quantity);
    if (quantity == MeasuredQuantity::acceleration) return after_jump(pyramid, look, push, after);
    return push.known() ? since_touch(look, push, after, fall.flights.back()) : after.first << look.level;
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
    const std::size_t end = std::min(means.size(), (look.end << look.level) >> start.level);
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
            const Look look = look_at(pyramid, rate_hz, *onset, limits.latest);
            const DecayShape shape = at_level(onset->fit.shape, onset->level, look.level);
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

}  // namespace ringwright::event_search
