#include <fmt/format.h>

#include <cmath>
#include <numeric>

#include "ledger/variance_interval.hpp"
#include "ringwright/distributions.hpp"
#include "ringwright/quality_statistics.hpp"

namespace ringwright {
namespace {

using Measurements = std::vector<std::vector<std::vector<double>>>;

struct Shape {
    double articles = 0.0, operators = 0.0, repeats = 0.0;
};

std::string why_not(const Measurements& values) {
    if (values.size() < 2) return "A gauge study needs at least two articles.";
    const std::size_t operators = values.front().size();
    if (operators == 0) return "A gauge study needs at least one operator.";
    const std::size_t repeats = values.front().front().size();
    if (repeats < 2) return "A gauge study needs at least two measurements of each article by each operator.";
    for (const auto& article : values) {
        if (article.size() != operators) return "Not every operator measured every article.";
        for (const auto& cell : article)
            if (cell.size() != repeats)
                return "The articles were not measured equally often by every operator.";
    }
    return "";
}

double mean_of(const std::vector<double>& values) {
    return std::accumulate(values.begin(), values.end(), 0.0) / static_cast<double>(values.size());
}

/// Means of the cells, less the very first value (large offsets would eat the digits).
struct Means {
    std::vector<std::vector<double>> cell;  ///< [article][operator]
    std::vector<double> article, of_operator;
    double grand = 0.0;
};

Means means_of(const Measurements& values, double offset) {
    Means means;
    means.of_operator.assign(values.front().size(), 0.0);
    for (const auto& article : values) {
        std::vector<double> cells;
        for (const auto& cell : article) cells.push_back(mean_of(cell) - offset);
        for (std::size_t i = 0; i < cells.size(); ++i)
            means.of_operator[i] += cells[i] / static_cast<double>(values.size());
        means.article.push_back(mean_of(cells));
        means.cell.push_back(std::move(cells));
    }
    means.grand = mean_of(means.article);
    return means;
}

double squares_about(const std::vector<double>& values, double center) {
    double squares = 0.0;
    for (const double value : values) squares += (value - center) * (value - center);
    return squares;
}

double squares_of_interaction(const Means& means) {
    double squares = 0.0;
    for (std::size_t a = 0; a < means.article.size(); ++a)
        for (std::size_t o = 0; o < means.of_operator.size(); ++o)
            squares += std::pow(means.cell[a][o] - means.article[a] - means.of_operator[o] + means.grand, 2);
    return squares;
}

double squares_of_repeats(const Measurements& values, const Means& means, double offset) {
    double squares = 0.0;
    for (std::size_t a = 0; a < values.size(); ++a)
        for (std::size_t o = 0; o < values[a].size(); ++o)
            squares += squares_about(values[a][o], means.cell[a][o] + offset);
    return squares;
}

VarianceRow row(std::string source, double squares, double freedom) {
    return {std::move(source), squares, freedom, squares / freedom, {}, {}};
}

void test_against(VarianceRow& tested, const VarianceRow& against) {
    if (!(against.mean_square > 0.0)) return;
    const double f = tested.mean_square / against.mean_square;
    tested.f = f;
    tested.p_value = 1.0 - f_probability(f, tested.degrees_of_freedom, against.degrees_of_freedom);
}

/// Rows: article, operator, article × operator, repeat; with one operator article and repeat alone.
std::vector<VarianceRow> table_of(const Measurements& values, const Shape& shape) {
    const double offset = values[0][0][0];
    const Means means = means_of(values, offset);
    const double a = shape.articles, o = shape.operators, r = shape.repeats;
    VarianceRow article = row("article", o * r * squares_about(means.article, means.grand), a - 1.0);
    VarianceRow repeat = row("repeat", squares_of_repeats(values, means, offset), a * o * (r - 1.0));
    if (o < 2.0) {
        test_against(article, repeat);
        return {article, repeat};
    }
    VarianceRow of_operator = row("operator", a * r * squares_about(means.of_operator, means.grand), o - 1.0);
    VarianceRow both = row("article × operator", r * squares_of_interaction(means), (a - 1.0) * (o - 1.0));
    test_against(article, both);
    test_against(of_operator, both);
    test_against(both, repeat);
    return {article, of_operator, both, repeat};
}

WeightedSquare weigh(const VarianceRow& of_row, double weight) {
    return {weight, of_row.mean_square, of_row.degrees_of_freedom};
}

void components_of_one_operator(GaugeStudy& study, const Shape& shape, double level) {
    const VarianceRow &article = study.table[0], &repeat = study.table[1];
    study.repeatability = component_of({weigh(repeat, 1.0)}, level);
    study.gauge = study.repeatability;
    study.article_variation =
        component_of({weigh(article, 1.0 / shape.repeats), weigh(repeat, -1.0 / shape.repeats)}, level);
}

/// Expected mean squares: repeat σ²; interaction σ² + rσ²_ao; operator σ² + rσ²_ao + arσ²_o; article σ² +
/// rσ²_ao + orσ²_a.
void components_of_many(GaugeStudy& study, const Shape& shape, double level) {
    const VarianceRow &article = study.table[0], &of_operator = study.table[1];
    const VarianceRow &both = study.table[2], &repeat = study.table[3];
    const double a = shape.articles, o = shape.operators, r = shape.repeats;
    study.repeatability = component_of({weigh(repeat, 1.0)}, level);
    study.operators_alone =
        component_of({weigh(of_operator, 1.0 / (a * r)), weigh(both, -1.0 / (a * r))}, level);
    study.interaction = component_of({weigh(both, 1.0 / r), weigh(repeat, -1.0 / r)}, level);
    study.article_variation =
        component_of({weigh(article, 1.0 / (o * r)), weigh(both, -1.0 / (o * r))}, level);
    study.gauge = component_of(
        {weigh(of_operator, 1.0 / (a * r)), weigh(both, (a - 1.0) / (a * r)), weigh(repeat, (r - 1.0) / r)},
        level);
    study.reproducibility = component_of(
        {weigh(of_operator, 1.0 / (a * r)), weigh(both, (a - 1.0) / (a * r)), weigh(repeat, -1.0 / r)},
        level);
    study.reproducibility.variance = study.operators_alone.variance + study.interaction.variance;
    // With negative parts shown as zero the gauge is the sum of what is shown.
    study.gauge.variance = study.repeatability.variance + study.reproducibility.variance;
}

}  // namespace

GaugeAnswer gauge_study(const Measurements& values, double confidence_level) {
    GaugeAnswer answer;
    answer.reason = why_not(values);
    if (!answer.reason.empty()) return answer;
    GaugeStudy study;
    study.articles = values.size();
    study.operators = values.front().size();
    study.repeats = values.front().front().size();
    const Shape shape{static_cast<double>(study.articles), static_cast<double>(study.operators),
                      static_cast<double>(study.repeats)};
    study.table = table_of(values, shape);
    if (study.operators < 2)
        components_of_one_operator(study, shape, confidence_level);
    else
        components_of_many(study, shape, confidence_level);
    const double total = study.gauge.variance + study.article_variation.variance;
    if (total > 0.0) study.gauge_share = std::sqrt(study.gauge.variance / total);
    if (study.gauge.variance > 0.0)
        study.distinct_classes = std::sqrt(2.0 * study.article_variation.variance / study.gauge.variance);
    answer.study = study;
    return answer;
}

}  // namespace ringwright
