#include "event/plateau.hpp"

#include <algorithm>
#include <cmath>
#include <numbers>

namespace ringwright::event_search {
namespace {

constexpr std::size_t shortest_plateau = 6;  // blocks of the onset's level
constexpr std::size_t fewest_blocks = 16;    // of the plateau and the decay together
constexpr std::size_t most_onsets = 60;      // looked at, the strongest first
constexpr double few_cycles = 3.0;
constexpr double least_share_of_cycle = 0.4;      // plateau over the onset's cycle
constexpr double least_share_of_amplitude = 0.5;  // onset over the decay found
constexpr double plainly_better = 1.4;  // residual sum of the slow decay over that of plateau and decay

/// Value of the found decay at the centre of a block of `level`.
double slow_value(const Start& start, std::size_t level, std::size_t block) {
    const double position = std::ldexp(static_cast<double>(block) + 0.5, static_cast<int>(level)) - 0.5;
    const double t = std::ldexp(position + 0.5, -static_cast<int>(start.level)) - 0.5;
    return start.fit.value_at(t - static_cast<double>(start.fit_block));
}

struct Blocks {
    std::size_t begin = 0, end = 0;
};

double sum_about_mean(std::span<const double> means, Blocks blocks) {
    double sum = 0.0, squares = 0.0;
    for (std::size_t k = blocks.begin; k < blocks.end; ++k) {
        const double y = means[k] - means[blocks.begin];
        sum += y, squares += y * y;
    }
    return squares - sum * sum / static_cast<double>(blocks.end - blocks.begin);
}

double sum_about_slow(std::span<const double> means, Blocks blocks, const Start& start, std::size_t level) {
    double squares = 0.0;
    for (std::size_t k = blocks.begin; k < blocks.end; ++k) {
        const double r = means[k] - slow_value(start, level, k);
        squares += r * r;
    }
    return squares;
}

bool explains_better(const Pyramid& pyramid, const Found& found, const Onset& onset) {
    const std::span<const double> means = pyramid.level(onset.level);
    const std::size_t fitted = (found.start.fit_block + found.start.fit.points) << found.start.level;
    const Blocks plateau{(found.begin() + (std::size_t{1} << onset.level) - 1) >> onset.level, onset.block};
    const Blocks decay{onset.fit_block, std::min(onset.fit_block + onset.fit.points, fitted >> onset.level)};
    if (plateau.end < plateau.begin + shortest_plateau || decay.end < decay.begin + 8) return false;
    const double cycle = 2.0 * std::numbers::pi / onset.fit.shape.undamped_angular_frequency;
    if (static_cast<double>(plateau.end - plateau.begin) < least_share_of_cycle * cycle) return false;
    if (onset.amplitude < least_share_of_amplitude * found.start.amplitude) return false;
    const std::size_t blocks = plateau.end - plateau.begin + decay.end - decay.begin;
    if (blocks < fewest_blocks) return false;
    double both = sum_about_mean(means, plateau);
    for (std::size_t k = decay.begin; k < decay.end; ++k) {
        const double r = means[k] - onset.fit.value_at(static_cast<double>(k - decay.begin));
        both += r * r;
    }
    const double slow = sum_about_slow(means, plateau, found.start, onset.level) +
                        sum_about_slow(means, decay, found.start, onset.level);
    return slow > plainly_better * both;
}

}  // namespace

bool is_plateau_and_decay(const Pyramid& pyramid, const Found& found, const std::vector<Onset>& onsets) {
    // What rings on for cycles is no edge.
    if (static_cast<double>(found.end() - found.begin()) > few_cycles * found.cycle()) return false;
    std::size_t looked_at = 0;
    for (const Onset& onset : onsets) {
        const bool within = onset.position > found.begin() && onset.position < found.end() + 8 &&
                            static_cast<double>(onset.position - found.begin()) < 1.5 * found.cycle();
        if (!within) continue;
        if (++looked_at > most_onsets) return false;
        if (explains_better(pyramid, found, onset)) return true;
    }
    return false;
}

}  // namespace ringwright::event_search
