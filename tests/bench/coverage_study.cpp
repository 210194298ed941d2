// How often the intervals hold the truth, and how the scatter compares with the Cramér–Rao bound: draws many
// recordings of known truth over a grid of conditions and counts. Prints a table in Markdown.
#include <fmt/format.h>

#include <CLI/CLI.hpp>
#include <Eigen/Cholesky>
#include <cmath>
#include <mutex>
#include <numbers>
#include <optional>
#include <string>
#include <vector>

#include "bench/for_each_recording.hpp"
#include "bench/release_series.hpp"
#include "identify/decay_window.hpp"
#include "identify/projected_fit.hpp"
#include "ringwright/distributions.hpp"
#include "ringwright/identify.hpp"
#include "support/simulated_decay.hpp"
#include "support/simulated_law.hpp"

namespace {

using namespace ringwright;
using simulated::for_each_recording;
using simulated::Truth;

constexpr double two_pi = 2.0 * std::numbers::pi;

struct Score {
    int count = 0, in68 = 0, in95 = 0, in99 = 0;
    double square = 0.0;  // of the errors

    void add(const Estimate& e, double truth, double error) {
        ++count;
        in95 += e.interval.low <= truth && truth <= e.interval.high;
        // The other levels have the same shape: each side scaled by the ratio of t factors.
        const double t95 = student_t_factor(0.95, e.degrees_of_freedom);
        const auto holds = [&](double level) {
            const double ratio = student_t_factor(level, e.degrees_of_freedom) / t95;
            return truth >= e.value - (e.value - e.interval.low) * ratio &&
                   truth <= e.value + (e.interval.high - e.value) * ratio;
        };
        in68 += holds(0.683);
        in99 += holds(0.99);
        square += error * error;
    }
    [[nodiscard]] double percent(int hits) const { return count > 0 ? 100.0 * hits / count : NAN; }
    [[nodiscard]] double scatter(double bound) const {
        return count > 0 ? std::sqrt(square / count) / bound : NAN;
    }
};

struct Tally {
    Score frequency, ratio;
};

struct Cell {
    Truth truth;
    Tally fit, decrement, half_power;
    Score plain;  // damping ratio by ordinary least squares
    int tested = 0, disagree = 0, residual_findings = 0, components = 0, laws = 0;
};

void add(Tally& tally, const MethodResult& method, const Truth& truth) {
    if (method.status != MethodStatus::ok) return;
    const auto f = method.quantities.find(Quantity::natural_frequency);
    const auto z = method.quantities.find(Quantity::damping_ratio);
    if (f == method.quantities.end() || z == method.quantities.end()) return;
    tally.frequency.add(f->second, truth.frequency_hz, std::log(f->second.value / truth.frequency_hz));
    tally.ratio.add(z->second, truth.damping_ratio, z->second.value - truth.damping_ratio);
}

// What a script would do: least squares from the right start values, covariance s²(JᵀJ)⁻¹, normal interval.
Estimate plain_least_squares(const simulated::Sample& sample, const Truth& truth) {
    using namespace identify;
    const DecayWindow window = cut_window(sample.recording, sample.event.begin, sample.event.rest_end);
    const DecaySamples samples = block_means(window, 1);
    DecayModel start;
    start.oscillators = {Oscillator::from(truth.damping_ratio, two_pi * truth.frequency_hz)};
    const ProjectedFit fit = fit_projected(start, samples, AutoregressiveNoise{});
    Eigen::MatrixXd design(samples.size(), 5);
    design << linear_columns(fit.model, samples), derivative_columns(fit.model, samples, fit.coefficients);
    const Eigen::MatrixXd covariance =
        (design.transpose() * design).ldlt().solve(Eigen::MatrixXd::Identity(5, 5)) * fit.residual_sum /
        static_cast<double>(samples.size() - 5);
    Estimate estimate;
    estimate.value = fit.model.oscillators[0].damping_ratio();
    estimate.standard_uncertainty =
        std::sqrt(covariance(3, 3)) * std::cosh(fit.model.oscillators[0].asinh_damping);
    const double reach = student_t_factor(0.95, INFINITY) * estimate.standard_uncertainty;
    estimate.interval = {estimate.value - reach, estimate.value + reach};
    return estimate;
}

struct Run {
    int recordings = 2000;
    std::uint64_t seed = 1000;
    bool search = false;  // the program's own search for the event instead of the true one
    IdentifyOptions options;
};

// The event that is identified: the true one, or the first that the search finds.
std::optional<Event> event_of(const simulated::Sample& sample, bool search) {
    if (!search) return sample.event;
    const EventSearch found = find_events(sample.recording);
    return found.events.size() == 1 ? std::optional(found.events.front()) : std::nullopt;
}

void run_one(Cell& cell, std::uint64_t seed, const Run& run, std::mutex& guard) {
    simulated::Deviates deviates(seed);
    const simulated::Sample sample = simulated::draw(cell.truth, deviates);
    const std::optional<Event> event = event_of(sample, run.search);
    if (!event) return;
    const EventIdentification result = identify_event(sample.recording, *event, run.options);
    const Estimate plain = plain_least_squares(sample, cell.truth);
    const std::scoped_lock lock(guard);
    add(cell.fit, result.curve_fit, cell.truth);
    add(cell.decrement, result.logarithmic_decrement, cell.truth);
    add(cell.half_power, result.half_power_bandwidth, cell.truth);
    cell.plain.add(plain, cell.truth.damping_ratio, plain.value - cell.truth.damping_ratio);
    cell.laws += result.curve_fit.status == MethodStatus::ok && result.curve_fit.model != "viscous";
    cell.tested += result.agreement.tested;
    cell.disagree += result.agreement.tested && !result.agreement.consistent;
    for (const Finding& finding : result.findings) {
        cell.residual_findings += finding.code.starts_with("residuals");
        cell.components += finding.code == "steady_tone" || finding.code == "second_mode";
    }
}

void run_cell(Cell& cell, std::uint64_t seed, const Run& run) {
    std::mutex guard;
    for_each_recording(run.recordings,
                       [&](int i) { run_one(cell, seed + static_cast<std::uint64_t>(i), run, guard); });
}

std::string number(double value, int digits) {
    return std::isfinite(value) ? fmt::format("{:.{}f}", value, digits) : "–";
}

std::string three_levels(const Score& s) {
    return number(s.percent(s.in68), 1) + " " + number(s.percent(s.in95), 1) + " " +
           number(s.percent(s.in99), 1);
}

std::string dress(const Truth& t) {
    std::string text;
    if (t.hum_share > 0.0) text += fmt::format(" hum {:g} %", 100.0 * t.hum_share);
    if (t.bits > 0) text += fmt::format(" {} bit", t.bits);
    if (t.clip_share > 0.0) text += fmt::format(" clipped at {:g} %", 100.0 * t.clip_share);
    if (t.jitter_share > 0.0) text += fmt::format(" jitter {:g}", t.jitter_share);
    return text;
}

void print_header() {
    fmt::print(
        "| ζ | cycles | dB | φ | dress | answered | f 68/95/99 % | ζ 68/95/99 % | scatter/bound f, ζ | plain "
        "LS ζ 95 % | "
        "decrement: answered, f, ζ 95 % | half power: answered, f, ζ 95 % | disagree, law % |\n"
        "|---|---|---|---|---|---|---|---|---|---|---|---|---|\n");
}

void print_row(const Cell& cell, int recordings) {
    const Truth& t = cell.truth;
    const simulated::Bound bound = simulated::cramer_rao(t);
    const auto simple = [&](const Tally& m) {
        return number(100.0 * m.ratio.count / recordings, 0) + ", " +
               number(m.frequency.percent(m.frequency.in95), 1) + ", " +
               number(m.ratio.percent(m.ratio.in95), 1);
    };
    fmt::print("| {:g} | {:g} | {:g} | {:g} |{} | {} | {} | {} | {} {} | {} | {} | {} | {}, {} |\n",
               t.damping_ratio, t.cycles, t.signal_to_noise_db, t.noise_correlation, dress(t),
               number(100.0 * cell.fit.ratio.count / recordings, 1), three_levels(cell.fit.frequency),
               three_levels(cell.fit.ratio), number(cell.fit.frequency.scatter(bound.log_frequency), 2),
               number(cell.fit.ratio.scatter(bound.damping_ratio), 2),
               number(cell.plain.percent(cell.plain.in95), 1), simple(cell.decrement),
               simple(cell.half_power),
               number(cell.tested > 0 ? 100.0 * cell.disagree / cell.tested : NAN, 1),
               number(100.0 * cell.laws / std::max(1, cell.fit.ratio.count), 1));
    std::fflush(stdout);
}

// One damping law, recorded under one condition: 5 kg on 8 kN/m, released from 30 mm.
struct LawCell {
    std::string model;
    simulated::Law law;
    std::vector<Quantity> coefficients;
    simulated::Bench bench;
    int answered = 0, named = 0, beyond = 0;
    Score frequency;
    std::vector<Score> scores{};
};

double coefficient_of(const simulated::Law& law, Quantity quantity) {
    switch (quantity) {
        case Quantity::friction_force:
            return law.friction;
        case Quantity::compression_damping:
            return law.compression;
        case Quantity::rebound_damping:
            return law.rebound;
        case Quantity::quadratic_damping:
            return law.quadratic;
        case Quantity::cubic_stiffness:
            return law.cubic;
        default:
            return 0.5 * (law.compression + law.rebound);
    }
}

std::vector<LawCell> law_cells() {
    LawCell friction{"viscous+friction", {}, {Quantity::friction_force, Quantity::damping_coefficient}, {}};
    friction.law.friction = 6.0;
    LawCell two_way{"two-way", {}, {Quantity::compression_damping, Quantity::rebound_damping}, {}};
    two_way.law.compression = 60.0;
    two_way.law.rebound = 180.0;
    LawCell quadratic{
        "viscous+quadratic", {}, {Quantity::quadratic_damping, Quantity::damping_coefficient}, {}};
    quadratic.law.compression = quadratic.law.rebound = 20.0;
    quadratic.law.quadratic = 60.0;
    LawCell softening{
        "viscous+softening", {}, {Quantity::cubic_stiffness, Quantity::damping_coefficient}, {}};
    softening.law.compression = softening.law.rebound = 20.0;
    softening.law.cubic = -2e6;
    LawCell hardening = softening;
    hardening.model = "viscous+hardening";
    hardening.law.cubic = 3e6;
    return {friction, two_way, quadratic, hardening, softening};
}

void add_law(LawCell& cell, const MethodResult& fit) {
    if (fit.status != MethodStatus::ok) return;
    ++cell.answered;
    cell.named += fit.model == cell.model;
    const double f = cell.law.angular_frequency() / two_pi;
    const Estimate& found = fit.quantities.at(Quantity::natural_frequency);
    cell.frequency.add(found, f, std::log(found.value / f));
    cell.scores.resize(cell.coefficients.size());
    bool beyond = false;
    for (std::size_t i = 0; i < cell.coefficients.size(); ++i) {
        const auto estimate = fit.per_mass.find(cell.coefficients[i]);
        const double truth = coefficient_of(cell.law, cell.coefficients[i]) / cell.law.mass;
        beyond =
            beyond || estimate == fit.per_mass.end() || std::abs(estimate->second.value / truth - 1.0) > 0.1;
        if (estimate != fit.per_mass.end())
            cell.scores[i].add(estimate->second, truth, estimate->second.value / truth - 1.0);
    }
    cell.beyond += beyond;
}

void run_law(LawCell& cell, std::uint64_t seed, const Run& run) {
    std::mutex guard;
    for_each_recording(run.recordings, [&](int i) {
        simulated::Deviates deviates(seed + static_cast<std::uint64_t>(i));
        const simulated::Sample sample = simulated::draw(cell.law, cell.bench, deviates);
        const std::optional<Event> event = event_of(sample, run.search);
        if (!event) return;
        const MethodResult fit = identify_event(sample.recording, *event, run.options).curve_fit;
        const std::scoped_lock lock(guard);
        add_law(cell, fit);
    });
}

void print_law(const LawCell& cell, int recordings) {
    std::string coverage, scatter;
    for (const Score& score : cell.scores) {
        coverage += (coverage.empty() ? "" : ", ") + number(score.percent(score.in95), 1);
        scatter += (scatter.empty() ? "" : ", ") + number(100.0 * score.scatter(1.0), 1);
    }
    const bool displacement = cell.bench.quantity == MeasuredQuantity::displacement;
    fmt::print("| {} | {} | {:g} | {:g} | {} | {} | {} | {} | {} | {} |\n", cell.model,
               displacement ? "displacement" : "acceleration", cell.bench.signal_to_noise_db,
               cell.bench.noise_correlation, number(100.0 * cell.answered / recordings, 1),
               number(100.0 * cell.named / std::max(1, cell.answered), 1),
               number(cell.frequency.percent(cell.frequency.in95), 1), coverage, scatter,
               number(100.0 * cell.beyond / std::max(1, cell.answered), 1));
    std::fflush(stdout);
}

struct SeriesCell {
    simulated::ReleaseSeries series;
    Tally pooled{};
};

void run_series_cell(SeriesCell& cell, std::uint64_t seed, const Run& run) {
    std::mutex guard;
    for_each_recording(run.recordings, [&](int i) {
        const MethodResult pooled =
            simulated::pooled_result(cell.series, seed + static_cast<std::uint64_t>(i), run.options);
        const std::scoped_lock lock(guard);
        add(cell.pooled, pooled, cell.series.article);
    });
}

struct Grid {
    bool laws = false;
    std::vector<int> releases;
    double frequency_spread = 0.002, damping_spread = 0.03;
    std::vector<double> ratios{0.002, 0.02, 0.1, 0.3, 0.7, 1.0, 1.5}, cycles{3, 10, 30}, decibels{20, 40, 60},
        correlations{0.0, 0.8, 0.95};
    Truth base;
    Run run;
};

void add_options(CLI::App& app, Grid& grid) {
    app.add_option("--damping", grid.ratios, "Damping ratios")->delimiter(',');
    app.add_option("--cycles", grid.cycles, "Undamped periods in the recording")->delimiter(',');
    app.add_option("--decibel", grid.decibels, "Start amplitude over noise, dB")->delimiter(',');
    app.add_option("--correlation", grid.correlations, "φ of AR(1) noise")->delimiter(',');
    app.add_option("--recordings", grid.run.recordings, "Recordings a cell")->capture_default_str();
    app.add_option("--replicates", grid.run.options.replicates, "Of the bootstrap; 0: curve fit only")
        ->capture_default_str();
    app.add_option("--seed", grid.run.seed, "Of the first recording")->capture_default_str();
    app.add_flag("--laws", grid.laws,
                 "Decays under the damping laws in place of viscous ones, displacement and acceleration; of "
                 "the grid, --decibel and --correlation hold");
    app.add_option(
           "--releases", grid.releases,
           "Pooled results of series of so many releases, through the search and the whole of identify")
        ->delimiter(',');
    app.add_option("--frequency-spread", grid.frequency_spread,
                   "Between releases, relative standard deviation")
        ->capture_default_str();
    app.add_option("--damping-spread", grid.damping_spread, "The same of the damping ratio")
        ->capture_default_str();
    app.add_flag("--search", grid.run.search, "Let the program find the event, as it does for a user");
    app.add_option("--held", grid.base.held_cycles, "Undamped periods of plateau before the release");
    app.add_option("--samples-per-cycle", grid.base.samples_per_cycle, "Sampling")->capture_default_str();
    app.add_option("--frequency", grid.base.frequency_hz, "Undamped, Hz")->capture_default_str();
    app.add_option("--hum", grid.base.hum_share, "Amplitude of 50 Hz hum over the start amplitude");
    app.add_option("--bits", grid.base.bits, "Quantisation over ±1.2 start amplitudes");
    app.add_option("--clip", grid.base.clip_share, "Rail over the start amplitude");
    app.add_option("--jitter", grid.base.jitter_share, "Standard deviation of the sampling instants, steps");
}

/// Calls `visit` with the truth of every cell of the grid.
template <typename Visit>
void for_each_cell(const Grid& grid, const Visit& visit) {
    for (const double ratio : grid.ratios)
        for (const double cycles : grid.cycles)
            for (const double decibel : grid.decibels)
                for (const double correlation : grid.correlations) {
                    Truth truth = grid.base;
                    truth.damping_ratio = ratio;
                    truth.cycles = cycles;
                    truth.signal_to_noise_db = decibel;
                    truth.noise_correlation = correlation;
                    visit(truth);
                }
}

void run_grid(const Grid& grid) {
    print_header();
    std::uint64_t seed = grid.run.seed;  // every recording of the grid has its own
    for_each_cell(grid, [&](const Truth& truth) {
        Cell cell;
        cell.truth = truth;
        run_cell(cell, seed, grid.run);
        seed += static_cast<std::uint64_t>(grid.run.recordings);
        print_row(cell, grid.run.recordings);
    });
}

void print_series(const SeriesCell& cell, int recordings) {
    const Truth& t = cell.series.article;
    fmt::print("| {} | {:g} | {:g} | {:g} | {:g} | {} | {} | {} | {} {} |\n", cell.series.releases,
               t.damping_ratio, t.cycles, t.signal_to_noise_db, t.noise_correlation,
               number(100.0 * cell.pooled.ratio.count / recordings, 1), three_levels(cell.pooled.frequency),
               three_levels(cell.pooled.ratio), number(100.0 * cell.pooled.frequency.scatter(1.0), 3),
               number(100.0 * cell.pooled.ratio.scatter(t.damping_ratio), 2));
    std::fflush(stdout);
}

void run_series(const Grid& grid) {
    fmt::print(
        "| releases | ζ | cycles | dB | φ | answered | f 68/95/99 % | ζ 68/95/99 % | scatter of f, ζ / % |\n"
        "|---|---|---|---|---|---|---|---|---|\n");
    std::uint64_t seed = grid.run.seed;
    for_each_cell(grid, [&](const Truth& truth) {
        for (const int releases : grid.releases) {
            SeriesCell cell{{truth, releases, grid.frequency_spread, grid.damping_spread}};
            run_series_cell(cell, seed, grid.run);
            seed += static_cast<std::uint64_t>(grid.run.recordings);
            print_series(cell, grid.run.recordings);
        }
    });
}

void run_laws(const Grid& grid) {
    fmt::print(
        "| law | measured | dB | φ | answered % | named % | f 95 % | its coefficients 95 % | scatter of "
        "these "
        "% | one beyond 10 % or missing, % |\n|---|---|---|---|---|---|---|---|---|---|\n");
    std::uint64_t seed = grid.run.seed;
    for (const LawCell& law : law_cells())
        for (const auto quantity : {MeasuredQuantity::displacement, MeasuredQuantity::acceleration})
            for (const double decibel : grid.decibels)
                for (const double correlation : grid.correlations) {
                    LawCell cell = law;
                    cell.bench.quantity = quantity;
                    cell.bench.signal_to_noise_db = decibel;
                    cell.bench.noise_correlation = correlation;
                    run_law(cell, seed, grid.run);
                    seed += static_cast<std::uint64_t>(grid.run.recordings);
                    print_law(cell, grid.run.recordings);
                }
}

}  // namespace

int main(int argc, char** argv) {
    CLI::App app{
        "Coverage of the intervals over recordings of known truth. Sampling error of a figure near 95 % is "
        "√(0.95·0.05/n): 0.5 points for 2,000 recordings."};
    Grid grid;
    add_options(app, grid);
    CLI11_PARSE(app, argc, argv);
    grid.laws ? run_laws(grid) : grid.releases.empty() ? run_grid(grid) : run_series(grid);
    return 0;
}
