#include "event/rivals.hpp"

#include <algorithm>
#include <cmath>
#include <numbers>

namespace ringwright::event_search {
namespace {

/// Height at the share u of its duration, 0 before it.
using Path = double (*)(double u);

double straight(double u) {
    return std::clamp(u, 0.0, 1.0);
}
double half_cosine(double u) {
    return 0.5 - 0.5 * std::cos(std::numbers::pi * std::clamp(u, 0.0, 1.0));
}
/// Flash and Hogan, J. Neurosci. 5 (1985) 1688, equation 3.
double least_jerk(double u) {
    const double x = std::clamp(u, 0.0, 1.0);
    return x * x * x * (10.0 - 15.0 * x + 6.0 * x * x);
}
double half_sine(double u) {
    return std::sin(std::numbers::pi * std::clamp(u, 0.0, 1.0));
}
double half_sine_squared(double u) {
    return half_sine(u) * half_sine(u);
}
/// Logarithmic creep, which never ends; a tenth of the duration is its own time.
double creep(double u) {
    return std::log1p(10.0 * std::max(u, 0.0));
}

/// A path of this begin and duration in points; where `creep_time` is not 0 the article creeps on from its
/// end, logarithmically with that own time as a share of the duration.
struct Way {
    Path path = straight;
    double begin = 0.0, duration = 1.0, creep_time = 0.0;

    [[nodiscard]] double path_at(std::size_t point) const {
        return path((static_cast<double>(point) - begin) / duration);
    }
    [[nodiscard]] double creep_at(std::size_t point) const {
        if (creep_time == 0.0) return 0.0;
        const double after = (static_cast<double>(point) - begin) / duration - 1.0;
        return std::log1p(std::max(after, 0.0) / creep_time);
    }
};

/// Least squares of a + b·path + c·creep, c only in the direction of b.
struct Heights {
    double path = 0.0, creep = 0.0, sum = 0.0;  ///< the sum: residual sum of squares
};

Heights heights_of(std::span<const double> points, const Way& way) {
    double g1 = 0.0, gg = 0.0, y1 = 0.0, gy = 0.0, yy = 0.0, c1 = 0.0, cc = 0.0, cg = 0.0, cy = 0.0;
    for (std::size_t k = 0; k < points.size(); ++k) {
        const double g = way.path_at(k), c = way.creep_at(k), y = points[k] - points[0];
        g1 += g, gg += g * g, y1 += y, gy += g * y, yy += y * y;
        c1 += c, cc += c * c, cg += c * g, cy += c * y;
    }
    const auto n = static_cast<double>(points.size());
    gg -= g1 * g1 / n, gy -= g1 * y1 / n, yy -= y1 * y1 / n;
    cc -= c1 * c1 / n, cg -= c1 * g1 / n, cy -= c1 * y1 / n;
    Heights heights;
    heights.path = gg > 1e-9 * n ? gy / gg : 0.0;
    const double determinant = gg * cc - cg * cg;
    if (determinant > 1e-9 * n * n) {
        const double creep = (gg * cy - cg * gy) / determinant, path = (cc * gy - cg * cy) / determinant;
        if (creep * path > 0.0) heights.path = path, heights.creep = creep;
    }
    heights.sum = yy - heights.path * (2.0 * gy - heights.path * gg) -
                  heights.creep * (2.0 * cy - heights.creep * cc) + 2.0 * heights.path * heights.creep * cg;
    return heights;
}

struct PathFit {
    Way way;
    double sum = -1.0;  ///< residual sum of squares
};

void improve(std::span<const double> points, PathFit& best, double begin, double duration) {
    const Way way{best.way.path, begin, duration, best.way.creep_time};
    const double sum = heights_of(points, way).sum;
    if (best.sum < 0.0 || sum < best.sum) best = {way, sum};
}

/// The least about where it is by a pattern search.
void refine(std::span<const double> points, PathFit& best) {
    constexpr int most_steps = 60;
    int steps = 0;
    for (double step = 0.05; step > 1e-3 && steps < most_steps; ++steps) {
        const PathFit from = best;
        for (const double share : {step, -step}) {
            const double begin = from.way.begin, duration = from.way.duration, moved = share * duration;
            improve(points, best, begin + moved, duration);
            improve(points, best, begin, duration + moved);
            improve(points, best, begin + moved, duration - moved);
            improve(points, best, begin - 0.5 * moved, duration + moved);
        }
        if (!(best.sum < from.sum)) step *= 0.5;
    }
}

/// The least over begin and duration: a grid, then a pattern search.
PathFit fit_path(std::span<const double> points, Path path) {
    const auto n = static_cast<double>(points.size());
    PathFit best{{path}};
    for (double d = 0.15 * n; d < 2.0 * n; d *= 1.15)
        for (double b = -0.9 * d; b < 0.9 * n; b += 0.06 * d) improve(points, best, b, d);
    refine(points, best);
    return best;
}

PathFit fit_best_path(std::span<const double> points) {
    PathFit best = fit_path(points, straight);
    for (const Path path : {half_cosine, least_jerk, half_sine, half_sine_squared, creep}) {
        const PathFit fit = fit_path(points, path);
        if (fit.sum < best.sum) best = fit;
    }
    return best;
}

/// The best of the paths of a hand after each of which the article creeps on.
PathFit fit_path_and_creep(std::span<const double> points) {
    PathFit best;
    for (const Path path : {straight, half_cosine, least_jerk})
        for (const double time : {0.15, 0.5, 1.5}) {
            const auto n = static_cast<double>(points.size());
            PathFit fit{{path, 0.0, 1.0, time}};
            for (double d = 0.1 * n; d < 0.9 * n; d *= 1.25)
                for (double b = -0.3 * d; b + d < 0.9 * n; b += 0.12 * d) improve(points, fit, b, d);
            refine(points, fit);
            if (best.sum < 0.0 || fit.sum < best.sum) best = fit;
        }
    return best;
}

/// Number of points over the correlation length of what the path leaves unexplained.
double independent_values(std::span<const double> points, const PathFit& fit) {
    const Heights heights = heights_of(points, fit.way);
    std::vector<double> left(points.size());
    double mean = 0.0;
    const auto n = static_cast<double>(points.size());
    for (std::size_t k = 0; k < points.size(); ++k) {
        left[k] = points[k] - heights.path * fit.way.path_at(k) - heights.creep * fit.way.creep_at(k);
        mean += left[k] / n;
    }
    double last = 0.0, products = 0.0, squares = 0.0;
    for (const double value : left) {
        const double r = value - mean;
        products += r * last, squares += r * r, last = r;
    }
    const double rho = squares > 0.0 ? std::clamp(products / squares, 0.0, 0.95) : 0.0;
    return n * (1.0 - rho) / (1.0 + rho);
}

/// The blocks about the start of a decay that are compared with a path: [first, begin) before it, [begin,
/// end) of it and its rest.
struct Look {
    std::span<const double> means;
    std::size_t level = 0, first = 0, begin = 0, end = 0;
    [[nodiscard]] bool nothing_before() const { return begin < first + 4; }
    [[nodiscard]] std::span<const double> before() const { return means.subspan(first, begin - first); }
    [[nodiscard]] std::span<const double> after() const { return means.subspan(begin, end - begin); }
    [[nodiscard]] std::span<const double> whole() const {
        return nothing_before() ? after() : means.subspan(first, end - first);
    }
};

Look look_about(const Pyramid& pyramid, const Found& found, double length, double before) {
    Look look;
    while (look.level + 1 < pyramid.levels() &&
           (length + before) / std::ldexp(1.0, static_cast<int>(look.level)) > 140.0)
        ++look.level;
    look.means = pyramid.level(look.level);
    look.begin = (found.begin() + (std::size_t{1} << look.level) - 1) >> look.level;
    const auto back = static_cast<std::size_t>(before) >> look.level;
    look.first = std::max(look.begin > back ? look.begin - back : 0, found.quiet_end >> look.level);
    const auto ahead = static_cast<std::size_t>(2.0 * length) >> look.level;
    look.end = std::min({look.begin + std::max<std::size_t>(8, ahead), look.means.size(),
                         found.course.rest_end >> look.level});
    return look;
}

/// Positions of the series over which the path of the whole look runs.
SampleRange span_of(const Look& look, const PathFit& path) {
    const double first = static_cast<double>(look.nothing_before() ? look.begin : look.first);
    const auto position = [&](double block) {
        const double at = std::clamp(first + block, 0.0, static_cast<double>(look.means.size()));
        return static_cast<std::size_t>(at) << look.level;
    };
    return {position(path.way.begin), position(path.way.begin + path.way.duration)};
}

/// What a rival of the decay costs and can show.
struct Rivalry {
    /// Numbers that it has less to choose than the decay.
    double fewer = 0.0;
    /// What the likeliest of the rivals leaves of a release, rms, as a share of the height.
    double least_misfit = 0.0;
};

/// Whether the rival explains the look as well as the decay does, which leaves this sum of squares there
/// (with a path before it).
bool is_as_likely(const Look& look, const Found& found, const PathFit& rival, double decay,
                  const Rivalry& rivalry) {
    // A path that leaves a tenth less, by this much of twice the log likelihood, is one.
    constexpr double plainly_better = 0.9, surprising = 12.0;
    // Where the two can be told apart, the decay has to be likelier by as many halves of ln n as it has
    // numbers more to choose (Schwarz 1978); by half of what a release would give where that is less. A decay
    // that leaves no plateau may well begin on the path.
    constexpr double tells_from_rest = 1.0, tells_from_motion = 0.7, tells_alone = 3.0;
    const double values = independent_values(look.whole(), rival);
    // Twice the gain in log likelihood of as many independent values as the residuals amount to.
    const double gain = values * std::log(std::max(rival.sum, 1e-12 * decay) / decay);
    if (rival.sum < plainly_better * decay && gain < -surprising) return true;
    const double misfit = rivalry.least_misfit * found.start.amplitude;
    const double hoped =
        values * std::log1p(misfit * misfit * static_cast<double>(look.whole().size()) / decay);
    const double unit = std::log(std::max(values, std::numbers::e));
    const double tells = look.nothing_before()   ? tells_alone
                         : found.start.from_rest ? tells_from_rest
                                                 : tells_from_motion;
    return hoped >= tells * unit && gain <= std::min(0.5 * rivalry.fewer * unit, 0.5 * hoped);
}

/// Where the path runs that explains the look as well as a path and a decay after it do; nothing when none
/// does.
std::optional<SampleRange> path_through(const Look& look, const Found& found) {
    // Least squares on the noise-free release: of a damping ratio of 0.7 for a path, 1.5 to 3 times as much
    // at any other.
    constexpr Rivalry with_path{6.0, 0.015}, alone{1.0, 0.015}, with_creep{4.0, 0.007};
    if (look.begin + 6 > look.end) return {};
    double decay =
        fit_amplitudes(look.after(), at_level(found.start.shape, 0, look.level)).residual_sum + 1e-300;
    if (!look.nothing_before()) decay += fit_best_path(look.before()).sum;
    const PathFit path = fit_best_path(look.whole());
    if (is_as_likely(look, found, path, decay, look.nothing_before() ? alone : with_path))
        return span_of(look, path);
    if (look.nothing_before()) return {};
    const PathFit creeping = fit_path_and_creep(look.whole());
    if (is_as_likely(look, found, creeping, decay, with_creep)) return span_of(look, creeping);
    return {};
}

}  // namespace

std::optional<SampleRange> hand_or_pulse(const Pyramid& pyramid, const Found& found) {
    const auto length = static_cast<double>(std::max<std::size_t>(8, found.end() - found.begin()));
    const double before = std::min(std::max(1.5 * length, 1.5 * found.cycle()), 4.0 * length);
    // A look that begins shortly before shows the path alone where the hand moved more than once.
    if (const auto path = path_through(look_about(pyramid, found, length, before), found)) return path;
    return path_through(look_about(pyramid, found, length, 0.5 * length), found);
}

namespace {

/// Whether the onset lies about the brief decay and rings on at a slower rate with a good part of its energy.
bool outlives(const Onset& onset, const Found& brief) {
    constexpr double rings = 0.3, plain = 10.0, fewest_cycles = 1.5, share = 0.15, slower = 0.4;
    constexpr double beyond_doubt = 100.0, fewest_then = 1.2;
    const DecayShape shape = at_level(onset.fit.shape, onset.level, 0);
    const double rate = brief.start.shape.slow_rate();
    if (shape.damping_ratio > rings || shape.decay_rate() > slower * rate) return false;
    const double cycle = 2.0 * std::numbers::pi / shape.undamped_angular_frequency;
    const double seen = std::ldexp(static_cast<double>(onset.fit.points), static_cast<int>(onset.level));
    const double explained = onset.fit.explained_ratio();
    if (explained < plain || seen < (explained < beyond_doubt ? fewest_cycles : fewest_then) * cycle)
        return false;
    const auto begin = static_cast<double>(onset.fit_block << onset.level);
    if (begin + cycle < static_cast<double>(brief.begin()) ||
        begin > static_cast<double>(brief.course.rest_end) + cycle)
        return false;
    // ∫ A² e^(−2rt) dt = A²/2r.
    const double energy = brief.start.amplitude * brief.start.amplitude / rate;
    return onset.amplitude * onset.amplitude / shape.decay_rate() > share * energy;
}

}  // namespace

bool shows_one_swing(const Found& found) {
    constexpr double few_cycles = 2.0;
    return !found.start.shape.rings() ||
           static_cast<double>(found.end() - found.begin()) <= few_cycles * found.cycle();
}

namespace {

/// Distances from the rest position of a decay, on the side of its start.
struct Distances {
    std::span<const double> means;
    double rest = 0.0, sign = 1.0, noise = 0.0;
    std::size_t start = 0;  ///< block
    double height = 0.0;    ///< at the start
    [[nodiscard]] double at(std::size_t block) const { return sign * (means[block] - rest); }
};

Distances distances_of(const Pyramid& pyramid, const Found& found) {
    constexpr double late = 0.25;  // cycles by which the start may come after the release
    const Start& start = found.start;
    Distances away{pyramid.level(start.level), start.fit.offset, 1.0, start.fit.residual_rms()};
    away.start = std::min(start.position >> start.level, away.means.size() - 1);
    if (away.at(away.start) < 0.0) away.sign = -1.0;
    away.height = std::max(start.amplitude, away.at(away.start));
    const std::size_t near = 1 + (static_cast<std::size_t>(std::ceil(late * found.cycle())) >> start.level);
    for (std::size_t k = away.start > near ? away.start - near : 0; k < away.start; ++k)
        away.height = std::max(away.height, away.at(k));
    return away;
}

constexpr double at_rest = 0.3;  // of the height at the start

/// Blocks from the last one at rest to the start.
std::size_t blocks_away_before(const Distances& away) {
    std::size_t k = away.start;
    while (k > 0 && away.at(k - 1) >= at_rest * away.height) --k;
    return away.start - k;
}

bool was_farther(const Distances& away) {
    // A hand that pulls may well yield a little before it lets go.
    constexpr double farther = 1.4, noise_margin = 4.0;
    double farthest = 0.0;
    for (std::size_t k = away.start - blocks_away_before(away); k < away.start; ++k)
        farthest = std::max(farthest, away.at(k));
    return farthest > farther * away.height + noise_margin * away.noise;
}

bool ends_beyond(const Distances& away, std::size_t rest_end) {
    if (blocks_away_before(away) < away.start || rest_end + 8 > away.means.size()) return false;
    // Half of what comes then leaves the first step its time.
    const std::size_t since = rest_end + (away.means.size() - rest_end) / 2;
    for (std::size_t k = since; k < away.means.size(); ++k)
        if (away.at(k) > -at_rest * away.height) return false;
    return true;
}

}  // namespace

namespace {

/// Block means of a decay, and the way from each to the third behind it, in the direction of the whole.
struct Ways {
    std::span<const double> means;
    std::vector<double> moves;
    double sign = 1.0;

    /// From one block to another, in the direction of the whole.
    [[nodiscard]] double between(std::size_t from, std::size_t to) const {
        return sign * (means[to] - means[from]);
    }
};

constexpr std::size_t blocks_of_a_move = 3;

Ways ways_of(const Pyramid& pyramid, const Found& found) {
    constexpr double blocks = 100.0;
    const auto length = static_cast<double>(found.end() - found.begin());
    std::size_t level = 0;
    while (level + 1 < pyramid.levels() && std::ldexp(length, -static_cast<int>(level)) > blocks) ++level;
    Ways ways;
    const std::span<const double> all = pyramid.level(level);
    const std::size_t begin = found.begin() >> level, end = std::min(found.end() >> level, all.size());
    if (begin + 6 * blocks_of_a_move > end) return ways;
    ways.means = all.subspan(begin, end - begin);
    if (ways.means.back() < ways.means.front()) ways.sign = -1.0;
    for (std::size_t k = 0; k + blocks_of_a_move < ways.means.size(); ++k)
        ways.moves.push_back(ways.between(k, k + blocks_of_a_move));
    return ways;
}

/// The quietest quarter of the moves: larger where it stays nowhere, or noise hides that it does.
double quiet_move(const Ways& ways) {
    std::vector<double> sizes;
    for (const double move : ways.moves) sizes.push_back(std::abs(move));
    const auto quarter = sizes.begin() + static_cast<std::ptrdiff_t>(sizes.size() / 4);
    std::nth_element(sizes.begin(), quarter, sizes.end());
    return *quarter;
}

/// Whether it moves, stays and moves on the same way as fast as before, as a hand or a jack lowers an
/// article: a decay is slower each time it comes the same way.
bool goes_in_steps(const Pyramid& pyramid, const Found& found) {
    constexpr double as_fast = 0.5, stays = 0.15, plainly = 8.0, good_part = 0.15;
    const Ways ways = ways_of(pyramid, found);
    if (ways.moves.empty()) return false;
    const double fastest = *std::max_element(ways.moves.begin(), ways.moves.end());
    if (fastest < plainly * quiet_move(ways)) return false;
    const std::size_t last = ways.means.size() - 1;
    const double least_way = good_part * ways.between(0, last);
    bool moved = false;
    std::size_t stayed = 0;
    for (std::size_t k = 0; k < ways.moves.size(); ++k) {
        const double move = ways.moves[k];
        const bool fast = move > as_fast * fastest;
        if (move < -stays * fastest) moved = false, stayed = 0;  // it swings back
        const double smaller_part = std::min(ways.between(0, k), ways.between(k, last));
        if (fast && stayed >= blocks_of_a_move && smaller_part > least_way) return true;
        if (fast) moved = true, stayed = 0;
        if (moved && std::abs(move) < stays * fastest) ++stayed;
    }
    return false;
}

}  // namespace

bool comes_down(const Pyramid& pyramid, const Found& found) {
    if (!shows_one_swing(found)) return false;
    const Distances away = distances_of(pyramid, found);
    return was_farther(away) || ends_beyond(away, found.course.rest_end >> found.start.level) ||
           goes_in_steps(pyramid, found);
}

bool is_outlived(const Pyramid& pyramid, const Found& found, const std::vector<Onset>& onsets) {
    if (found.start.from_rest || !shows_one_swing(found)) return false;
    const auto outlives_it = [&](const Onset& onset) { return outlives(onset, found); };
    if (std::any_of(onsets.begin(), onsets.end(), outlives_it)) return true;
    // A blow much higher than the answer hides it on every scale that begins with the blow.
    for (std::size_t level = found.start.level; level < pyramid.levels(); ++level) {
        const std::size_t block = (found.end() + (std::size_t{1} << level) - 1) >> level;
        const std::optional<Onset> onset = onset_at(pyramid, level, block);
        if (onset && outlives(*onset, found)) return true;
    }
    return false;
}

bool is_brief(const Found& found) {
    constexpr double few_cycles = 3.0;
    return static_cast<double>(found.end() - found.begin()) < few_cycles * found.cycle();
}

double swing_against_elsewhere(const Pyramid& pyramid, const Found& found, const std::vector<Found>& all,
                               const std::vector<SampleRange>& left_out) {
    constexpr double plenty = 1e9, long_look = 10.0;
    constexpr std::size_t fewest = 40;
    const std::size_t level = found.start.level;
    const std::span<const double> means = pyramid.level(level);
    const double cycle = found.cycle() / std::ldexp(1.0, static_cast<int>(level));
    const double length = static_cast<double>((found.end() - found.begin()) >> level);
    const auto lag = static_cast<std::size_t>(
        std::clamp(std::min(0.5 * cycle, length), 2.0, 0.1 * static_cast<double>(means.size()) + 2.0));
    // After a long decay another mode may die away later: what tells is the time before the first.
    const bool brief = is_brief(found);
    const std::size_t all_of_it = means.size() << level;
    const auto inside = [&](std::size_t k) {
        const auto covers = [&](std::size_t begin, std::size_t end) {
            return k + lag >= begin >> level && k <= end >> level;
        };
        return std::any_of(all.begin(), all.end(),
                           [&](const Found& f) { return covers(f.begin(), brief ? f.end() : all_of_it); }) ||
               std::any_of(left_out.begin(), left_out.end(),
                           [&](const SampleRange& range) { return covers(range.begin, range.end); });
    };
    std::vector<double> swings;
    for (std::size_t k = 0; k + lag < means.size(); ++k)
        if (!inside(k)) swings.push_back(std::abs(means[k + lag] - means[k]));
    const auto needed = brief ? 0.0 : long_look * cycle;
    if (swings.size() < fewest || static_cast<double>(swings.size()) < needed) return plenty;
    const auto quartile = swings.begin() + static_cast<std::ptrdiff_t>(swings.size() * 3 / 4);
    std::nth_element(swings.begin(), quartile, swings.end());
    double largest = 0.0;
    const std::size_t end = std::min(means.size(), (found.end() >> level) + 1);
    for (std::size_t k = found.begin() >> level; k < end && k + lag < means.size(); ++k)
        largest = std::max(largest, std::abs(means[k + lag] - means[k]));
    largest = std::max(largest, std::min(found.start.amplitude, 2.0 * largest));
    return *quartile > 0.0 ? largest / *quartile : plenty;
}

}  // namespace ringwright::event_search
