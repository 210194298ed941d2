#include <algorithm>
#include <array>
#include <cmath>
#include <functional>
#include <numeric>

#include "ringwright/quality_statistics.hpp"

namespace ringwright {
namespace {

/// A window of values in sigma from the center.
using Window = std::vector<double>;

struct Pattern {
    RunRule rule;
    std::string_view text;
    std::size_t length;
    bool (*seen)(const Window&);
};

/// At least `wanted` values of the window beyond `sigma` on one and the same side.
bool beyond_on_one_side(const Window& window, double sigma, std::ptrdiff_t wanted) {
    const auto above = std::ranges::count_if(window, [&](double z) { return z > sigma; });
    const auto below = std::ranges::count_if(window, [&](double z) { return z < -sigma; });
    return above >= wanted || below >= wanted;
}

bool monotone(const Window& window) {
    return std::ranges::adjacent_find(window, std::greater_equal<>{}) == window.end() ||
           std::ranges::adjacent_find(window, std::less_equal<>{}) == window.end();
}

bool alternating(const Window& window) {
    for (std::size_t i = 2; i < window.size(); ++i)
        if (!((window[i] - window[i - 1]) * (window[i - 1] - window[i - 2]) < 0.0)) return false;
    return true;
}

bool all(const Window& window, bool (*holds)(double)) {
    return std::ranges::all_of(window, holds);
}

const std::array<Pattern, 8> patterns{{
    {RunRule::one_beyond_three_sigma, "one point beyond three sigma", 1,
     [](const Window& w) { return beyond_on_one_side(w, 3.0, 1); }},
    {RunRule::nine_on_one_side, "nine points in a row on one side of the center", 9,
     [](const Window& w) { return beyond_on_one_side(w, 0.0, 9); }},
    {RunRule::six_steadily_rising_or_falling, "six points in a row steadily rising or falling", 6, monotone},
    {RunRule::fourteen_alternating, "fourteen points in a row alternating up and down", 14, alternating},
    {RunRule::two_of_three_beyond_two_sigma, "two of three points beyond two sigma on one side", 3,
     [](const Window& w) { return beyond_on_one_side(w, 2.0, 2); }},
    {RunRule::four_of_five_beyond_one_sigma, "four of five points beyond one sigma on one side", 5,
     [](const Window& w) { return beyond_on_one_side(w, 1.0, 4); }},
    {RunRule::fifteen_within_one_sigma, "fifteen points in a row within one sigma of the center", 15,
     [](const Window& w) { return all(w, [](double z) { return std::abs(z) < 1.0; }); }},
    {RunRule::eight_outside_one_sigma, "eight points in a row outside one sigma on either side", 8,
     [](const Window& w) { return all(w, [](double z) { return std::abs(z) > 1.0; }); }},
}};

const Pattern& pattern_of(RunRule rule) {
    return *std::ranges::find(patterns, rule, &Pattern::rule);
}

void append_signals(const std::vector<double>& z, const Pattern& pattern, std::vector<RunSignal>& signals) {
    std::optional<RunSignal> open;
    for (std::size_t end = pattern.length; end <= z.size(); ++end) {
        const auto stop = z.begin() + static_cast<std::ptrdiff_t>(end);
        if (!pattern.seen(Window(stop - static_cast<std::ptrdiff_t>(pattern.length), stop))) continue;
        if (open && open->last + 1 == end - 1) {
            open->last = end - 1;
            continue;
        }
        if (open) signals.push_back(*open);
        open = RunSignal{pattern.rule, end - pattern.length, end - 1};
    }
    if (open) signals.push_back(*open);
}

}  // namespace

IndividualsChart individuals_chart(std::vector<double> values) {
    IndividualsChart chart;
    chart.values = std::move(values);
    const auto count = static_cast<double>(chart.values.size());
    chart.center = std::accumulate(chart.values.begin(), chart.values.end(), 0.0) / count;
    for (std::size_t i = 1; i < chart.values.size(); ++i)
        chart.moving_ranges.push_back(std::abs(chart.values[i] - chart.values[i - 1]));
    chart.range_center =
        std::accumulate(chart.moving_ranges.begin(), chart.moving_ranges.end(), 0.0) / (count - 1.0);
    chart.sigma = chart.range_center / mean_range_of_two;
    chart.lower_limit = chart.center - 3.0 * chart.sigma;
    chart.upper_limit = chart.center + 3.0 * chart.sigma;
    chart.range_upper_limit =
        chart.range_center * (1.0 + 3.0 * deviation_of_range_of_two / mean_range_of_two);
    return chart;
}

std::string_view to_text(RunRule rule) {
    return pattern_of(rule).text;
}

const std::vector<RunRule>& all_run_rules() {
    static const std::vector<RunRule> rules = [] {
        std::vector<RunRule> every;
        for (const Pattern& pattern : patterns) every.push_back(pattern.rule);
        return every;
    }();
    return rules;
}

const std::vector<RunRule>& usual_run_rules() {
    static const std::vector<RunRule> rules{RunRule::one_beyond_three_sigma, RunRule::nine_on_one_side,
                                            RunRule::six_steadily_rising_or_falling,
                                            RunRule::two_of_three_beyond_two_sigma};
    return rules;
}

std::vector<RunSignal> run_signals(const IndividualsChart& chart, const std::vector<RunRule>& rules) {
    std::vector<RunSignal> signals;
    if (!(chart.sigma > 0.0)) return signals;
    std::vector<double> z;
    for (const double value : chart.values) z.push_back((value - chart.center) / chart.sigma);
    for (const RunRule rule : rules) append_signals(z, pattern_of(rule), signals);
    std::ranges::stable_sort(signals, {}, &RunSignal::last);
    return signals;
}

}  // namespace ringwright
