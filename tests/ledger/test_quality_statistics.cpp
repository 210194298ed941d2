#include <array>
#include <catch2/catch.hpp>
#include <cmath>
#include <map>
#include <random>

#include "ringwright/quality_statistics.hpp"

using namespace ringwright;
using Catch::Detail::Approx;

namespace {

// Flowrates of the e-Handbook of Statistical Methods, 6.3.2.2.
const std::vector<double> flowrates{49.6, 47.6, 49.9, 51.3, 47.8, 51.2, 52.6, 52.4, 53.6, 52.1};

/// Signals of one rule in a chart whose center is 0 and whose sigma is 1.
std::vector<RunSignal> signals_of(RunRule rule, const std::vector<double>& z) {
    IndividualsChart chart;
    chart.values = z;
    chart.sigma = 1.0;
    return run_signals(chart, {rule});
}

}  // namespace

TEST_CASE("individuals chart of the e-Handbook, 6.3.2.2") {
    const IndividualsChart chart = individuals_chart(flowrates);
    CHECK(chart.center == Approx(50.81).epsilon(1e-12));
    CHECK(chart.range_center == Approx(1.8778).margin(0.00005));
    // With the exact d2 (computed, 10 digits). The handbook divides by the rounded 1.128 and prints 55.8041
    // and 45.8159.
    CHECK(chart.upper_limit == Approx(55.80241168).epsilon(1e-9));
    CHECK(chart.lower_limit == Approx(45.81758832).epsilon(1e-9));
    CHECK(chart.center + 3.0 * chart.range_center / 1.128 == Approx(55.8041).margin(0.00005));
    CHECK(chart.center - 3.0 * chart.range_center / 1.128 == Approx(45.8159).margin(0.00005));
    // D4 for two is 3.2665 (computed; tables print 3.267).
    CHECK(chart.range_upper_limit / chart.range_center == Approx(3.266532).margin(1e-6));
    CHECK(run_signals(chart, all_run_rules()).empty());
}

TEST_CASE("chart constants") {
    CHECK(mean_range_of_two == Approx(2.0 / std::sqrt(3.14159265358979323846)).epsilon(1e-15));
    CHECK(deviation_of_range_of_two == Approx(std::sqrt(2.0 - 4.0 / 3.14159265358979323846)).epsilon(1e-15));
}

TEST_CASE("each run rule sees its pattern, and not the one a point shorter") {
    const auto count = [](RunRule rule, const std::vector<double>& z) { return signals_of(rule, z).size(); };
    CHECK(count(RunRule::one_beyond_three_sigma, {0, 3.01, 0}) == 1);
    CHECK(count(RunRule::one_beyond_three_sigma, {0, -2.99, 0}) == 0);
    CHECK(count(RunRule::nine_on_one_side, std::vector<double>(9, -0.1)) == 1);
    CHECK(count(RunRule::nine_on_one_side, std::vector<double>(8, -0.1)) == 0);
    CHECK(count(RunRule::six_steadily_rising_or_falling, {0, 1, 2, 3, 4, 5}) == 1);
    CHECK(count(RunRule::six_steadily_rising_or_falling, {5, 4, 3, 2, 1, 0}) == 1);
    CHECK(count(RunRule::six_steadily_rising_or_falling, {0, 1, 2, 3, 4}) == 0);
    CHECK(count(RunRule::six_steadily_rising_or_falling, {0, 1, 2, 2, 4, 5}) == 0);
    std::vector<double> zigzag;
    for (int i = 0; i < 14; ++i) zigzag.push_back(i % 2);
    CHECK(count(RunRule::fourteen_alternating, zigzag) == 1);
    zigzag.pop_back();
    CHECK(count(RunRule::fourteen_alternating, zigzag) == 0);
    CHECK(count(RunRule::two_of_three_beyond_two_sigma, {2.1, 0, 2.1}) == 1);
    CHECK(count(RunRule::two_of_three_beyond_two_sigma, {2.1, 0, -2.1}) == 0);
    CHECK(count(RunRule::four_of_five_beyond_one_sigma, {1.1, 1.1, 0, 1.1, 1.1}) == 1);
    CHECK(count(RunRule::four_of_five_beyond_one_sigma, {1.1, 1.1, 0, -1.1, 1.1}) == 0);
    CHECK(count(RunRule::fifteen_within_one_sigma, std::vector<double>(15, 0.5)) == 1);
    CHECK(count(RunRule::fifteen_within_one_sigma, std::vector<double>(14, 0.5)) == 0);
    CHECK(count(RunRule::eight_outside_one_sigma, {1.1, -1.1, 1.1, -1.1, 1.1, -1.1, 1.1, -1.1}) == 1);
    CHECK(count(RunRule::eight_outside_one_sigma, {1.1, -1.1, 1.1, -1.1, 0.9, -1.1, 1.1, -1.1}) == 0);
}

TEST_CASE("windows that follow each other are one signal") {
    const auto signals = signals_of(RunRule::nine_on_one_side, std::vector<double>(12, 0.1));
    REQUIRE(signals.size() == 1);
    CHECK(signals[0].first == 0);
    CHECK(signals[0].last == 11);
}

// In-control chance of one window, computed (values after Nelson 1984). 400,000 windows each from normal
// draws (seed 20314): tolerance five standard errors, one false alarm in two million a rule.
TEST_CASE("run rules are as rare as is claimed", "[study]") {
    const std::map<RunRule, std::pair<std::size_t, double>> claimed{
        {RunRule::one_beyond_three_sigma, {1, .00269980}},
        {RunRule::nine_on_one_side, {9, .00390625}},
        {RunRule::six_steadily_rising_or_falling, {6, .00277778}},
        {RunRule::fourteen_alternating, {14, .00457364}},
        {RunRule::two_of_three_beyond_two_sigma, {3, .00305831}},
        {RunRule::four_of_five_beyond_one_sigma, {5, .00553184}},
        {RunRule::fifteen_within_one_sigma, {15, .00326098}},
        {RunRule::eight_outside_one_sigma, {8, .00010277}}};
    std::mt19937_64 generator(20314);
    std::normal_distribution<double> draw;
    constexpr int windows = 400000;
    for (const auto& [rule, chance] : claimed) {
        int seen = 0;
        std::vector<double> z(chance.first);
        for (int i = 0; i < windows; ++i) {
            for (double& value : z) value = draw(generator);
            seen += signals_of(rule, z).empty() ? 0 : 1;
        }
        INFO(to_text(rule));
        CHECK(static_cast<double>(seen) / windows ==
              Approx(chance.second).margin(5.0 * std::sqrt(chance.second / windows)));
    }
}

TEST_CASE("trend of a straight line, worked by hand") {
    // x = 0 1 2 3, y = 1 3 2 4: slope 0.8, residual squares 1.8, u = √(0.9/5), t = 1.8856, p = 0.2 (t
    // = 1.8856 at 2 degrees of freedom is the two-sided 20 % point, GUM table by interpolation; exact 0.2).
    const auto trend = linear_trend({0, 1, 2, 3}, {1, 3, 2, 4}, 0.95);
    REQUIRE(trend);
    CHECK(trend->slope.value == Approx(0.8));
    CHECK(trend->slope.standard_uncertainty == Approx(std::sqrt(0.18)));
    CHECK(trend->p_value == Approx(0.2).epsilon(1e-9));
    CHECK(trend->value_at_first == Approx(1.3));
    CHECK_FALSE(linear_trend({0, 1}, {1, 2}, 0.95));
    CHECK_FALSE(linear_trend({1, 1, 1}, {1, 2, 3}, 0.95));
}

TEST_CASE("capability of the e-Handbook, 6.1.6") {
    // USL 20, LSL 8, mean 16, s 2: Cp 1, Cpk 0.6667. Two values with that mean and moving-range sigma.
    const double half = mean_range_of_two;
    const auto answer = capability({16.0 - half, 16.0 + half}, 8.0, 20.0, 0.95);
    REQUIRE(answer);
    CHECK(answer->within_sigma == Approx(2.0));
    CHECK(answer->cp->value == Approx(1.0));
    CHECK(answer->cpk.value == Approx(0.6667).margin(0.00005));
    const auto upper_only = capability({16.0 - half, 16.0 + half}, std::nullopt, 20.0, 0.95);
    CHECK_FALSE(upper_only->cp);
    CHECK_FALSE(capability({1.0, 1.0, 1.0}, 0.0, 2.0, 0.95));
    CHECK_FALSE(capability({1.0, 2.0}, std::nullopt, std::nullopt, 0.95));
}

TEST_CASE("intervals of capability indices") {
    // Quality Digest, May 2000, after Bissell: 1.15 at n = 45: 0.89 … 1.41 (computed 0.890739, 1.409261).
    const auto first = centred_capability_interval(1.15, 45, 44, 0.95);
    CHECK(first.interval.low == Approx(0.890739).margin(1e-6));
    CHECK(first.interval.high == Approx(1.409261).margin(1e-6));
    // Montgomery (from memory): 1.33 at n = 20: 0.88 … 1.78 (computed 0.882598, 1.777402).
    const auto second = centred_capability_interval(1.33, 20, 19, 0.95);
    CHECK(second.interval.low == Approx(0.882598).margin(1e-6));
    CHECK(second.interval.high == Approx(1.777402).margin(1e-6));
    // Montgomery (from memory): limits 62 and 38, s 1.75, n 20: 2.29 (1.57, 3.01); exact values computed.
    const auto third = capability_interval(24.0 / (6.0 * 1.75), 19, 0.95);
    CHECK(third.value == Approx(2.285714).margin(1e-6));
    CHECK(third.interval.low == Approx(1.564945).margin(1e-6));
    CHECK(third.interval.high == Approx(3.005579).margin(1e-6));
}

// Variance of the mean moving range over normal draws (seed 20315): 40,000 series of 20, relative standard
// error of a variance √(2/40000) = 0.7 %; 4 % is five of them.
TEST_CASE("degrees of freedom of the moving-range sigma", "[study]") {
    std::mt19937_64 generator(20315);
    std::normal_distribution<double> draw;
    double sum = 0.0, squares = 0.0;
    constexpr int series = 40000;
    for (int i = 0; i < series; ++i) {
        std::vector<double> values(20);
        for (double& value : values) value = draw(generator);
        const double sigma = individuals_chart(values).sigma;
        sum += sigma;
        squares += sigma * sigma;
    }
    const double mean = sum / series;
    const double relative_variance = (squares / series - mean * mean) / (mean * mean);
    CHECK(1.0 / (2.0 * relative_variance) == Approx(moving_range_degrees_of_freedom(20)).epsilon(0.04));
}

TEST_CASE("one-way analysis of variance: NIST StRD SiRstv, certified") {
    const auto answer = one_way({{196.3052, 196.1240, 196.1890, 196.2569, 196.3403},
                                 {196.3042, 196.3825, 196.1669, 196.3257, 196.0422},
                                 {196.1303, 196.2005, 196.2889, 196.0343, 196.1811},
                                 {196.2795, 196.1748, 196.1494, 196.1485, 195.9885},
                                 {196.2119, 196.1051, 196.1850, 196.0052, 196.2090}});
    REQUIRE(answer);
    // Certified to 15 digits; 1e-11 is what double precision reaches on these data.
    CHECK(*answer->between.f == Approx(1.18046237440255).epsilon(1e-11));
    CHECK(answer->between.sum_of_squares == Approx(5.11462616e-02).epsilon(1e-11));
    CHECK(answer->within.mean_square == Approx(1.0831828e-02).epsilon(1e-11));
    CHECK_FALSE(one_way({{1.0, 2.0}}));
}

namespace {

/// Probe 2362 of the resistivity study of the e-Handbook, 2.6 (MPC61.DAT): run, wafer, average, deviation.
struct Resistivity {
    int run, wafer;
    double average, deviation;
};
constexpr std::array<Resistivity, 60> probe_2362{{
    {1, 138, 95.1162, 0.0480},  {1, 138, 95.0569, 0.0577},  {1, 138, 95.0598, 0.0516},
    {1, 138, 95.1487, 0.0386},  {1, 138, 95.0743, 0.0256},  {1, 138, 95.1010, 0.0420},
    {1, 139, 99.2939, 0.0818},  {1, 139, 99.3234, 0.0723},  {1, 139, 99.2748, 0.0756},
    {1, 139, 99.3512, 0.0475},  {1, 139, 99.2350, 0.0517},  {1, 139, 99.3574, 0.0485},
    {1, 140, 96.0771, 0.1024},  {1, 140, 95.9976, 0.0943},  {1, 140, 96.0148, 0.0622},
    {1, 140, 96.0397, 0.0702},  {1, 140, 96.0407, 0.0627},  {1, 140, 96.0445, 0.0622},
    {1, 141, 101.0471, 0.0320}, {1, 141, 101.0224, 0.1020}, {1, 141, 101.0702, 0.0580},
    {1, 141, 101.0904, 0.1049}, {1, 141, 101.0626, 0.0702}, {1, 141, 101.0686, 0.0661},
    {1, 142, 94.2437, 0.0503},  {1, 142, 94.2115, 0.0919},  {1, 142, 94.2348, 0.0282},
    {1, 142, 94.2124, 0.0513},  {1, 142, 94.2214, 0.0627},  {1, 142, 94.1651, 0.1010},
    {2, 138, 95.1687, 0.0785},  {2, 138, 95.1564, 0.0430},  {2, 138, 95.1354, 0.0983},
    {2, 138, 95.0422, 0.0773},  {2, 138, 95.1354, 0.0587},  {2, 138, 95.1075, 0.0776},
    {2, 139, 99.3408, 0.1279},  {2, 139, 99.3116, 0.1131},  {2, 139, 99.3241, 0.0519},
    {2, 139, 99.2991, 0.0903},  {2, 139, 99.3049, 0.0783},  {2, 139, 99.2782, 0.0718},
    {2, 140, 96.0793, 0.0996},  {2, 140, 96.1115, 0.0533},  {2, 140, 96.0803, 0.0364},
    {2, 140, 96.0411, 0.0768},  {2, 140, 96.0988, 0.1042},  {2, 140, 96.0482, 0.0868},
    {2, 141, 101.1353, 0.0585}, {2, 141, 101.1201, 0.0868}, {2, 141, 101.0946, 0.0855},
    {2, 141, 100.9977, 0.0645}, {2, 141, 101.0963, 0.0638}, {2, 141, 101.0300, 0.0549},
    {2, 142, 94.2052, 0.0813},  {2, 142, 94.2824, 0.0605},  {2, 142, 94.2396, 0.0882},
    {2, 142, 94.2087, 0.0702},  {2, 142, 94.2937, 0.0591},  {2, 142, 94.2330, 0.0556},
}};

}  // namespace

TEST_CASE("nested study of the e-Handbook, 2.6") {
    std::map<std::pair<int, int>, std::vector<double>> days;
    double squares = 0.0;
    for (const Resistivity& row : probe_2362) {
        days[{row.wafer, row.run}].push_back(row.average);
        squares += row.deviation * row.deviation;
    }
    // Level 1: five degrees of freedom in each of 60 deviations.
    CHECK(std::sqrt(squares / 60.0) == Approx(0.072867).margin(1e-6));
    std::vector<std::vector<double>> runs;
    std::map<int, std::vector<double>> run_means;
    for (const auto& [key, averages] : days) {
        runs.push_back(averages);
        double sum = 0.0;
        for (const double average : averages) sum += average;
        run_means[key.first].push_back(sum / static_cast<double>(averages.size()));
    }
    const PooledDeviation day = pooled_deviation(runs);
    CHECK(day.standard_deviation == Approx(0.036168).margin(1e-6));  // printed 0.0362
    CHECK(day.degrees_of_freedom == 50.0);
    std::vector<std::vector<double>> wafers;
    for (const auto& [wafer, means] : run_means) wafers.push_back(means);
    const PooledDeviation run = pooled_deviation(wafers);
    CHECK(run.standard_deviation == Approx(0.019645).margin(1e-6));  // printed 0.0197 ± 1e-4
    CHECK(run.degrees_of_freedom == 5.0);
}

namespace {

using Measurements = std::vector<std::vector<std::vector<double>>>;

/// Houf & Berman (1988): ten parts, three operators, three repeats (as printed by Vidakovic 2011, p. 452).
Measurements houf_and_berman() {
    constexpr int rows[10][9] = {{37, 38, 37, 41, 41, 40, 41, 42, 41}, {42, 41, 43, 42, 42, 42, 43, 42, 43},
                                 {30, 31, 31, 31, 31, 31, 29, 30, 28}, {42, 43, 42, 43, 43, 43, 42, 42, 42},
                                 {28, 30, 29, 29, 30, 29, 31, 29, 29}, {42, 42, 43, 45, 45, 45, 44, 46, 45},
                                 {25, 26, 27, 28, 28, 30, 29, 27, 27}, {40, 40, 40, 43, 42, 42, 43, 43, 41},
                                 {25, 25, 25, 27, 29, 28, 26, 26, 26}, {35, 34, 34, 35, 35, 34, 35, 34, 35}};
    Measurements values;
    for (const auto& row : rows) {
        std::vector<std::vector<double>> article(3);
        for (std::size_t i = 0; i < 9; ++i) article[i / 3].push_back(row[i]);
        values.push_back(article);
    }
    return values;
}

}  // namespace

TEST_CASE("gauge study of Houf and Berman") {
    const GaugeAnswer answer = gauge_study(houf_and_berman(), 0.95);
    REQUIRE(answer.study);
    const GaugeStudy& study = *answer.study;
    // Computed to the digits given; printed components 0.51 0.73 0.56 48.29 (Montgomery, from memory).
    const double squares[] = {3935.9556, 39.26667, 48.51111, 30.66667};
    const double freedom[] = {9, 2, 18, 60};
    for (std::size_t i = 0; i < 4; ++i) {
        CHECK(study.table[i].sum_of_squares == Approx(squares[i]).margin(5e-5));
        CHECK(study.table[i].degrees_of_freedom == freedom[i]);
    }
    CHECK(*study.table[0].f == Approx(162.270).margin(5e-4));
    CHECK(*study.table[1].f == Approx(7.284929).margin(5e-7));
    CHECK(*study.table[2].f == Approx(5.272947).margin(5e-7));
    CHECK(study.repeatability.variance == Approx(0.5111111).margin(5e-8));
    CHECK(study.interaction.variance == Approx(0.7279835).margin(5e-8));
    CHECK(study.operators_alone.variance == Approx(0.5646091).margin(5e-8));
    CHECK(study.article_variation.variance == Approx(48.2925926).margin(5e-8));
    CHECK(std::sqrt(study.gauge.variance) == Approx(1.343020).margin(5e-7));
    CHECK(100.0 * study.gauge_share == Approx(18.974913).margin(5e-7));
    CHECK(study.distinct_classes == Approx(7.317667).margin(5e-7));
    CHECK(6.0 * std::sqrt(study.gauge.variance) / (58.0 - 18.0) == Approx(0.201453).margin(5e-7));
    // Repeatability: 60 degrees of freedom, χ² quantiles 40.4817 and 83.2977 (tables, from memory).
    CHECK(study.repeatability.interval.low == Approx(30.66667 / 83.2977).margin(1e-5));
    CHECK(study.repeatability.interval.high == Approx(30.66667 / 40.4817).margin(1e-5));
}

TEST_CASE("a gauge study says why there is none") {
    CHECK_FALSE(gauge_study({}, 0.95).study);
    CHECK_FALSE(gauge_study({{{1.0, 2.0}}}, 0.95).reason.empty());
    CHECK(gauge_study({{{1.0}}, {{2.0}}}, 0.95).reason.find("two measurements") != std::string::npos);
    CHECK(gauge_study({{{1.0, 2.0}, {1.0}}, {{2.0, 1.0}, {1.0, 2.0}}}, 0.95).reason.find("equally often") !=
          std::string::npos);
    CHECK(gauge_study({{{1.0, 2.0}, {1.0, 2.0}}, {{2.0, 1.0}}}, 0.95).reason.find("every article") !=
          std::string::npos);
}

TEST_CASE("with one operator the study is one-way") {
    const Measurements values{{{1.0, 1.2, 1.1}}, {{2.0, 2.1, 1.9}}, {{3.1, 2.9, 3.0}}};
    const GaugeAnswer answer = gauge_study(values, 0.95);
    REQUIRE(answer.study);
    const auto plain = one_way({{1.0, 1.2, 1.1}, {2.0, 2.1, 1.9}, {3.1, 2.9, 3.0}});
    CHECK(answer.study->repeatability.variance == Approx(plain->within.mean_square));
    CHECK(answer.study->article_variation.variance ==
          Approx((plain->between.mean_square - plain->within.mean_square) / 3.0));
    CHECK(answer.study->reproducibility.variance == 0.0);
}

namespace {

/// Draws one study: articles, operators, repeats with variances for article, operator, interaction, repeat.
Measurements draw_study(std::mt19937_64& generator, const std::array<double, 4>& variances) {
    std::normal_distribution<double> draw;
    const auto part = [&](std::size_t which) { return std::sqrt(variances[which]) * draw(generator); };
    constexpr int articles = 10, operators = 5, repeats = 3;
    double of_operator[operators];
    for (double& value : of_operator) value = part(1);
    Measurements values(articles);
    for (auto& article : values) {
        const double own = part(0);
        for (const double bias : of_operator) {
            const double together = own + bias + part(2);
            std::vector<double> cell;
            for (int i = 0; i < repeats; ++i) cell.push_back(together + part(3));
            article.push_back(cell);
        }
    }
    return values;
}

}  // namespace

// Coverage of the 95 % intervals over 2,000 drawn studies (seed 20316) of 10 articles, 5 operators, 3
// repeats. Sampling alone: 92.6 … 97.4 % at one false alarm in a million. Modified large samples hold at
// least the stated level and up to 98 % where a component is near zero (Burdick, Borror & Montgomery 2003),
// so only the lower bound is held for all; the exact chi-squared of the repeatability is held to both.
TEST_CASE("variance intervals cover as is claimed", "[study]") {
    std::mt19937_64 generator(20316);
    const std::array<double, 4> truth{4.0, 0.5, 0.3, 1.0};
    constexpr int studies = 2000;
    const std::array<double, 6> true_variances{
        truth[0], truth[1], truth[2], truth[3], truth[1] + truth[2], truth[1] + truth[2] + truth[3]};
    std::array<int, 6> covered{};
    for (int i = 0; i < studies; ++i) {
        const GaugeStudy study = *gauge_study(draw_study(generator, truth), 0.95).study;
        const VarianceComponent* components[] = {&study.article_variation, &study.operators_alone,
                                                 &study.interaction,       &study.repeatability,
                                                 &study.reproducibility,   &study.gauge};
        for (std::size_t c = 0; c < 6; ++c)
            covered[c] += components[c]->interval.low <= true_variances[c] &&
                                  true_variances[c] <= components[c]->interval.high
                              ? 1
                              : 0;
    }
    for (std::size_t c = 0; c < 6; ++c) {
        INFO("component " << c << ": " << covered[c] / 20.0 << " %");
        CHECK(covered[c] >= 0.926 * studies);
        CHECK(covered[c] <= (c == 3 ? 0.974 : 0.99) * studies);
    }
}
