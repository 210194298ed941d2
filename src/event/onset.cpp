#include "event/onset.hpp"

#include <algorithm>
#include <cmath>
#include <numbers>

#include "ringwright/each_index.hpp"

namespace ringwright::event_search {
namespace {

constexpr std::size_t reach = 8;           ///< blocks on either side that are compared
constexpr std::size_t memory = 24;         ///< blocks back over which the activity before is the largest
constexpr std::size_t fit_blocks = 40;     ///< blocks of a trial fit
constexpr std::size_t shortest_fit = 12;   ///< blocks, at the end of a recording
constexpr double rise = 2.0;               ///< of the activity at an onset, at least
constexpr double weakest = 0.02;           ///< activity against the largest of the level
constexpr std::size_t most_places = 1500;  ///< per level
constexpr double least_explained = 3.0;    ///< explained to residual sum of squares of a trial fit

struct Place {
    std::size_t block = 0;
    double activity = 0.0;
};

/// Ranges of the `reach` = 8 blocks from each block of a stretch on: a stretch of a long recording at a time,
/// so that they need no memory as long as the recording.
class Activity {
  public:
    explicit Activity(std::span<const double> means) : means_(means) {}

    [[nodiscard]] std::size_t size() const { return means_.size() >= reach ? means_.size() - reach + 1 : 0; }

    /// Of the blocks [begin, end); holds until the next call.
    std::span<const double> of(std::size_t begin, std::size_t end) {
        const std::size_t count = end - begin;
        low_.assign(means_.begin() + static_cast<std::ptrdiff_t>(begin),
                    means_.begin() + static_cast<std::ptrdiff_t>(end + reach - 1));
        high_ = low_;
        // Over 2, 4 and 8 blocks.
        for (const std::size_t apart : {std::size_t{1}, std::size_t{2}, std::size_t{4}})
            for (std::size_t k = 0; k + apart < low_.size(); ++k) {
                low_[k] = low_[k + apart] < low_[k] ? low_[k + apart] : low_[k];
                high_[k] = high_[k + apart] > high_[k] ? high_[k + apart] : high_[k];
            }
        for (std::size_t k = 0; k < count; ++k) high_[k] -= low_[k];
        return {high_.data(), count};
    }

  private:
    std::span<const double> means_;
    std::vector<double> low_, high_;
};

constexpr std::size_t stretch_blocks = 16384;

double largest_of(Activity& activity) {
    double largest = 0.0;
    for (std::size_t begin = 0; begin < activity.size(); begin += stretch_blocks)
        for (const double range : activity.of(begin, std::min(begin + stretch_blocks, activity.size())))
            largest = std::max(largest, range);
    return largest;
}

/// How many times the activity at block k is that before it; 0 where it is weak. `at` is the activity from
/// the block `first` on, which lies `reach + memory` before k or is the first of all.
double ratio_at(std::span<const double> at, std::size_t first, std::size_t k, double largest) {
    const double here = at[k - first];
    if (k < 2 || here < weakest * largest) return 0.0;
    double before = k >= reach ? at[k - reach - first] : at[0] * static_cast<double>(k) / reach;
    for (std::size_t i = k > memory ? k - memory : 0; i + reach < k; ++i)
        before = std::max(before, at[i - first]);
    return here / (before + 1e-6 * largest);
}

/// Adds the places in [begin, end).
void add_places(Activity& activity, std::size_t begin, std::size_t end, double largest,
                std::vector<Place>& places) {
    const std::size_t n = activity.size();
    const std::size_t first_ratio = begin > reach ? begin - reach : 0;
    const std::size_t first = first_ratio > memory + reach ? first_ratio - memory - reach : 0;
    const std::size_t last = std::min(n, end + reach);
    const std::span<const double> at = activity.of(first, last);
    std::vector<double> ratio(last - first_ratio);
    for (std::size_t k = first_ratio; k < last; ++k) ratio[k - first_ratio] = ratio_at(at, first, k, largest);
    for (std::size_t k = std::max<std::size_t>(begin, 2); k < end; ++k) {
        const double here = ratio[k - first_ratio];
        if (here < rise) continue;
        const auto from = static_cast<std::ptrdiff_t>((k > reach ? k - reach : 0) - first_ratio);
        const auto to = static_cast<std::ptrdiff_t>(std::min(n, k + reach + 1) - first_ratio);
        if (here >= *std::max_element(ratio.begin() + from, ratio.begin() + to))
            places.push_back({k, at[k - first]});
    }
}

std::vector<Place> places_of(std::span<const double> means) {
    std::vector<Place> places;
    Activity activity(means);
    const double largest = largest_of(activity);
    if (!(largest > 0.0)) return places;
    places.push_back({0, activity.of(0, 1).front()});
    for (std::size_t begin = 0; begin < activity.size(); begin += stretch_blocks)
        add_places(activity, begin, std::min(begin + stretch_blocks, activity.size()), largest, places);
    const auto stronger = [](const Place& a, const Place& b) { return a.activity > b.activity; };
    if (places.size() > most_places) {
        std::nth_element(places.begin(), places.begin() + most_places, places.end(), stronger);
        places.resize(most_places);
    }
    return places;
}

/// Whether the points show the shape: neither a sliver of a cycle nor cycles finer than the blocks.
bool resolved(const DecayFit& fit, std::size_t level) {
    const auto n = static_cast<double>(fit.points);
    if (!fit.shape.rings()) return fit.shape.slow_rate() * n > 1.0 && fit.shape.slow_rate() < 0.7;
    const double frequency = fit.shape.damped_angular_frequency();
    const bool settles = fit.shape.decay_rate() * n > 2.0;
    const double cycles = frequency * n / (2.0 * std::numbers::pi);
    return (cycles > 1.2 || settles) &&
           fit.shape.undamped_angular_frequency < 2.0 * std::numbers::pi / (level == 0 ? 2.4 : 4.5);
}

/// Explained to residual sum of squares of the shape on points eight times finer: a step that hides a ringing
/// in its blocks explains little there.
double finely_explained(const Pyramid& pyramid, std::size_t level, std::size_t first, const DecayFit& fit) {
    const std::size_t finer = std::min<std::size_t>(level, 3);
    const std::span<const double> values =
        pyramid.level(level - finer).subspan(first << finer, fit.points << finer);
    return fit_amplitudes(values, at_level(fit.shape, level, level - finer)).explained_ratio();
}

/// Whether even the best of a coarse grid of shapes explains little: most places of a noisy recording.
bool hopeless(std::span<const double> means, const Place& place) {
    constexpr double little = 0.6;
    constexpr std::size_t skipped = 3;
    const std::size_t first = place.block + skipped;
    if (first + shortest_fit > means.size()) return false;
    return roughly_explained(means.subspan(first, std::min(fit_blocks, means.size() - first))) < little;
}

}  // namespace

std::optional<Onset> onset_at(const Pyramid& pyramid, std::size_t level, std::size_t block) {
    const std::span<const double> means = pyramid.level(level);
    std::optional<Onset> best;
    for (const std::size_t skipped : {std::size_t{0}, std::size_t{3}, std::size_t{7}}) {
        const std::size_t first = block + skipped;
        if (first + shortest_fit > means.size()) break;
        const std::size_t count = std::min(fit_blocks, means.size() - first);
        const std::optional<DecayFit> fit = fit_decay(means.subspan(first, count));
        if (!fit || !resolved(*fit, level) || fit->explained_ratio() < least_explained) continue;
        Onset onset{level, block, block << level, *fit, first, fit->envelope_at(0.0), 0.0};
        const double explained = (fit->total_sum - fit->residual_sum) / static_cast<double>(count);
        onset.score = std::sqrt(explained) * std::log1p(finely_explained(pyramid, level, first, *fit));
        if (!best || onset.score > best->score) best = onset;
    }
    return best;
}

std::vector<Onset> find_onsets(const Pyramid& pyramid, unsigned threads) {
    std::vector<std::vector<Onset>> of_level(pyramid.levels());
    // The finest level, which comes first, is half of what there is to read.
    for_each_index(of_level.size(), threads, [&](std::size_t level, unsigned) {
        const std::span<const double> means = pyramid.level(level);
        for (const Place& place : places_of(means)) {
            if (hopeless(means, place)) continue;
            if (const auto onset = onset_at(pyramid, level, place.block)) of_level[level].push_back(*onset);
        }
    });
    std::vector<Onset> onsets;
    for (const std::vector<Onset>& found : of_level) onsets.insert(onsets.end(), found.begin(), found.end());
    std::stable_sort(onsets.begin(), onsets.end(),
                     [](const Onset& a, const Onset& b) { return a.score > b.score; });
    return onsets;
}

}  // namespace ringwright::event_search
