#include <cmath>
#include <numeric>

#include "ringwright/distributions.hpp"
#include "ringwright/quality_statistics.hpp"

namespace ringwright {
namespace {

double sum_of(const std::vector<double>& values) {
    return std::accumulate(values.begin(), values.end(), 0.0);
}

/// Sum of squares about the mean. The first value is taken off before summing: large offsets (SmLs07) would
/// eat the digits otherwise.
double squares_about_mean(const std::vector<double>& values) {
    if (values.empty()) return 0.0;
    double sum = 0.0;
    for (const double value : values) sum += value - values.front();
    const double mean = sum / static_cast<double>(values.size());
    double squares = 0.0;
    for (const double value : values) squares += std::pow(value - values.front() - mean, 2);
    return squares;
}

/// All values with the very first taken off.
std::vector<std::vector<double>> without_offset(const std::vector<std::vector<double>>& groups) {
    double offset = 0.0;
    for (const auto& group : groups)
        if (!group.empty()) {
            offset = group.front();
            break;
        }
    auto moved = groups;
    for (auto& group : moved)
        for (double& value : group) value -= offset;
    return moved;
}

double squares_between(const std::vector<std::vector<double>>& groups) {
    double total = 0.0, count = 0.0;
    for (const auto& group : groups) {
        total += sum_of(group);
        count += static_cast<double>(group.size());
    }
    const double grand = total / count;
    double squares = 0.0;
    for (const auto& group : groups) {
        if (group.empty()) continue;
        const auto size = static_cast<double>(group.size());
        squares += size * std::pow(sum_of(group) / size - grand, 2);
    }
    return squares;
}

VarianceRow row(std::string source, double squares, double freedom) {
    return {std::move(source), squares, freedom, squares / freedom, {}, {}};
}

}  // namespace

PooledDeviation pooled_deviation(const std::vector<std::vector<double>>& groups) {
    double squares = 0.0, freedom = 0.0;
    for (const auto& group : groups) {
        if (group.size() < 2) continue;
        squares += squares_about_mean(group);
        freedom += static_cast<double>(group.size() - 1);
    }
    return {freedom > 0.0 ? std::sqrt(squares / freedom) : 0.0, freedom};
}

std::optional<OneWay> one_way(const std::vector<std::vector<double>>& groups) {
    double filled = 0.0;
    for (const auto& group : groups) filled += group.empty() ? 0.0 : 1.0;
    const PooledDeviation within = pooled_deviation(groups);
    if (filled < 2.0 || within.degrees_of_freedom < 1.0) return std::nullopt;
    OneWay answer;
    answer.between = row("between", squares_between(without_offset(groups)), filled - 1.0);
    answer.within =
        row("within", within.standard_deviation * within.standard_deviation * within.degrees_of_freedom,
            within.degrees_of_freedom);
    if (answer.within.mean_square > 0.0) {
        const double f = answer.between.mean_square / answer.within.mean_square;
        answer.between.f = f;
        answer.between.p_value =
            1.0 - f_probability(f, answer.between.degrees_of_freedom, answer.within.degrees_of_freedom);
    }
    return answer;
}

}  // namespace ringwright
