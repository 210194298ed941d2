#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <numbers>

#include "event/beat.hpp"
#include "event/by_hand.hpp"
#include "event/drops.hpp"
#include "event/found.hpp"
#include "event/health.hpp"
#include "event/hum.hpp"
#include "event/joint_start.hpp"
#include "event/long_search.hpp"
#include "event/plateau.hpp"
#include "event/rivals.hpp"
#include "event/second_hit.hpp"
#include "event/spectrum.hpp"
#include "event/whole_drop.hpp"
#include "ringwright/error.hpp"
#include "ringwright/event.hpp"

namespace ringwright {
namespace event_search {

double Found::cycle() const {
    return 2.0 * std::numbers::pi / start.shape.undamped_angular_frequency;
}

namespace {

constexpr std::size_t shortest_recording = 16;
/// Amplitude against noise of a decay that is worth reporting.
constexpr double least_amplitude = 3.0;
/// The same against all that the rest shows, slow wandering included.
constexpr double least_amplitude_in_rest = 4.0;
/// The swing of a decay against those that the recording shows elsewhere.
constexpr double least_swing_against_elsewhere = 4.0;
/// What the decay may leave unexplained over its first cycle, as a share of its height: of a long decay
/// (other modes ring along), of a short one (it has little else to show), of one that looks like a mere
/// pulse.
constexpr double misfit_of_long = 0.125, misfit_of_short = 0.06, misfit_of_pulse = 0.02;
/// Of ln amplitude, before something else interrupts a decay that does not ring.
constexpr double least_fall_of_creeping = 1.5;
/// Samples between the start and the noise: position moves smoothly, acceleration may jump.
constexpr std::size_t shortest_decay = 8, shortest_decay_of_position = 5;
/// The same of an acceleration that does not ring on: fewer are what a knock leaves.
constexpr std::size_t shortest_blow = 14;

bool shows_position(MeasuredQuantity quantity) {
    return quantity == MeasuredQuantity::displacement || quantity == MeasuredQuantity::angle;
}

bool shows_acceleration(MeasuredQuantity quantity) {
    return quantity == MeasuredQuantity::acceleration || quantity == MeasuredQuantity::angular_acceleration;
}

struct Search {
    const Recording& recording;
    const Series& series;
    const Pyramid& pyramid;
    std::optional<TestKind> kind;  ///< as the user said
    bool mode_meant = false;       ///< the user means one of many modes
    std::vector<Found> found;
    std::vector<RefusedFall> refused;
    std::vector<SampleRange> paths = {};  ///< of a hand, or pulses
    bool steady = false;                  ///< something rang and did not fall
    double mains_hz = 0.0;                ///< hum that was taken for a decay
};

/// The end of a clipped stretch that holds the position, or that lies within a cycle after it.
std::size_t after_clipping(const Search& search, std::size_t position, double cycle) {
    std::size_t earliest = 0;
    for (const SampleRange& range : search.recording.clipped) {
        const std::size_t begin = search.series.position_of(range.begin),
                          end = search.series.position_of(range.end);
        if (static_cast<double>(begin) > static_cast<double>(std::max(position, earliest)) + 1.5 * cycle)
            break;
        if (static_cast<double>(end) + cycle > static_cast<double>(position)) earliest = end;
    }
    return earliest;
}

bool in_refused_fall(const Search& search, std::size_t position) {
    return std::any_of(search.refused.begin(), search.refused.end(), [&](const RefusedFall& fall) {
        return position >= fall.begin && position < fall.end;
    });
}

bool taken(const Search& search, const Onset& onset) {
    if (in_refused_fall(search, onset.position)) return true;
    const std::size_t reach = std::size_t{4} << onset.level;
    return std::any_of(search.found.begin(), search.found.end(), [&](const Found& f) {
        const std::size_t margin = std::max(reach, static_cast<std::size_t>(f.cycle()));
        return onset.position + margin >= f.since() && onset.position < f.course.rest_end;
    });
}

/// Where another event begins for what lies before it: in an acceleration the blow, which may be thirty times
/// as high as its answer and is over within half a cycle of that, is no noise of an earlier decay.
std::size_t before_blow(const Search& search, const Found& event) {
    constexpr double longest = 0.5;  // cycles
    if (!shows_acceleration(search.recording.quantity) || event.is_drop()) return event.since();
    return event.since() -
           static_cast<std::size_t>(std::min(longest * event.cycle(), static_cast<double>(event.since())));
}

StartLimits limits_for(const Search& search, const Onset& onset) {
    StartLimits limits;
    limits.displacement = shows_position(search.recording.quantity);
    limits.drop = search.kind == TestKind::drop;
    limits.latest = search.series.size();
    for (const Found& other : search.found) {
        if (other.begin() > onset.position) {
            limits.latest = std::min(limits.latest, before_blow(search, other));
        } else {
            limits.earliest = std::max(limits.earliest, other.course.rest_end);
        }
    }
    const double cycle = 2.0 * std::numbers::pi / onset.fit.shape.undamped_angular_frequency *
                         static_cast<double>(std::size_t{1} << onset.level);
    limits.earliest = std::max(limits.earliest, after_clipping(search, onset.position, cycle));
    return limits;
}

/// The onset of the last hit, where a second one follows within the first cycles of the decay.
std::optional<Onset> last_hit(const Pyramid& pyramid, const Onset& onset, std::size_t level,
                              std::size_t first, const DecayShape& shape) {
    const std::optional<std::size_t> after = after_second_hit(pyramid.level(level), first, shape);
    if (!after) return {};
    Onset hit = onset;
    hit.fit.shape = at_level(shape, level, onset.level);
    hit.position = *after << level;
    hit.block = hit.position >> onset.level;
    hit.fit_block = hit.block;
    return hit;
}

/// Whether what follows a start may hold a second hit that the decay begins after.
enum class SecondHits { looked_for, ignored };

/// The start after the last hit; sets `hit_seen` where there is a second one.
std::optional<Start> locate_last_start(const Search& search, const Onset& onset, const StartLimits& limits,
                                       SecondHits second_hits, bool& hit_seen) {
    if (limits.drop || second_hits == SecondHits::ignored) return locate_start(search.pyramid, onset, limits);
    const std::optional<Onset> hit =
        last_hit(search.pyramid, onset, onset.level, onset.fit_block, onset.fit.shape);
    if (hit) hit_seen = true;
    std::optional<Start> start = locate_start(search.pyramid, hit.value_or(onset), limits);
    if (!start) return {};
    const std::size_t first = std::max(start->position >> start->level, start->fit_block);
    const std::optional<Onset> later = last_hit(search.pyramid, onset, start->level, first, start->fit.shape);
    if (!later) return start;
    hit_seen = true;
    const std::optional<Start> again = locate_start(search.pyramid, *later, limits);
    return again && again->position > start->position ? again : start;
}

/// Whether the start is looked for a second time, with the noise that the rest shows.
enum class Looks { one, two };

/// Start and course. Sets `hit_seen` where a second hit makes the start another one than without looking for
/// it.
std::optional<Found> follow_onset(const Search& search, const Onset& onset, StartLimits limits,
                                  SecondHits second_hits, bool& hit_seen, Looks looks = Looks::two) {
    std::optional<Start> start = locate_last_start(search, onset, limits, second_hits, hit_seen);
    if (!start || start->position + 8 > limits.latest) return {};
    // What does not stand out of the noise is not worth following through a long recording.
    if (start->amplitude < 0.8 * least_amplitude * start->noise_rms) return {};
    Course course = follow_decay(search.pyramid, *start, limits.latest);
    if (course.reaches_noise && looks == Looks::two) {
        limits.rest = SampleRange{course.end, course.rest_end};
        if (std::optional<Start> again = locate_last_start(search, onset, limits, second_hits, hit_seen)) {
            if (again->position + 8 <= limits.latest) {
                start = again;
                course = follow_decay(search.pyramid, *start, limits.latest);
            }
        }
    }
    if (rings_on_a_tail(search.pyramid, onset, *start, limits))
        course = follow_decay(search.pyramid, *start, limits.latest);
    // Among many modes two do not explain the recording.
    if (!search.mode_meant && start->noise_rms > misfit_of_short * start->amplitude)
        explained_by_two(search.pyramid, *start, course.rest_end);
    if (!search.mode_meant) go_back_jointly(search.pyramid, *start, limits);
    return Found{*start, course, 0, 0, {}, {}, false};
}

/// Standard deviation of single values in the rest: of the quieter among its pieces, since a stray knock in
/// it is no noise. 0 when there is no rest.
double rest_rms(std::span<const double> values, const Course& course, std::size_t pieces = 12) {
    constexpr std::size_t shortest = 16, longest = 20000;
    if (!course.reaches_noise || course.rest_end < course.end + shortest) return 0.0;
    const std::size_t rest = course.rest_end - course.end;
    const std::size_t length = std::min(longest, std::max(shortest, rest / pieces));
    std::vector<double> deviations;
    for (std::size_t k = course.end; k + length <= course.rest_end; k += std::max(length, rest / pieces)) {
        double sum = 0.0, squares = 0.0;
        for (std::size_t i = k; i < k + length; ++i) {
            const double y = values[i] - values[k];
            sum += y, squares += y * y;
        }
        const auto n = static_cast<double>(length);
        deviations.push_back(std::sqrt(std::max(0.0, (squares - sum * sum / n) / (n - 1.0))));
    }
    const auto at = deviations.begin() + static_cast<std::ptrdiff_t>(deviations.size() / 3);
    std::nth_element(deviations.begin(), at, deviations.end());
    return *at;
}

/// The same of noise that may wander more slowly than those pieces show: what it does within a third of the
/// rest counts.
double rms_of_slow_noise(std::span<const double> values, const Course& course) {
    constexpr std::size_t long_pieces = 3;
    return std::max(rest_rms(values, course), rest_rms(values, course, long_pieces));
}

double range_of(std::span<const double> values) {
    const auto [low, high] = std::minmax_element(values.begin(), values.end());
    return *high - *low;
}

/// Whether a way up and down again stays above seven tenths of its top for more than five times as long as it
/// falls from there to three tenths: half a sine stays there for 3.4 times as long (arithmetic), a pulse with
/// round feet for less.
bool is_held(std::span<const double> way, double rest, double top, double sign) {
    constexpr double at_top = 0.7, fallen = 0.3;
    constexpr std::size_t longer = 5;
    const auto last_above = [&](double share) {
        std::size_t last = way.size();
        while (last > 0 && sign * (way[last - 1] - rest) < share * top) --last;
        return last;
    };
    const std::size_t leaves = last_above(at_top), falls = last_above(fallen);
    std::size_t held = 0;
    while (held < leaves && sign * (way[leaves - 1 - held] - rest) > at_top * top) ++held;
    return held > longer * (falls - leaves);
}

/// What stands above a share of the height about a place, and its top.
struct Bump {
    std::size_t first = 0, peak = 0, last = 0;
};

Bump bump_at(std::span<const double> values, std::size_t place, double rest, double sign, double least) {
    Bump bump{place, place, place};
    const auto above = [&](std::size_t k) { return sign * (values[k] - rest) > least; };
    while (bump.first > 0 && above(bump.first)) --bump.first;
    while (bump.last + 1 < values.size() && above(bump.last)) ++bump.last;
    for (std::size_t k = bump.first; k < bump.last; ++k)
        if (sign * values[k] > sign * values[bump.peak]) bump.peak = k;
    return bump;
}

/// Whether the start belongs to a pulse that fell in less than `ratio` times the time in which it rose.
bool on_a_pulse(std::span<const double> values, const Found& found, double height, double ratio) {
    // Where a blow falls into another motion than it left, its upper half shows its shape.
    constexpr double foot = 0.1, upper_half = 0.5;
    const double rest = found.start.fit.offset;
    const double sign = values[found.begin()] > rest ? 1.0 : -1.0;
    Bump bump = bump_at(values, found.begin(), rest, sign, foot * height);
    if (bump.first == 0) bump = bump_at(values, found.begin(), rest, sign, upper_half * height);
    const auto [first, peak, last] = bump;
    if (is_held(values.subspan(first, last - first), rest, sign * (values[peak] - rest), sign)) return false;
    if (first == 0 || found.begin() <= first + 1) return false;
    // A swing the other way just before makes it the answer to a blow, not the blow.
    const std::size_t before = 3 * (peak - first) + 3;
    for (std::size_t k = first > before ? first - before : 0; k < first; ++k)
        if (sign * (rest - values[k]) > 0.3 * height) return false;
    return static_cast<double>(last - peak) < ratio * static_cast<double>(peak - first);
}

/// Whether the recording leaves the decay before its start, as a release or a blow makes it do: a slow pull
/// that only ends like a decay does not.
bool abrupt(const Pyramid& pyramid, const Found& found) {
    const Start& start = found.start;
    if (start.from_rest) return true;
    const double cycle = 2.0 * std::numbers::pi / start.fit.shape.undamped_angular_frequency;
    const std::size_t first = std::max(start.position >> start.level, start.fit_block);
    const auto near = std::max<std::size_t>(1, static_cast<std::size_t>(0.1 * cycle));
    const auto far = std::max<std::size_t>(near + 1, static_cast<std::size_t>(0.25 * cycle));
    if (first < far + 1) return true;
    double left = 0.0;
    for (std::size_t k = first - far; k < first - near; ++k) {
        const double t = static_cast<double>(k) - static_cast<double>(start.fit_block);
        left +=
            std::abs(pyramid.level(start.level)[k] - start.fit.value_at(t)) / static_cast<double>(far - near);
    }
    return left > std::max(0.3 * start.amplitude, 2.0 * start.fit.residual_rms());
}

/// Whether an acceleration jumps within a cycle before the start by the height of what follows, as a release
/// makes it do. A damper that is softer one way leads into the start as smoothly as the path of a hand.
bool jumps_before(std::span<const double> values, const Found& found, double height) {
    constexpr double finely_sampled = 24.0;  // samples a cycle: a swing moves by less in two of them
    if (found.cycle() < finely_sampled) return false;
    const auto cycle = static_cast<std::size_t>(std::min(found.cycle(), 1e15));
    for (std::size_t k = found.begin() > cycle ? found.begin() - cycle : 0; k + 2 <= found.begin(); ++k)
        if (std::abs(values[k + 2] - values[k]) > height) return true;
    return false;
}

/// Standard deviation about a straight line of all of the rest.
double spread_of_rest(std::span<const double> values, const Course& course) {
    constexpr std::size_t shortest = 16, looks = 20000;
    if (!course.reaches_noise || course.rest_end < course.end + shortest) return 0.0;
    const std::size_t step = std::max<std::size_t>(1, (course.rest_end - course.end) / looks);
    double n = 0.0, x1 = 0.0, xx = 0.0, y1 = 0.0, xy = 0.0, yy = 0.0;
    for (std::size_t k = course.end; k < course.rest_end; k += step) {
        const double x = static_cast<double>(k - course.end), y = values[k] - values[course.end];
        n += 1.0, x1 += x, xx += x * x, y1 += y, xy += x * y, yy += y * y;
    }
    const double joint = xy - x1 * y1 / n, spread = xx - x1 * x1 / n;
    return std::sqrt(std::max(0.0, yy - y1 * y1 / n - joint * joint / spread) / (n - 2.0));
}

/// Whether one free decay explains what follows the start: not a pulse, a filter's answer or a wiggle of
/// noise.
bool believable(const Search& search, const Found& found) {
    const Start& start = found.start;
    const std::span<const double> values = search.series.values();
    const std::size_t cycle = static_cast<std::size_t>(std::min(found.cycle(), 1e15)) + 8;
    const std::size_t stop = std::min({values.size(), found.begin() + cycle, found.course.rest_end});
    const bool position = shows_position(search.recording.quantity);
    if (found.course.end < found.begin() + (position ? shortest_decay_of_position : shortest_decay))
        return false;
    if (!found.course.reaches_noise && start.shape.damping_ratio < 0.5 &&
        static_cast<double>(found.course.rest_end - found.begin()) < 1.2 * found.cycle())
        return false;
    const double height = range_of(values.subspan(found.begin(), stop - found.begin()));
    if (start.amplitude > 3.0 * height || start.amplitude < least_amplitude * start.noise_rms) return false;
    const double cycles = static_cast<double>(found.course.end - found.begin()) / found.cycle();
    const double seen = static_cast<double>(found.course.rest_end - found.begin()) / found.cycle();
    if (found.course.rest_end < values.size() && start.shape.damping_ratio < 0.5 && seen < 2.0) return false;
    const bool cut_short = found.course.rest_end < values.size() && !found.course.reaches_noise;
    if (cut_short && seen < 1.5) return false;
    if (cut_short && !start.shape.rings() && found.course.fall < least_fall_of_creeping) return false;
    const double noise = rest_rms(values, found.course);
    const double amplitude = std::min(start.amplitude, height);
    double misfit = cycles < 3.0 && noise > 0.0 ? misfit_of_short : misfit_of_long;
    if (misfit == misfit_of_short && on_a_pulse(values, found, height, 2.0)) misfit = misfit_of_pulse;
    // After a blow the acceleration has the other sign: what falls with the sign of the blow is the blow.
    const bool blow = shows_acceleration(search.recording.quantity) && cycles < 2.0;
    if (blow && found.course.end < found.begin() + shortest_blow) return false;
    const bool jumped = shows_acceleration(search.recording.quantity) && jumps_before(values, found, height);
    if (cycles < 2.0 && !jumped && !abrupt(search.pyramid, found)) return false;
    if (amplitude < least_amplitude_in_rest * spread_of_rest(values, found.course)) return false;
    if (blow && on_a_pulse(values, found, height, 3.0)) return false;
    return start.noise_rms < std::max(misfit * amplitude, 2.5 * noise);
}

/// Whether the recording is still for two cycles before the start, or for most of one where it begins there:
/// a drive that has long been running would show all of its swing in that.
bool starts_from_quiet(const Pyramid& pyramid, const Found& found) {
    constexpr double still = 0.25;  // of the amplitude
    const Start& start = found.start;
    const std::span<const double> means = pyramid.level(start.level);
    const double cycle = 2.0 * std::numbers::pi / start.fit.shape.undamped_angular_frequency;
    const std::size_t end = start.position >> start.level;
    const auto near = static_cast<std::size_t>(std::ceil(0.2 * cycle)),
               enough = static_cast<std::size_t>(std::ceil(0.8 * cycle)),
               far = std::min(end, static_cast<std::size_t>(std::ceil(2.2 * cycle)));
    if (end < enough) return false;
    return range_of(means.subspan(end - far, far - near)) <
           2.0 * still * start.amplitude + 4.0 * start.fit.residual_rms();
}

/// Whether the decay is over within two cycles and begins, in motion, on a path that stood in for another
/// one.
bool on_known_path(const Search& search, const Found& found) {
    if (found.start.from_rest || static_cast<double>(found.end() - found.begin()) > 2.0 * found.cycle())
        return false;
    return std::any_of(search.paths.begin(), search.paths.end(), [&](const SampleRange& path) {
        return found.begin() >= path.begin && found.begin() < path.end;
    });
}

/// Whether it is a path or a pulse, which is then remembered.
bool follows_a_path(Search& search, const Found& found) {
    if (!shows_one_swing(found)) return false;
    const std::optional<SampleRange> path = hand_or_pulse(search.pyramid, found);
    if (path) search.paths.push_back(*path);
    return path.has_value();
}

/// Whether a decay follows that nothing else explains better.
bool convincing(Search& search, const Found& found, const std::vector<Onset>& all) {
    if (in_refused_fall(search, found.begin())) return false;
    if (on_known_path(search, found) || !believable(search, found)) return false;
    if (is_plateau_and_decay(search.pyramid, found, all) || is_outlived(search.pyramid, found, all))
        return false;
    if (shows_position(search.recording.quantity) && comes_down(search.pyramid, found)) return false;
    return !follows_a_path(search, found);
}

/// Where the noise of the rest moved the start on to the end of a swing that one decay explains but for a few
/// per cent, as another law of damping makes it do, and that end hardly stands out of the noise: the swing.
std::optional<Found> swing_before(Search& search, const Onset& onset, const StartLimits& limits,
                                  const Found& found, const std::vector<Onset>& all) {
    constexpr double later = 0.4;  // of a cycle
    const auto stands_out = [&](const Found& f) {
        return swing_against_elsewhere(search.pyramid, f, {f}, {}) >= least_swing_against_elsewhere;
    };
    if (!is_brief(found) || stands_out(found)) return {};
    bool hit_seen = false;
    std::optional<Found> swing =
        follow_onset(search, onset, limits, SecondHits::looked_for, hit_seen, Looks::one);
    if (!swing || !swing->course.reaches_noise) return {};
    const auto moved = static_cast<double>(found.begin()) - static_cast<double>(swing->begin());
    if (moved < later * swing->cycle() || !stands_out(*swing) || !convincing(search, *swing, all)) return {};
    return swing;
}

/// The decay from the last hit on; where that is none, from the first: a mass that comes to stick surprises
/// as a second hit does, and nothing rings after it.
std::optional<Found> follow_convincingly(Search& search, const Onset& onset, const StartLimits& limits,
                                         const std::vector<Onset>& all) {
    bool hit_seen = false;
    std::optional<Found> last = follow_onset(search, onset, limits, SecondHits::looked_for, hit_seen);
    if (!last) return {};
    if (convincing(search, *last, all)) {
        if (std::optional<Found> swing = swing_before(search, onset, limits, *last, all)) return swing;
        return last;
    }
    if (!hit_seen) return {};
    std::optional<Found> first = follow_onset(search, onset, limits, SecondHits::ignored, hit_seen);
    if (!first || !first->course.reaches_noise) return {};
    const auto later = static_cast<double>(last->begin()) - static_cast<double>(first->begin());
    if (later > 0.5 * first->cycle() && convincing(search, *first, all)) return first;
    return {};
}

void try_onset(Search& search, const Onset& onset, const std::vector<Onset>& all) {
    if (taken(search, onset)) return;
    const StartLimits limits = limits_for(search, onset);
    if (limits.latest <= onset.position + 12) return;
    // Most onsets of a noisy recording fail within a short look; only the others are followed to the end.
    constexpr double short_look = 300.0;  // cycles
    const double cycle = 2.0 * std::numbers::pi / onset.fit.shape.undamped_angular_frequency *
                         static_cast<double>(std::size_t{1} << onset.level);
    StartLimits near = limits;
    near.latest = std::min(limits.latest,
                           onset.position + static_cast<std::size_t>(std::min(short_look * cycle, 1e15)));
    std::optional<Found> found = follow_convincingly(search, onset, near, all);
    if (!found) return;
    if (near.latest < limits.latest) {
        found->course = follow_decay(search.pyramid, found->start, limits.latest);
        if (!believable(search, *found)) return;
    }
    const bool may_fall = found->course.fall > -3.0 * found->course.fall_uncertainty;
    const bool still = may_fall && starts_from_quiet(search.pyramid, *found);
    if (!found->course.falls() && !still) {
        search.steady = true;
        return;
    }
    search.found.push_back(std::move(*found));
}

/// What rings plainly from shortly after a blow on, on the scale that shows it best.
std::optional<Onset> answer_to(const Pyramid& pyramid, const Onset& blow) {
    constexpr double rings = 0.3, plain = 10.0;
    std::optional<Onset> best;
    for (std::size_t level = blow.level + 1; level < pyramid.levels(); ++level) {
        const std::optional<Onset> onset = onset_at(pyramid, level, (blow.position >> level) + 1);
        if (!onset || onset->fit.shape.damping_ratio > rings || onset->fit.explained_ratio() < plain)
            continue;
        if (!best || onset->score > best->score) best = onset;
    }
    return best;
}

/// A blow far higher than what answers it is all that shows where a second one follows soon.
void try_answers(Search& search, const std::vector<Onset>& onsets) {
    constexpr double blow = 0.5;     // damping ratio that a pulse seems to have, at least
    std::vector<std::size_t> tried;  // positions: one blow shows on several scales
    for (const Onset& onset : onsets) {
        if (onset.fit.shape.damping_ratio < blow || taken(search, onset)) continue;
        const std::optional<Onset> answer = answer_to(search.pyramid, onset);
        if (!answer || std::find(tried.begin(), tried.end(), answer->position) != tried.end()) continue;
        tried.push_back(answer->position);
        try_onset(search, *answer, onsets);
    }
}

/// A decay of two close modes is followed through its beats; what was found on their rises belongs to it.
void follow_beats(Search& search) {
    std::vector<Found> kept;
    for (Found& found : search.found) {
        if (!kept.empty() && kept.back().beats && found.begin() < kept.back().course.rest_end) continue;
        kept.push_back(std::move(found));
        Found& last = kept.back();
        if (last.is_drop() || search.mode_meant) continue;
        const std::optional<TwoTermFit> pair = find_beat(search.pyramid, last.start, search.series.size());
        if (!pair) continue;
        const std::optional<Course> course =
            follow_beat(search.pyramid, last.start, *pair, search.series.size());
        if (!course || course->end < last.course.end) continue;
        last.course = *course, last.beats = true;
        last.start.shape = at_level(pair->first, last.start.level, 0);
        last.start.companion = at_level(pair->second, last.start.level, 0);
    }
    search.found = std::move(kept);
}

const Found& found_of(const Found& found) {
    return found;
}
const Found& found_of(const Candidate& candidate) {
    return candidate.found;
}

/// One article does not both ring and creep: where something rings as strongly, what does not ring is the
/// hand, the impact or the sensor's own answer (an AC-coupled one to a held pull).
template <typename Holder>
void drop_unlike(std::vector<Holder>& holders) {
    constexpr double rings = 0.35, creeps = 0.7, as_strong = 0.3;
    double strongest = 0.0;
    for (const Holder& holder : holders)
        if (const Found& f = found_of(holder); f.start.shape.damping_ratio < rings)
            strongest = std::max(strongest, f.start.amplitude);
    std::erase_if(holders, [&](const Holder& holder) {
        const Found& f = found_of(holder);
        return f.start.shape.damping_ratio > creeps && strongest > as_strong * f.start.amplitude;
    });
}

/// Keeps of the weak ones only those that ring like the strongest: what stands out of the noise no more than
/// noise does, or moves unlike the article, is a hand or a knock. `noise_in_rest` gives the rms of the noise
/// in the rest of the one.
template <typename Holder, typename NoiseInRest>
void drop_weak(std::vector<Holder>& holders, NoiseInRest noise_in_rest) {
    constexpr double stands_out = 6.0;
    const auto weaker = [](const Holder& a, const Holder& b) {
        return found_of(a).start.amplitude < found_of(b).start.amplitude;
    };
    const auto strongest = std::max_element(holders.begin(), holders.end(), weaker);
    if (strongest == holders.end()) return;
    const double largest = found_of(*strongest).start.amplitude, noise = noise_in_rest(*strongest);
    const DecayShape like = found_of(*strongest).start.shape;
    std::erase_if(holders, [&](const Holder& holder) {
        const Found& f = found_of(holder);
        const double share = f.start.amplitude / largest;
        const double tune =
            std::abs(std::log(f.start.shape.undamped_angular_frequency / like.undamped_angular_frequency));
        const bool alike = tune < 0.15 && f.start.shape.damping_ratio < 3.0 * like.damping_ratio + 0.05;
        if (share < 0.5 && f.start.amplitude < stands_out * noise) return true;
        return (share < 0.2 && !alike) || (share < 0.5 && tune > 0.7);
    });
}

/// The clipped stretches; where less than a cycle lies between two of them, as one.
std::vector<SampleRange> clipped_stretches(const Search& search, double cycle) {
    std::vector<SampleRange> stretches;
    for (const SampleRange& range : search.recording.clipped) {
        const std::size_t begin = search.series.position_of(range.begin);
        const std::size_t end = search.series.position_of(range.end);
        if (stretches.empty() ||
            static_cast<double>(begin) > static_cast<double>(stretches.back().end) + cycle)
            stretches.push_back({begin, end});
        stretches.back().end = end;
    }
    return stretches;
}

/// A decay has to stand out of all that the recording shows elsewhere: noise wanders, and a mode that the
/// ground keeps in motion rises and falls by chance.
void drop_wanderings(Search& search) {
    const std::vector<Found> all = search.found;
    std::erase_if(search.found, [&](const Found& f) {
        // Another mode than the one meant may well be in motion before.
        if (f.is_drop() || (!is_brief(f) && search.mode_meant)) return false;
        const std::vector<SampleRange> clipped = clipped_stretches(search, f.cycle());
        return swing_against_elsewhere(search.pyramid, f, all, clipped) < least_swing_against_elsewhere;
    });
}

/// Whether it is hum of the mains, whose size seldom holds, rather than a decay: a tone at a line of 50 or 60
/// Hz or at a harmonic that was there before the recording began and loses less than half in it.
bool is_hum(const Search& search, const Found& found) {
    constexpr double off_line = 0.2, half = 0.7;  // Hz for each order; of ln amplitude
    constexpr int highest_order = 9;
    const double hz = search.series.rate_hz() / found.cycle();
    const auto on_line = [&](double line) {
        const double order = std::round(hz / line);
        return order >= 1.0 && order <= highest_order && std::abs(hz - order * line) < order * off_line;
    };
    return (on_line(50.0) || on_line(60.0)) && found.course.fall < half && !found.is_drop() &&
           !starts_from_quiet(search.pyramid, found);
}

void drop_hum(Search& search) {
    if (search.mode_meant) return;
    std::erase_if(search.found, [&](const Found& found) {
        if (!is_hum(search, found)) return false;
        search.mains_hz = search.series.rate_hz() / found.cycle();
        return true;
    });
}

/// A slow pull to a plateau that the next release leaves is no decay.
bool is_pull_to(const Found& pull, const Found& release) {
    const double away = std::abs(pull.start.fit.offset - release.start.fit.offset);
    const double speed =
        pull.start.shape.undamped_angular_frequency / release.start.shape.undamped_angular_frequency;
    return away > 0.4 * release.start.amplitude && speed < 0.7;
}

void drop_pulls(std::vector<Found>& found) {
    std::vector<Found> kept;
    for (std::size_t i = 0; i < found.size(); ++i) {
        if (i + 1 < found.size() && !found[i].is_drop() && is_pull_to(found[i], found[i + 1])) continue;
        kept.push_back(std::move(found[i]));
    }
    found = std::move(kept);
}

/// Largest surprise, against the amplitude, when half a cycle is foretold from the cycle before it, from the
/// end of the first decay to the start of the second.
double surprise_between(const Pyramid& pyramid, const Found& first, const Found& second) {
    const std::size_t level = first.start.level;
    const std::span<const double> means = pyramid.level(level);
    const auto cycle = static_cast<std::size_t>(
        std::lround(2.0 * std::numbers::pi / first.start.fit.shape.undamped_angular_frequency));
    const std::size_t from = first.course.rest_end >> level, to = second.begin() >> level;
    double largest = 0.0;
    for (std::size_t k = from > 2 * cycle ? from - 2 * cycle : 0; k < to && k + 2 * cycle < means.size();
         ++k) {
        const DecayFit fit = fit_amplitudes(means.subspan(k, cycle), first.start.fit.shape);
        for (std::size_t i = cycle; i < cycle + cycle / 2; ++i) {
            const double missed = std::abs(means[k + i] - fit.value_at(static_cast<double>(i)));
            largest = std::max(largest, missed / std::max(fit.envelope_at(0.0), 1e-300));
        }
    }
    return largest;
}

/// How long samples are missing where the second decay follows the first, in positions; 0 where no gap is as
/// long as a good part of a cycle. What was put in their place is no motion.
double gap_between(const Search& search, const Found& first, const Found& second) {
    constexpr double good_part = 0.2, near = 1.0;  // cycles
    if (search.recording.clock.uniform()) return 0.0;
    const auto reach = static_cast<std::size_t>(near * first.cycle());
    const std::size_t from = first.course.rest_end > reach ? first.course.rest_end - reach : 0;
    const std::size_t begin = search.series.sample_at(from), end = search.series.sample_at(second.begin());
    double missing = 0.0;
    for (std::size_t i = begin + 1; i <= end && i < search.recording.size(); ++i) {
        const double step = search.recording.clock.time_of(i) - search.recording.clock.time_of(i - 1);
        const double positions = step * search.series.rate_hz();
        if (positions > good_part * first.cycle()) missing += positions;
    }
    return missing;
}

/// Whether the first decay simply goes on in the second: as large as was to be expected, at the same
/// frequency.
bool goes_on(const Search& search, const Found& first, const Found& second) {
    constexpr double fewest_left = 0.75;
    const Pyramid& pyramid = search.pyramid;
    constexpr double surprising = 0.4, surprising_if_clean = 0.12, noise_margin = 8.0, as_clean = 3.0;
    if (first.start.noise_rms > as_clean * second.start.noise_rms) return false;
    const double later = static_cast<double>(second.begin() - first.begin());
    const double expected = first.start.amplitude * std::exp(-first.start.shape.slow_rate() * later);
    const double tune =
        second.start.shape.undamped_angular_frequency / first.start.shape.undamped_angular_frequency;
    if (second.start.amplitude > 1.15 * expected || std::abs(tune - 1.0) > 0.1) return false;
    if (gap_between(search, first, second) > 0.0) return second.start.amplitude > fewest_left * expected;
    const double noise = noise_margin * first.start.fit.residual_rms() / second.start.amplitude;
    return surprise_between(pyramid, first, second) < std::clamp(noise, surprising_if_clean, surprising);
}

}  // namespace

Finding double_hit(double time_s) {
    return {"double_hit", Severity::caution,
            fmt::format("The motion before {:.3g} s is not part of the same free decay: a second hit while "
                        "the first still "
                        "rang, or another mode that dies away. Only what follows is used; look at the "
                        "recording, and give "
                        "the window with --from if the decay began before.",
                        time_s)};
}

namespace {

/// Whether the first is over within a cycle, unlike the second, which follows within a few of its cycles.
bool is_first_hit(const Found& first, const Found& second) {
    constexpr double near = 4.0;
    const double tune = std::log(first.start.shape.undamped_angular_frequency /
                                 second.start.shape.undamped_angular_frequency);
    const bool follows =
        static_cast<double>(second.begin() - first.begin()) < near * second.cycle() && !first.start.from_rest;
    const bool brief = static_cast<double>(first.course.rest_end - first.begin()) < second.cycle();
    return follows && brief && std::abs(tune) > 0.7;
}

/// A blow may be far higher than what answers it, so this goes before anything is judged by its height.
void drop_first_hits(std::vector<Found>& found, double rate_hz) {
    std::vector<Found> kept;
    for (std::size_t i = 0; i < found.size(); ++i) {
        if (i + 1 < found.size() && is_first_hit(found[i], found[i + 1]))
            found[i + 1].findings.push_back(double_hit(static_cast<double>(found[i + 1].begin()) / rate_hz));
        else
            kept.push_back(std::move(found[i]));
    }
    found = std::move(kept);
}

/// Whether the second begins within two cycles of the first one's end, missing samples not counted, before
/// the first has reached the noise. What was put in the place of missing samples passes for noise.
bool is_cut_short(const Search& search, const Found& first, const Found& second) {
    constexpr double near = 2.0;  // cycles
    const double missing = gap_between(search, first, second);
    const double later = static_cast<double>(second.begin()) - static_cast<double>(first.course.rest_end);
    return later < near * first.cycle() + missing && (!first.course.reaches_noise || missing > 0.0);
}

/// A decay that the next one cuts short goes on in it, or is replaced by it when little of it was seen (a
/// second hit of the same test: nobody pulls, holds and lets go again within four cycles), or keeps its place
/// with a finding.
void judge_interruptions(const Search& search, std::vector<Found>& found) {
    const Series& series = search.series;
    std::vector<Found> kept;
    for (std::size_t i = 0; i < found.size(); ++i) {
        if (i + 1 == found.size() || !is_cut_short(search, found[i], found[i + 1])) {
            kept.push_back(std::move(found[i]));
            continue;
        }
        Found& next = found[i + 1];
        const double cycles =
            static_cast<double>(found[i].course.rest_end - found[i].begin()) / found[i].cycle();
        if (goes_on(search, found[i], next)) {
            found[i].course = next.course;
            next = std::move(found[i]);
        } else if ((cycles < 4.0 && !next.start.from_rest) || (cycles < 12.0 && found[i].course.fall < 1.5) ||
                   found[i].course.fall < 0.5) {
            next.findings.push_back(double_hit(static_cast<double>(next.begin()) / series.rate_hz()));
        } else {
            if (found[i].course.fall < 3.0)
                found[i].findings.push_back({"next_event_too_soon", Severity::note,
                                             "The next release or hit came before this decay had reached the "
                                             "noise. Wait longer between "
                                             "them to see the whole decay."});
            kept.push_back(std::move(found[i]));
        }
    }
    found = std::move(kept);
}

/// Whether the start is where clipping ended.
bool starts_clipped(const Search& search, std::size_t position) {
    return std::any_of(search.recording.clipped.begin(), search.recording.clipped.end(),
                       [&](const SampleRange& range) {
                           const std::size_t end = search.series.position_of(range.end);
                           return end <= position && position <= end + 2;
                       });
}

void note_double_hits(std::vector<Found>& found, const Search& search) {
    if (search.kind == TestKind::drop) return;
    for (Found& f : found)
        if (!f.is_drop() && f.findings.empty() && !starts_clipped(search, f.begin()) &&
            rings_before(search.pyramid, f.start))
            f.findings.push_back(double_hit(static_cast<double>(f.begin()) / search.series.rate_hz()));
}

/// The undisturbed stretch before each event: the rest after the one before it, or the head of the recording.
void find_quiet(std::vector<Found>& found, const Pyramid& pyramid) {
    for (std::size_t i = 0; i < found.size(); ++i) {
        if (i > 0) {
            found[i].quiet_begin = found[i - 1].course.end;
            found[i].quiet_end = found[i - 1].course.rest_end;
            continue;
        }
        const Start& start = found[i].start;
        const std::span<const double> means = pyramid.level(start.level);
        const std::size_t last = start.position >> start.level;
        const double tolerance = std::max(4.0 * start.fit.residual_rms(), 0.01 * start.amplitude);
        std::size_t k = 0;
        while (k < last && std::abs(means[k] - start.fit.offset) < tolerance) ++k;
        if (k >= 8) found[i].quiet_end = (k - 4) << start.level;
    }
}

void note_clipping(const Search& search, Event& event) {
    for (const SampleRange& range : search.recording.clipped) {
        if (range.end > event.begin || range.end + 2 < event.begin) continue;
        event.findings.push_back(
            {"clipped_start", Severity::caution,
             "The first part of the decay is clipped at the sensor's or recorder's limit and is "
             "left out. Lower the gain or the amplitude to see all of it."});
        return;
    }
}

/// Mains hum in the rest after the first decay.
std::optional<Finding> hum_after_first(const Search& search, const Series& recorded) {
    if (search.found.empty()) return {};
    const Course& course = search.found.front().course;
    const std::span<const double> rest = recorded.values().subspan(course.end, course.rest_end - course.end);
    return hum_finding(rest, search.series.rate_hz(), 1.0 / search.found.front().cycle());
}

/// The mode that rings beside the one of the guessed frequency (cycles a step): of two that beat, the one
/// stronger at the start may be the weaker of the spectrum.
std::optional<DecayShape> beside(const Found& found, double guess) {
    if (!found.beats) return found.start.companion;
    const double step = 2.0 * std::numbers::pi * guess;
    const double first = std::abs(step - found.start.shape.undamped_angular_frequency);
    const double second = std::abs(step - found.start.companion->undamped_angular_frequency);
    return second < first ? found.start.shape : found.start.companion;
}

Event to_event(const Found& found, const Search& search, const EventOptions& options) {
    const Series& series = search.series;
    Event event;
    event.quiet_begin = series.sample_at(found.quiet_begin);
    event.quiet_end = series.sample_at(found.quiet_end);
    event.begin = series.sample_at(found.begin());
    event.end = series.sample_at(found.end());
    event.rest_end = series.sample_at(found.course.rest_end);
    const double rest = rms_of_slow_noise(series.values(), found.course);
    event.noise_level = rest > 0.0 ? rest : found.start.noise_rms;
    event.start_amplitude = found.start.amplitude;
    event.kind = found.is_drop() ? TestKind::drop : options.kind.value_or(TestKind::pluck);
    event.kind_known = options.kind.has_value() || found.start.from_rest || found.is_drop();
    event.hold_seen = found.hold_seen;
    for (const Flight& flight : found.flights)
        event.flights.push_back({series.sample_at(flight.begin), series.sample_at(flight.end)});
    event.frequency_guess_hz = ringing_frequency(search.pyramid, series.rate_hz(), found, options.near_hz);
    const double guess = event.frequency_guess_hz / series.rate_hz();
    if (const std::optional<DecayShape> companion = beside(found, guess)) {
        event.companion_hz =
            companion->undamped_angular_frequency * series.rate_hz() / (2.0 * std::numbers::pi);
        event.companion_damping_ratio = companion->damping_ratio;
    }
    event.findings = found.findings;
    note_clipping(search, event);
    if (const auto finding = sampling_finding(found.cycle())) event.findings.push_back(*finding);
    return event;
}

/// Where gravity can be told: in SI units, unless the user says that nothing fell.
void look_for_drops(Search& search) {
    if (!search.recording.scaled || search.kind.value_or(TestKind::drop) != TestKind::drop) return;
    Drops drops = find_drops(search.pyramid, search.series.rate_hz(), search.recording.quantity,
                             search.kind.has_value());
    search.found = std::move(drops.found);
    search.refused = std::move(drops.refused);
}

}  // namespace

std::string reason_for_none(const SearchedStretch& searched) {
    if (!searched.refused.empty()) return searched.refused;
    if (searched.mains_hz > 0.0)
        return fmt::format(
            "A tone of {:.4g} Hz was there before the recording began and loses less than half of its size "
            "in it: "
            "mains hum, which swells and fades, and no decay. Mend the cable or its ground; if the article "
            "itself rings "
            "at that frequency, name it with --near.",
            searched.mains_hz);
    if (searched.steady)
        return "The recording oscillates, but its amplitude does not fall: a steady or forced motion is no "
               "free "
               "decay. Record a single release, tap or drop with the drive switched off.";
    if (searched.settles)
        return "The recording goes from one level to another, but not as what is let go does: the article "
               "was "
               "lowered or moved by hand, it creeps, or a clamp slipped. Hold it, let it go suddenly, and "
               "record from before the release until it rests.";
    return "Nothing in the recording starts suddenly and then dies away as a free decay does. Check the "
           "channel, "
           "the trigger and the sensor, or give the window with --from and --to.";
}

namespace {

bool constant(const Series& series) {
    const std::span<const double> values = series.values();
    return std::all_of(values.begin(), values.end(), [&](double value) { return value == values.front(); });
}

/// Whether the last twentieth of the values lies elsewhere than the first, plainly outside their scatter.
bool settles_elsewhere(std::span<const double> values) {
    constexpr double plainly = 6.0;
    const std::size_t n = values.size() / 20;
    if (n < 2) return false;
    const auto mean_and_variance = [&](std::span<const double> part) {
        double sum = 0.0, squares = 0.0;
        for (const double v : part) sum += v - values[0], squares += (v - values[0]) * (v - values[0]);
        const auto count = static_cast<double>(part.size());
        return std::pair{sum / count, std::max(0.0, squares - sum * sum / count) / count};
    };
    const auto [head, head_variance] = mean_and_variance(values.first(n));
    const auto [tail, tail_variance] = mean_and_variance(values.last(n));
    return std::abs(tail - head) > plainly * std::sqrt(std::max(head_variance, tail_variance));
}

/// Hum would hide the start and pass for a steady motion; the fit that follows has it as a tone.
std::vector<double> take_out_hum(const Series& recorded, Series& series, unsigned threads) {
    auto cleaned = without_hum(recorded.values(), recorded.rate_hz(), threads);
    if (!cleaned) return {};
    series.replace(std::move(cleaned->values));
    return std::move(cleaned->lines_hz);
}

Finding drop_or_pluck() {
    return {"drop_or_pluck", Severity::caution,
            "The noise hides whether the article was let go on its spring or fell onto it: both explain the "
            "recording. It is taken as let go. Say --test drop if it fell, --test pluck if it did not."};
}

/// Takes for the drops they are what passes for plucks since noise hides the fall.
void unhide_drops(Search& search) {
    const bool may_drop = search.recording.scaled &&
                          search.recording.quantity == MeasuredQuantity::displacement &&
                          search.kind.value_or(TestKind::drop) == TestKind::drop;
    if (!may_drop) return;
    for (std::size_t i = 0; i < search.found.size(); ++i) {
        if (search.found[i].is_drop()) continue;
        WholeDropLimits limits;
        limits.earliest = i > 0 ? search.found[i - 1].course.end : 0;
        limits.latest = i + 1 < search.found.size() ? search.found[i + 1].since() : search.series.size();
        limits.rate_hz = search.series.rate_hz();
        limits.said = search.kind.has_value();
        DropBehind behind = drop_behind(search.pyramid, search.found[i], limits);
        if (behind.undecided) search.found[i].findings.push_back(drop_or_pluck());
        if (behind.drop) search.found[i] = std::move(*behind.drop);
    }
}

/// All decays of the search, in order.
void find_all(Search& search, unsigned threads) {
    look_for_drops(search);
    const std::vector<Onset> onsets = find_onsets(search.pyramid, threads);
    for (const Onset& onset : onsets) try_onset(search, onset, onsets);
    if (shows_acceleration(search.recording.quantity)) try_answers(search, onsets);
    std::sort(search.found.begin(), search.found.end(),
              [](const Found& a, const Found& b) { return a.begin() < b.begin(); });
    const std::span<const double> values = search.series.values();
    follow_beats(search);
    drop_first_hits(search.found, search.series.rate_hz());
    drop_unlike(search.found);
    drop_weak(search.found, [&](const Found& found) { return rest_rms(values, found.course); });
    drop_wanderings(search);
    drop_hum(search);
    drop_pulls(search.found);
    unhide_drops(search);
    judge_interruptions(search, search.found);
    note_double_hits(search.found, search);
    find_quiet(search.found, search.pyramid);
}

}  // namespace

void drop_unlike_others(std::vector<Candidate>& candidates) {
    drop_unlike(candidates);
    drop_weak(candidates, [](const Candidate& candidate) { return candidate.noise_in_rest; });
}

SearchedStretch search_stretch(const Recording& recording, const EventOptions& options) {
    SearchedStretch result;
    const Series recorded(recording);
    if (constant(recorded)) return result;
    Series series = recorded;
    const std::vector<double> hum_hz = take_out_hum(recorded, series, options.threads);
    const Pyramid pyramid(series.values());
    Search search{recording, series, pyramid, options.kind, options.near_hz.has_value(), {}, {}, {}, false};
    find_all(search, options.threads);
    for (const Found& found : search.found) {
        result.candidates.push_back(
            {found, to_event(found, search, options), rest_rms(series.values(), found.course)});
        result.candidates.back().event.hum_hz = hum_hz;
    }
    result.hum = hum_after_first(search, recorded);
    result.steady = search.steady;
    result.mains_hz = search.mains_hz;
    result.settles =
        search.found.empty() && shows_position(recording.quantity) && settles_elsewhere(series.values());
    if (!search.refused.empty()) result.refused = search.refused.front().reason;
    return result;
}

namespace {

EventSearch search_whole(const Recording& recording, const EventOptions& options) {
    EventSearch result;
    if (recording.size() < shortest_recording) {
        result.reason =
            fmt::format("The recording holds {} samples; a decay cannot be told from fewer than {}.",
                        recording.size(), shortest_recording);
        result.findings.push_back({"too_short_record", Severity::defect, result.reason});
        return result;
    }
    if (constant(Series(recording))) {
        result.reason = "Every sample has the same value. Check the sensor, its cable and the channel.";
        return result;
    }
    SearchedStretch searched = search_stretch(recording, options);
    for (Candidate& candidate : searched.candidates) result.events.push_back(std::move(candidate.event));
    if (searched.hum) result.findings.push_back(*searched.hum);
    if (result.events.empty()) result.reason = reason_for_none(searched);
    return result;
}

}  // namespace
}  // namespace event_search

std::string_view to_text(TestKind kind) {
    switch (kind) {
        case TestKind::pluck:
            return "pluck";
        case TestKind::tap:
            return "tap";
        case TestKind::drop:
            return "drop";
    }
    return "pluck";
}

std::optional<TestKind> test_kind_from_text(std::string_view text) {
    for (const TestKind kind : {TestKind::pluck, TestKind::tap, TestKind::drop}) {
        if (text == to_text(kind)) return kind;
    }
    return {};
}

EventSearch find_events(const Recording& recording, const EventOptions& options) {
    if (options.from_s || options.to_s) return event_search::search_by_hand(recording, options);
    return event_search::search_whole(recording, options);
}

EventSearch find_events(const LongRecording& recording, const EventOptions& options) {
    if (options.from_s || options.to_s) return event_search::search_long_by_hand(recording, options);
    return event_search::search_long(recording, options);
}

}  // namespace ringwright
