#include "event/free_fall.hpp"

#include <algorithm>
#include <cmath>
#include <optional>
#include <span>

namespace ringwright::event_search {
namespace {

/// What gravity as recorded may differ by: the error of a sensor's scale, a slope, friction in a guide.
constexpr double tolerance = 0.15;
constexpr double block_s = 0.0025, window_s = 0.025;
constexpr std::size_t fewest_blocks = 8, window_sizes = 7;
constexpr double next_window = 1.42;  // times the one before
/// Height of the bow, or of the ramp, against the scatter about it, and against its own uncertainty under
/// white scatter: either will do.
constexpr double plain = 15.0, plain_to_tell = 8.0;

/// By how much neighbours that go together may widen an uncertainty (first-order noise of 0.6).
constexpr double coloured = 2.0;

/// c0 + c1·x + c2·x², x in blocks from the middle of the points.
struct Curve {
    double middle = 0.0, c0 = 0.0, c1 = 0.0, c2 = 0.0, rms = 0.0;
    [[nodiscard]] double at(double block) const {
        const double x = block - middle;
        return c0 + x * (c1 + x * c2);
    }
};

Curve fit_curve(std::span<const double> values, std::size_t first, std::size_t end, bool bent) {
    const auto n = static_cast<double>(end - first);
    Curve curve;
    curve.middle = static_cast<double>(first) + 0.5 * (n - 1.0);
    double y0 = 0.0, y1 = 0.0, y2 = 0.0, x2 = 0.0, x4 = 0.0;
    for (std::size_t k = first; k < end; ++k) {
        const double x = static_cast<double>(k) - curve.middle, y = values[k] - values[first];
        y0 += y, y1 += x * y, y2 += x * x * y, x2 += x * x, x4 += x * x * x * x;
    }
    curve.c1 = y1 / x2;
    curve.c2 = bent ? (n * y2 - x2 * y0) / (n * x4 - x2 * x2) : 0.0;
    curve.c0 = (y0 - curve.c2 * x2) / n + values[first];
    double squares = 0.0;
    for (std::size_t k = first; k < end; ++k) {
        const double r = values[k] - curve.at(static_cast<double>(k));
        squares += r * r;
    }
    curve.rms = std::sqrt(squares / std::max(1.0, n - 3.0));
    return curve;
}

/// The recording on the time scale on which falls are looked for.
struct Blocks {
    std::span<const double> means;
    std::size_t level = 0;
    double step_s = 0.0;
    std::size_t window = 0;  ///< the shortest
    bool bent = true;        ///< displacement: a parabola; velocity: a straight line
    double quiet = 0.0;      ///< scatter where the recording is at its quietest
};

/// A stretch that stays level.
struct Plateau {
    std::size_t begin = 0, end = 0;  ///< blocks
    double level = 0.0, rms = 0.0;
};

Plateau level_of(const Blocks& blocks, std::size_t begin, std::size_t end) {
    Plateau plateau{begin, end, 0.0, 0.0};
    const auto n = static_cast<double>(end - begin);
    for (std::size_t i = begin; i < end; ++i) plateau.level += blocks.means[i] / n;
    for (std::size_t i = begin; i < end; ++i)
        plateau.rms += (blocks.means[i] - plateau.level) * (blocks.means[i] - plateau.level) / (n - 1.0);
    plateau.rms = std::sqrt(plateau.rms);
    return plateau;
}

/// Scatter of the blocks where the recording is at its quietest: the lower third of its stretches of a tenth
/// of a second.
double quiet_scatter(const Blocks& blocks) {
    constexpr double stretch_s = 0.1;
    const auto length = std::max(fewest_blocks, static_cast<std::size_t>(stretch_s / blocks.step_s));
    std::vector<double> scatters;
    for (std::size_t k = 0; k + length <= blocks.means.size(); k += length)
        scatters.push_back(level_of(blocks, k, k + length).rms);
    if (scatters.empty()) return 0.0;
    const auto third = scatters.begin() + static_cast<std::ptrdiff_t>(scatters.size() / 3);
    std::nth_element(scatters.begin(), third, scatters.end());
    return *third;
}

Blocks blocks_of(const Pyramid& pyramid, double rate_hz, bool bent) {
    Blocks blocks;
    while (blocks.level + 1 < pyramid.levels() &&
           std::ldexp(1.0, static_cast<int>(blocks.level) + 1) / rate_hz <= block_s)
        ++blocks.level;
    blocks.means = pyramid.level(blocks.level);
    blocks.step_s = std::ldexp(1.0, static_cast<int>(blocks.level)) / rate_hz;
    blocks.window = std::max(fewest_blocks, static_cast<std::size_t>(std::ceil(window_s / blocks.step_s)));
    blocks.bent = bent;
    blocks.quiet = quiet_scatter(blocks);
    return blocks;
}

double acceleration_of(const Blocks& blocks, const Curve& curve) {
    return blocks.bent ? 2.0 * curve.c2 / (blocks.step_s * blocks.step_s) : curve.c1 / blocks.step_s;
}

bool like_gravity(double acceleration) {
    return std::abs(std::log(std::max(std::abs(acceleration), 1e-300) / standard_gravity)) <
           std::log(1.0 + tolerance);
}

/// How far gravity bends or tilts the curve over so many blocks.
double height_of(const Blocks& blocks, std::size_t count) {
    const double time = static_cast<double>(count) * blocks.step_s;
    return blocks.bent ? standard_gravity * time * time / 8.0 : standard_gravity * time / 2.0;
}

/// Three values of the window tell most places that are no fall.
bool may_fall(const Blocks& blocks, std::size_t k, std::size_t window) {
    const std::size_t half = (window - 1) / 2;
    const double y0 = blocks.means[k], y1 = blocks.means[k + half], y2 = blocks.means[k + 2 * half];
    const double time = static_cast<double>(half) * blocks.step_s;
    const double acceleration = blocks.bent ? (y2 - 2.0 * y1 + y0) / (time * time) : (y2 - y0) / (2.0 * time);
    return std::abs(acceleration) > 0.6 * standard_gravity && std::abs(acceleration) < 1.7 * standard_gravity;
}

struct Stretch {
    std::size_t begin = 0, end = 0;  ///< blocks
    Curve curve;
};

/// Standard deviation of a bow's or a ramp's height, against the scatter of the points about it.
double height_scatter(const Blocks& blocks, std::size_t count) {
    const double share = blocks.bent ? std::sqrt(180.0) / 4.0 : std::sqrt(12.0) / 2.0;
    return share / std::sqrt(static_cast<double>(count));
}

/// Whether it bends as gravity bends it, with no more scatter than noise.
bool falls_in_noise(const Blocks& blocks, const Stretch& stretch) {
    constexpr double as_quiet = 1.5;
    const std::size_t count = stretch.end - stretch.begin;
    return like_gravity(acceleration_of(blocks, stretch.curve)) &&
           stretch.curve.rms < as_quiet * blocks.quiet &&
           height_of(blocks, count) > plain_to_tell * height_scatter(blocks, count) * stretch.curve.rms;
}

/// Whether it bends as gravity bends it, plainly so whatever the noise.
bool falls_plainly(const Blocks& blocks, const Stretch& stretch) {
    return like_gravity(acceleration_of(blocks, stretch.curve)) &&
           height_of(blocks, stretch.end - stretch.begin) > plain * stretch.curve.rms;
}

bool falls(const Blocks& blocks, const Stretch& stretch) {
    return falls_plainly(blocks, stretch) || falls_in_noise(blocks, stretch);
}

/// The stretch from `begin` to `end`, as far on either side as the curve goes on: what lies beyond must
/// neither bend it away from gravity nor scatter more.
Stretch grow(const Blocks& blocks, std::size_t begin, std::size_t end) {
    constexpr double share = 0.003, scatters = 4.0, more_scatter = 1.25;
    Stretch stretch{begin, end, fit_curve(blocks.means, begin, end, blocks.bent)};
    const double scatter = std::max(stretch.curve.rms, blocks.quiet);
    for (;;) {
        const Stretch before_growth = stretch;
        const std::size_t length = stretch.end - stretch.begin;
        const double allowed = std::max(scatters * stretch.curve.rms, share * height_of(blocks, length));
        const auto follows = [&](std::size_t k) {
            return std::abs(blocks.means[k] - stretch.curve.at(static_cast<double>(k))) < allowed;
        };
        const std::size_t most = std::max<std::size_t>(1, length / 4);
        std::size_t added = 0;
        // One value off the curve may be noise; two are the end.
        for (; added < most && stretch.end + 1 < blocks.means.size(); ++stretch.end, ++added)
            if (!follows(stretch.end) && !follows(stretch.end + 1)) break;
        for (std::size_t before = 0; before < most && stretch.begin > 1; ++before, ++added, --stretch.begin)
            if (!follows(stretch.begin - 1) && !follows(stretch.begin - 2)) break;
        if (added == 0) return stretch;
        stretch.curve = fit_curve(blocks.means, stretch.begin, stretch.end, blocks.bent);
        const double most_scatter = std::max(more_scatter * scatter, share * height_of(blocks, length));
        if (stretch.curve.rms > most_scatter || !falls(blocks, stretch)) return before_growth;
    }
}

/// Takes from the ends what the curve of the middle does not go on to.
Stretch trimmed(const Blocks& blocks, const Stretch& stretch) {
    constexpr double share = 0.003, scatters = 4.0;
    const std::size_t length = stretch.end - stretch.begin, edge = length / 7;
    if (length < 2 * fewest_blocks) return stretch;
    Stretch inner{stretch.begin + edge, stretch.end - edge, {}};
    inner.curve = fit_curve(blocks.means, inner.begin, inner.end, blocks.bent);
    const double allowed = std::max(scatters * inner.curve.rms, share * height_of(blocks, length));
    const auto follows = [&](std::size_t k) {
        return std::abs(blocks.means[k] - inner.curve.at(static_cast<double>(k))) < allowed;
    };
    while (inner.end < stretch.end && follows(inner.end)) ++inner.end;
    while (inner.begin > stretch.begin && follows(inner.begin - 1)) --inner.begin;
    inner.curve = fit_curve(blocks.means, inner.begin, inner.end, blocks.bent);
    return falls(blocks, inner) ? inner : stretch;
}

/// Adds the falls seen through windows of one length that those found before do not hold.
void look_through(const Blocks& blocks, std::size_t window, bool (*fall)(const Blocks&, const Stretch&),
                  std::vector<Stretch>& found) {
    const std::size_t step = std::max<std::size_t>(1, window / 4);
    for (std::size_t k = 0; k + window <= blocks.means.size(); k += step) {
        if (!may_fall(blocks, k, window)) continue;
        const Stretch seed{k, k + window, fit_curve(blocks.means, k, k + window, blocks.bent)};
        if (!fall(blocks, seed)) continue;
        const bool known = std::any_of(found.begin(), found.end(), [&](const Stretch& other) {
            return k < other.end && k + window > other.begin;
        });
        if (known) continue;
        const Stretch whole = trimmed(blocks, grow(blocks, seed.begin, seed.end));
        const std::size_t middle = (whole.begin + whole.end) / 2;
        const bool covered = std::any_of(found.begin(), found.end(), [&](const Stretch& other) {
            return middle >= other.begin && middle < other.end;
        });
        if (covered || !falls(blocks, whole)) continue;
        found.push_back(whole);
        k = std::max(k, whole.end > step ? whole.end - step : 0);
    }
}

/// Stretches that adjoin as one: between two flights a mass has to touch. A short window across the release
/// bends as a fall does, and leaves the rest of the fall to another.
std::vector<Stretch> joined(const Blocks& blocks, const std::vector<Stretch>& stretches) {
    std::vector<Stretch> all;
    for (const Stretch& stretch : stretches) {
        if (!all.empty() && stretch.begin <= all.back().end + 1) {
            Stretch both{all.back().begin, std::max(all.back().end, stretch.end), {}};
            both.curve = fit_curve(blocks.means, both.begin, both.end, blocks.bent);
            if (falls(blocks, both)) {
                all.back() = trimmed(blocks, both);
                continue;
            }
        }
        all.push_back(stretch);
    }
    return all;
}

/// Long windows tell a fall from noise best; short ones come last, since a swing looks like a fall to them.
std::vector<Stretch> stretches_of(const Blocks& blocks) {
    std::vector<std::size_t> windows;
    for (double window = static_cast<double>(blocks.window); windows.size() < window_sizes;
         window *= next_window)
        windows.push_back(static_cast<std::size_t>(std::lround(window)));
    std::vector<Stretch> found;
    for (auto window = windows.rbegin(); window != windows.rend(); ++window)
        look_through(blocks, *window, falls_in_noise, found);
    for (const std::size_t window : windows) look_through(blocks, window, falls_plainly, found);
    std::sort(found.begin(), found.end(),
              [](const Stretch& a, const Stretch& b) { return a.begin < b.begin; });
    return joined(blocks, found);
}

/// Downward speed at the ends of a flight, unit of the recording a block.
struct Speeds {
    double begin = 0.0, end = 0.0;
};

Speeds speeds_of(const Blocks& blocks, const Stretch& stretch) {
    const auto at = [&](std::size_t block) {
        const double x = static_cast<double>(block) - stretch.curve.middle;
        return blocks.bent ? stretch.curve.c1 + 2.0 * stretch.curve.c2 * x
                           : stretch.curve.at(static_cast<double>(block));
    };
    return {at(stretch.begin), at(stretch.end - 1)};
}

/// A fall begins at rest after a hold that is still; a bounce begins with the speed at which it ends.
bool from_rest(const Blocks& blocks, const Stretch& stretch) {
    constexpr double share_of_speed = 0.3, share_of_way = 0.1, range_of_scatter = 5.0;
    const std::span<const double> y = blocks.means;
    const std::size_t length = stretch.end - stretch.begin;
    if (stretch.begin == 0) return true;
    const std::size_t before = std::min(stretch.begin, length);
    const auto [low, high] =
        std::minmax_element(y.begin() + static_cast<std::ptrdiff_t>(stretch.begin - before),
                            y.begin() + static_cast<std::ptrdiff_t>(stretch.begin + 1));
    const double way = std::abs(y[stretch.end - 1] - y[stretch.begin]);
    if (*high - *low > share_of_way * way + range_of_scatter * stretch.curve.rms) return false;
    if (!blocks.bent) return true;
    const Speeds speeds = speeds_of(blocks, stretch);
    const double gained = std::copysign(speeds.end, speeds.end * stretch.curve.c2);
    return std::abs(speeds.begin) < share_of_speed * gained;
}

Flight to_flight(const Blocks& blocks, const Stretch& stretch) {
    const std::size_t count = stretch.end - stretch.begin;
    const double off =
        coloured * height_scatter(blocks, count) * stretch.curve.rms / height_of(blocks, count);
    return {stretch.begin << blocks.level,
            stretch.end << blocks.level,
            std::abs(acceleration_of(blocks, stretch.curve)),
            0.0,
            off * standard_gravity,
            stretch.curve.rms};
}

std::vector<Fall> falls_of_motion(const Blocks& blocks) {
    std::vector<Fall> all;
    for (const Stretch& stretch : stretches_of(blocks)) {
        const double down = acceleration_of(blocks, stretch.curve) > 0.0 ? 1.0 : -1.0;
        if (from_rest(blocks, stretch)) {
            all.push_back({{to_flight(blocks, stretch)}, down, stretch.begin > 2});
        } else if (!all.empty() && all.back().down == down) {
            all.back().flights.push_back(to_flight(blocks, stretch));
        }
    }
    return all;
}

/// The window from block `k`, carried on for as long as the recording stays within `allowed` of its level:
/// one block off it may be noise, two are the end.
Plateau carry_on(const Blocks& blocks, std::size_t k, double allowed) {
    const std::span<const double> y = blocks.means;
    Plateau plateau = level_of(blocks, k, k + blocks.window);
    const auto off = [&](std::size_t i) { return std::abs(y[i] - plateau.level) > allowed; };
    double sum = plateau.level * static_cast<double>(blocks.window);
    std::size_t end = plateau.end;
    for (; end < y.size() && !(off(end) && (end + 1 >= y.size() || off(end + 1))); ++end) {
        sum += y[end];
        plateau.level = sum / static_cast<double>(end + 1 - k);
    }
    return level_of(blocks, k, end);
}

std::vector<Plateau> plateaus_of(const Blocks& blocks) {
    constexpr double flat = 0.075 * standard_gravity, most = 0.5 * standard_gravity;
    constexpr double deviations = 4.0, as_quiet = 1.5;
    const double noise = blocks.quiet;
    const double allowed = std::clamp(deviations * noise, flat, most);
    std::vector<Plateau> found;
    const std::span<const double> y = blocks.means;
    for (std::size_t k = 0; k + blocks.window <= y.size();) {
        const Plateau seed = level_of(blocks, k, k + blocks.window);
        const auto [low, high] = std::minmax_element(y.begin() + static_cast<std::ptrdiff_t>(seed.begin),
                                                     y.begin() + static_cast<std::ptrdiff_t>(seed.end));
        if (*high - *low > 2.0 * flat && (seed.rms > as_quiet * noise || *high - *low > 2.0 * allowed)) {
            ++k;
            continue;
        }
        const Plateau whole = carry_on(blocks, k, allowed);
        // The edges belong to the change of level.
        const std::size_t trimmed = whole.end - k > 2 * fewest_blocks ? 1 : 0;
        found.push_back(level_of(blocks, k + trimmed, whole.end - trimmed));
        k = whole.end;
    }
    return found;
}

Flight to_flight(const Blocks& blocks, const Plateau& plateau) {
    const double off = coloured * plateau.rms /
                       std::sqrt(static_cast<double>(std::max<std::size_t>(1, plateau.end - plateau.begin)));
    return {plateau.begin << blocks.level,
            plateau.end << blocks.level,
            standard_gravity,
            plateau.level,
            off,
            plateau.rms};
}

/// How plainly a plateau bends: the share of its scatter that a parabola stands for, with the sign of the
/// curvature.
double bend_of(const Blocks& blocks, const Plateau& plateau) {
    const Curve curve = fit_curve(blocks.means, plateau.begin, plateau.end, true);
    const auto n = static_cast<double>(plateau.end - plateau.begin);
    const double squares = plateau.rms * plateau.rms * (n - 1.0), left = curve.rms * curve.rms * (n - 3.0);
    return squares > 0.0 ? std::copysign(1.0 - left / squares, curve.c2) : 0.0;
}

/// Whether two plateaus bend towards each other, as crest and trough of a swing do, or what is seen of them:
/// a parabola stands for more than three quarters of the scatter in either. Noise about a level does that in
/// one of 100 of the shortest, and not in both.
bool bend_together(const Blocks& blocks, const Plateau& first, const Plateau& second) {
    constexpr double plainly = 0.75;
    const double towards = second.level > first.level ? 1.0 : -1.0;
    return towards * bend_of(blocks, first) > plainly && -towards * bend_of(blocks, second) > plainly;
}

/// Whether the sensor leaves what lies between two levels on the way from one to the other: a hold that ends
/// goes from the weight to nothing. A hand may push or pull by as much as the weight while it lets go; a
/// spring that is let go pulls by more, and swings back past a level gravity away.
bool overshoots(const Blocks& blocks, const Plateau& first, const Plateau& second) {
    constexpr double most = standard_gravity, deviations = 4.0;
    const double allowed = most + deviations * blocks.quiet;
    const double low = std::min(first.level, second.level) - allowed,
                 high = std::max(first.level, second.level) + allowed;
    const auto way = blocks.means.subspan(first.end, second.begin - std::min(first.end, second.begin));
    return std::any_of(way.begin(), way.end(), [&](double value) { return value < low || value > high; });
}

/// Whether the sensor goes from a hold to free fall within the time in which a hand or magnet lets go, and
/// was held for longer than that: crest and trough of a swing that lie 1 g apart are each shorter than the
/// way from one to the other, or bend towards each other.
bool lets_go(const Blocks& blocks, const Plateau& hold, const Plateau& fall) {
    constexpr double longest_s = 0.06, held_longer = 1.5;
    const double gap = static_cast<double>(fall.begin - std::min(fall.begin, hold.end));
    const double held = static_cast<double>(hold.end - hold.begin);
    return like_gravity(fall.level - hold.level) && gap * blocks.step_s < longest_s &&
           held > held_longer * gap && !bend_together(blocks, hold, fall) && !overshoots(blocks, hold, fall);
}

bool at_level_of(const Flight& flight, const Plateau& plateau) {
    return std::abs(plateau.level - flight.level) < 0.5 * tolerance * standard_gravity;
}

std::vector<Fall> falls_of_acceleration(const Blocks& blocks) {
    const std::vector<Plateau> plateaus = plateaus_of(blocks);
    std::vector<Fall> all;
    for (std::size_t i = 0; i < plateaus.size(); ++i) {
        const Plateau& plateau = plateaus[i];
        if (i > 0 && lets_go(blocks, plateaus[i - 1], plateau) &&
            (all.empty() || at_level_of(all.front().flights.front(), plateau))) {
            const double hold_level = plateaus[i - 1].level;
            all.push_back({{to_flight(blocks, plateau)}, plateau.level > hold_level ? 1.0 : -1.0, true});
            continue;
        }
        if (i == 0 && plateau.begin <= 1 && plateaus.size() > 1) {
            // Triggered in the fall: the rest at the end tells what gravity is.
            const double rest = plateaus.back().level;
            const bool whole = static_cast<double>(plateau.end - plateau.begin) * blocks.step_s < 1.0;
            if (whole && like_gravity(plateau.level - rest))
                all.push_back({{to_flight(blocks, plateau)}, plateau.level > rest ? 1.0 : -1.0, false});
            continue;
        }
        if (!all.empty() && at_level_of(all.back().flights.front(), plateau))
            all.back().flights.push_back(to_flight(blocks, plateau));
    }
    return all;
}

}  // namespace

std::vector<Fall> find_falls(const Pyramid& pyramid, double rate_hz, MeasuredQuantity quantity) {
    const bool acceleration = quantity == MeasuredQuantity::acceleration;
    if (!acceleration && quantity != MeasuredQuantity::displacement && quantity != MeasuredQuantity::velocity)
        return {};
    const Blocks blocks = blocks_of(pyramid, rate_hz, quantity == MeasuredQuantity::displacement);
    // Slower sampling shows a fall in too few values.
    if (blocks.step_s > 4.0 * block_s || blocks.means.size() < 2 * blocks.window) return {};
    return acceleration ? falls_of_acceleration(blocks) : falls_of_motion(blocks);
}

}  // namespace ringwright::event_search
