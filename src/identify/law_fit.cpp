#include "identify/law_fit.hpp"

#include <Eigen/Cholesky>
#include <algorithm>
#include <array>
#include <cmath>
#include <initializer_list>
#include <numbers>

#include "identify/curve_fit_steps.hpp"
#include "identify/law_window.hpp"
#include "ringwright/distributions.hpp"
#include "ringwright/least_squares.hpp"

namespace ringwright::identify {

using Eigen::Index;
using Eigen::MatrixXd;
using Eigen::VectorXd;

namespace {

constexpr std::array extra_terms{LawParameter::friction, LawParameter::asymmetry, LawParameter::quadratic,
                                 LawParameter::cubic};
constexpr int most_terms = 2;
constexpr int noise_rounds = 4;
// A first search decides only where the next one starts.
constexpr int first_evaluations = 15, later_evaluations = 25;
constexpr double first_tolerance = 1e-5, later_tolerance = 1e-8;  // of the residual sum
constexpr double settled = 0.02;       // change between rounds in standard uncertainties
constexpr double most_damping = 0.95;  // beyond it a decay shows too little of a law
constexpr double fewest_cycles = 1.0;  // from the start to the noise
constexpr double least_fall = 0.35;    // nepers: over less, no law can be told from another
constexpr double same_mode = 0.3;      // of the logarithm of frequency
constexpr double widths_aside = 3.0;   // of a resonance, within which a component is put aside

double rows_of(const CurveFit& fit) {
    return fit.noise.degrees_of_freedom + static_cast<double>(fit.map.cols());
}

// What compression and rebound share, frequency and damping ratio hardly feel; the other terms move both by
// many times what the viscous fit is uncertain by, and are believed at a tenth of the level.
constexpr double strict_share = 0.1;

// What one more term has to gain.
double price_of_term(double rows) {
    static const double by_chance =
        chi_squared_quantile(1.0 - richer_law_level / static_cast<double>(extra_terms.size()), 1.0);
    return std::max(std::log(rows), by_chance);
}

double criterion_of(const CurveFit& fit, int terms) {
    const double rows = rows_of(fit);
    return fit.noise.fit.likelihood_criterion +
           std::log(rows) * static_cast<double>(fit.noise.noise.order()) + price_of_term(rows) * terms;
}

// What stands beside offset and mode: each parameter costs, and the frequency of a tone or a further mode was
// searched for among half as many as there are rows.
double price_beside(const CurveFit& fit, Index parameters, std::size_t searched) {
    const double rows = rows_of(fit);
    return std::log(rows) * static_cast<double>(parameters) +
           2.0 * std::log(0.5 * rows) * static_cast<double>(searched);
}

double criterion_of(const CurveFit& viscous) {
    constexpr Index offset_and_mode = 5;
    const DecayModel& model = viscous.fit.model;
    return criterion_of(viscous, 0) + price_beside(viscous, viscous.map.rows() - offset_and_mode,
                                                   model.oscillators.size() - 1 + model.tones.size());
}

double criterion_of(const LawFit& fit) {
    constexpr Index offset = 1;
    const DecayModel& others = fit.state.others;
    const auto law = static_cast<Index>(fit.model().free().size());
    return criterion_of(fit.curve, fit.terms.count()) +
           price_beside(fit.curve, fit.curve.map.rows() - offset - law,
                        others.oscillators.size() + others.tones.size());
}

// The mode meant as a law of no other terms, in units of its own frequency.
DampingLaw viscous_law(const CurveFit& fit, Measured measured) {
    const Oscillator& o = fit.oscillator();
    const Index column = fit.fit.model.first_oscillator_column();
    const double a = fit.fit.coefficients(column), b = fit.fit.coefficients(column + 1);
    const double s = o.damping_ratio(), slope = b - s * a;  // of what is measured, at the start
    DampingLaw law;
    law[LawParameter::damping] = s;
    if (measured == Measured::displacement) {
        law[LawParameter::displacement] = a;
        law[LawParameter::velocity] = slope;
    } else if (measured == Measured::velocity) {
        law[LawParameter::velocity] = a;
        law[LawParameter::displacement] = -slope - 2.0 * s * a;
    } else {
        law[LawParameter::velocity] = -slope - 2.0 * s * a;
        law[LawParameter::displacement] = -a - 2.0 * s * law[LawParameter::velocity];
    }
    return law;
}

LawState viscous_state(const CurveFit& fit, Measured measured) {
    LawState state;
    state.law = viscous_law(fit, measured);
    state.others = fit.fit.model;
    state.others.oscillators.erase(state.others.oscillators.begin());
    const Index column = fit.fit.model.first_oscillator_column(), after = fit.linear_count() - column - 2;
    state.coefficients.resize(column + after);
    state.coefficients << fit.fit.coefficients.head(column), fit.fit.coefficients.tail(after);
    return state;
}

class LawProblem {
  public:
    LawProblem(const LawModel& model, const LawState& like, const DecaySamples& samples,
               const AutoregressiveNoise& noise)
        : model_(model), like_(like), samples_(samples), noise_(noise) {}

    [[nodiscard]] LeastSquaresProblem problem() const {
        LeastSquaresProblem problem;
        problem.residual_count = samples_.size();
        problem.residuals = [this](const VectorXd& at, VectorXd& residual) {
            const LawState state = model_.unpack(at, like_);
            if (!model_.usable(state)) {  // a wall, so that the step is shortened
                residual.setConstant(1e3 * (1.0 + samples_.value.norm()));
                return;
            }
            residual = samples_.value - model_.value(state);
            if (residual.allFinite())
                whiten(noise_, samples_.stretches, residual);
            else
                residual.setConstant(1e3 * (1.0 + samples_.value.norm()));
        };
        problem.jacobian = [this](const VectorXd& at, MatrixXd& jacobian) {
            jacobian = -model_.columns(model_.unpack(at, like_));
            whiten(noise_, samples_.stretches, jacobian);
        };
        return problem;
    }

  private:
    const LawModel& model_;
    const LawState& like_;
    const DecaySamples& samples_;
    const AutoregressiveNoise& noise_;
};

struct Found {
    LawState state;
    double residual_sum = 0.0;
};

std::optional<Found> fit_once(const LawFit& fit, const LawModel& model, const LawState& start,
                              const AutoregressiveNoise& noise, int evaluations) {
    const LawProblem law(model, start, fit.curve.samples, noise);
    LeastSquaresOptions options;
    options.max_evaluations = evaluations;
    options.tolerance = evaluations > first_evaluations ? later_tolerance : first_tolerance;
    const LeastSquaresFit found = fit_least_squares(law.problem(), model.pack(start), options);
    if (!found.parameters.allFinite() || !(found.residual_sum_of_squares > 0.0)) return std::nullopt;
    const LawState state = model.unpack(found.parameters, start);
    if (!model.usable(state)) return std::nullopt;
    return Found{state, found.residual_sum_of_squares};
}

bool estimate_law_noise(LawFit& fit, const LawModel& model, const NoiseOptions& options) {
    const MatrixXd columns = model.columns(fit.state);
    const VectorXd residual = fit.curve.samples.value - model.value(fit.state);
    if (!columns.allFinite() || !residual.allFinite()) return false;
    return estimate_noise(fit.curve, columns, residual, options);
}

double largest_move(const LawFit& fit, const VectorXd& move) {
    double largest = 0.0;
    for (Index i = 0; i < move.size(); ++i) {
        const VectorXd row = fit.curve.map.row(i);
        const double variance =
            fit.curve.noise.noise.innovation_variance * row.dot(fit.curve.noise.fit.unit_covariance * row);
        largest = std::max(largest, std::abs(move(i)) / std::sqrt(std::max(variance, 1e-300)));
    }
    return largest;
}

}  // namespace

bool settle_law(LawFit& fit) {
    const LawModel model = fit.model();
    if (!estimate_law_noise(fit, model, noise_alone())) return false;
    Index order = fit.curve.noise.noise.order();
    for (int round = 0; round < noise_rounds; ++round) {
        const auto found = fit_once(fit, model, fit.state, fit.curve.noise.noise, later_evaluations);
        if (!found) return false;
        const double move = largest_move(fit, model.pack(found->state) - model.pack(fit.state));
        fit.state = found->state;
        const bool still = move < settled || round + 1 == noise_rounds;
        if (!estimate_law_noise(fit, model, still ? noise_alone() : noise_from(fit.curve))) return false;
        if (still && fit.curve.noise.noise.order() == order) break;
        order = fit.curve.noise.noise.order();
    }
    fit.criterion = criterion_of(fit);
    return std::isfinite(fit.criterion);
}

bool refit(LawFit& fit, int evaluations) {
    const auto found = fit_once(fit, fit.model(), fit.state, fit.curve.noise.noise, evaluations);
    if (found) fit.state = found->state;
    return found.has_value();
}

namespace {

// How much better the fit could get, to first order, with these terms added; the noise is estimated with
// them, since a noise model made without them would take them for noise.
std::optional<double> score_of(const LawFit& fit, const std::vector<LawParameter>& added) {
    const LawModel model = fit.model();
    const MatrixXd basis = fit.curve.basis, extra = model.law_columns(fit.state.law, added);
    if (!extra.allFinite()) return std::nullopt;
    MatrixXd columns(basis.rows(), basis.cols() + extra.cols());
    columns << basis, extra;
    CurveFit trial = fit.curve;
    if (!estimate_noise(trial, columns, fit.curve.residual, noise_no_higher(fit.curve))) return std::nullopt;
    return criterion_of(fit.curve, 0) - criterion_of(trial, 0);
}

std::vector<LawParameter> terms_not_in(const LawTerms& terms) {
    std::vector<LawParameter> missing;
    for (const LawParameter p : extra_terms)
        if (!terms.has(p)) missing.push_back(p);
    return missing;
}

// Where to start the search for one more term: small, and as large as half of the damping seen.
std::vector<LawState> starts_with(const LawFit& fit, LawParameter added) {
    const double s = fit.state.law[LawParameter::damping];
    const double swing = std::max(
        0.1, std::hypot(fit.state.law[LawParameter::displacement], fit.state.law[LawParameter::velocity]));
    const auto changed = [&](double damping, double value) {
        LawState state = fit.state;
        state.law[LawParameter::damping] = damping;
        state.law[added] = value;
        return state;
    };
    constexpr double pi = std::numbers::pi;
    switch (added) {
        case LawParameter::friction:  // equivalent viscous damping at a third and at the whole of the swing
            return {changed(0.9 * s, 0.1 * s * pi * swing / 6.0),
                    changed(0.4 * s, 0.6 * s * pi * swing / 6.0)};
        case LawParameter::quadratic:
            return {changed(0.9 * s, 0.1 * s * 3.0 * pi / (4.0 * swing)),
                    changed(0.4 * s, 0.6 * s * 3.0 * pi / (2.0 * swing))};
        case LawParameter::asymmetry:
            return {changed(s, 0.1 * s), changed(s, -0.1 * s), changed(s, 0.5 * s), changed(s, -0.5 * s)};
        default: {  // also as strong as the softening and hardening that move the frequency by a tenth
            LawState soft = changed(s, -0.25 / (swing * swing)), hard = changed(s, 0.25 / (swing * swing));
            soft.law[LawParameter::log_frequency] += 0.05;
            hard.law[LawParameter::log_frequency] -= 0.05;
            return {changed(s, 0.0), soft, hard};
        }
    }
}

// Each number of half swings before the mass sticks has a minimum of its own: looks on both sides, the
// damping that friction gives up or takes made up for by the viscous part.
std::vector<Found> neighbours_of(const LawFit& fit, const LawModel& model, const LawState& state,
                                 const AutoregressiveNoise& noise, std::initializer_list<double> factors) {
    std::vector<Found> neighbours;
    const double swing =
        std::max(0.1, std::hypot(state.law[LawParameter::displacement], state.law[LawParameter::velocity]));
    for (const double factor : factors) {
        LawState start = state;
        const double friction = start.law[LawParameter::friction];
        start.law[LawParameter::friction] = factor * friction;
        start.law[LawParameter::damping] += (1.0 - factor) * friction * 4.0 / (std::numbers::pi * swing);
        if (const auto other = fit_once(fit, model, start, noise, first_evaluations))
            neighbours.push_back(*other);
    }
    return neighbours;
}

const Found& least(const std::vector<Found>& found) {
    return *std::ranges::min_element(found, {}, &Found::residual_sum);
}

// The first search takes the noise for white: a noise model made without the term takes part of it for noise.
std::optional<LawFit> with_term(const LawFit& fit, LawParameter added) {
    const AutoregressiveNoise noise;
    LawFit trial = fit;
    trial.terms = fit.terms.with(added);
    const LawModel model = trial.model();
    std::optional<Found> best;
    for (const LawState& start : starts_with(fit, added)) {
        const auto found = fit_once(trial, model, start, noise, first_evaluations);
        if (found && (!best || found->residual_sum < best->residual_sum)) best = found;
    }
    if (!best) return std::nullopt;
    if (trial.terms.friction) {
        std::vector<Found> all = neighbours_of(trial, model, best->state, noise, {0.6, 0.8, 1.25, 1.6});
        all.push_back(*best);
        best = least(all);
    }
    trial.state = best->state;
    if (!settle_law(trial)) return std::nullopt;
    return trial;
}

// The best branch under the noise as it is now known, and the others that are not far behind.
bool settle_branches(LawFit& fit) {
    constexpr double least_weight = 1e-3;
    for (int round = 0; round < 2; ++round) {
        const LawModel model = fit.model();
        const AutoregressiveNoise& noise = fit.curve.noise.noise;
        const auto here = fit_once(fit, model, fit.state, noise, later_evaluations);
        if (!here) return true;
        const std::vector<Found> others =
            neighbours_of(fit, model, here->state, noise, {0.75, 0.88, 0.94, 1.06, 1.12, 1.3});
        fit.branches.clear();
        if (others.empty()) return true;
        if (least(others).residual_sum < here->residual_sum - 1e-3 * noise.innovation_variance) {
            fit.state = least(others).state;
            if (!settle_law(fit)) return false;
            continue;
        }
        for (const Found& other : others) {
            const double behind = (other.residual_sum - here->residual_sum) / noise.innovation_variance;
            const double moved =
                other.state.law[LawParameter::friction] / fit.state.law[LawParameter::friction];
            const auto same = [&](const LawBranch& branch) {
                return std::abs(branch.state.law[LawParameter::friction] /
                                    other.state.law[LawParameter::friction] -
                                1.0) < 1e-3;
            };
            const double weight = std::exp(-0.5 * behind);
            if (weight > least_weight && std::abs(moved - 1.0) > 1e-3 &&
                std::ranges::none_of(fit.branches, same))
                fit.branches.push_back({other.state, weight});
        }
        return true;
    }
    return true;
}

// The terms whose own score comes near the best one's; strong friction and a damper that is much stronger one
// way, which are far from a small change of a viscous decay, always.
std::vector<LawParameter> worth_trying(const LawFit& fit, const std::vector<LawParameter>& terms) {
    constexpr double near_enough = 0.2;
    std::vector<double> gains;
    for (const LawParameter p : terms) {
        const auto score = score_of(fit, {p});
        gains.push_back(score.value_or(0.0));
    }
    const double best = *std::ranges::max_element(gains);
    std::vector<LawParameter> chosen;
    for (std::size_t i = 0; i < terms.size(); ++i) {
        const bool far = terms[i] == LawParameter::friction || terms[i] == LawParameter::asymmetry;
        if (far || gains[i] >= near_enough * best) chosen.push_back(terms[i]);
    }
    return chosen;
}

// Adds terms one by one while each is worth its price. `misfit`: something is known to be left over, whatever
// the score says, which knows only small changes; then every term is tried.
LawFit grown(LawFit fit, bool misfit = false) {
    while (fit.terms.count() < most_terms) {
        const std::vector<LawParameter> missing = terms_not_in(fit.terms);
        const auto score = score_of(fit, missing);
        const bool looks_needless = !score || *score < price_of_term(rows_of(fit.curve));
        if (looks_needless && !(misfit && fit.terms.count() == 0)) break;
        std::optional<LawFit> best;
        const std::vector<LawParameter> tried = looks_needless ? missing : worth_trying(fit, missing);
        for (const LawParameter added : tried) {
            auto trial = with_term(fit, added);
            if (trial && (!best || trial->criterion < best->criterion)) best = std::move(trial);
        }
        if (!best || best->criterion >= fit.criterion) break;
        fit = std::move(*best);
        // A second term makes up for a wrong number of half swings before friction stops the mass.
        if (fit.terms.friction && fit.terms.count() == 1 && !settle_branches(fit)) break;
    }
    return fit;
}

// A term that another one made needless.
LawFit pruned(const LawFit& fit) {
    if (fit.terms.count() < 2) return fit;
    LawFit best = fit;
    for (const LawParameter dropped : extra_terms) {
        if (!fit.terms.has(dropped)) continue;
        LawFit trial = fit;
        trial.terms = LawTerms{};
        for (const LawParameter kept : extra_terms)
            if (kept != dropped && fit.terms.has(kept)) trial.terms = trial.terms.with(kept);
        trial.state.law[dropped] = 0.0;
        if (trial.terms.friction) {
            const std::vector<Found> starts =
                neighbours_of(trial, trial.model(), trial.state, trial.curve.noise.noise, {0.8, 1.0, 1.25});
            if (!starts.empty()) trial.state = least(starts).state;
        }
        if (settle_law(trial) && trial.criterion < best.criterion) best = std::move(trial);
    }
    return best;
}

}  // namespace

bool rings_too_long(const CurveFit& fit) {
    const double cycles =
        fit.samples.time.maxCoeff() * fit.oscillator().angular_frequency() / (2.0 * std::numbers::pi);
    return cycles > most_cycles_of_law;
}

namespace {

// What a law has to gain beyond the price of its terms. A decay that is over within a swing shows one
// amplitude at a time, and slow noise stands for any law: twice the price is asked there.
double surcharge(const LawTerms& terms, const CurveFit& viscous) {
    constexpr double over_in_a_swing = 0.6;
    if (viscous.oscillator().damping_ratio() > over_in_a_swing)
        return price_of_term(rows_of(viscous)) * terms.count();
    if (terms.asymmetry) return 0.0;
    const double level = richer_law_level / static_cast<double>(extra_terms.size());
    return chi_squared_quantile(1.0 - strict_share * level, 1.0) - chi_squared_quantile(1.0 - level, 1.0);
}

bool rings_enough(const CurveFit& fit) {
    const Oscillator& o = fit.oscillator();
    if (o.damping_ratio() > most_damping) return false;
    const double noise = std::sqrt(fit.noise.noise.innovation_variance);
    const double amplitude = start_amplitude(fit.fit.model, fit.fit.coefficients, 0);
    const double to_noise = std::log(std::max(1.0, amplitude / noise)) / std::max(o.slowest_rate(), 1e-12);
    const double span = std::min(to_noise, fit.samples.time.maxCoeff());
    return span * o.angular_frequency() / (2.0 * std::numbers::pi) > fewest_cycles &&
           span * o.slowest_rate() > least_fall && !rings_too_long(fit);
}

// Logarithms of the least and the largest frequency at which a mode rings in the course of its decay.
struct Band {
    double lowest = 0.0, highest = 0.0;
};

bool near_mode(double log_frequency, double mode_log_frequency, double damping_ratio) {
    constexpr double beside = 0.35;
    return std::abs(std::exp(log_frequency - mode_log_frequency) - 1.0) <
           std::max(beside, widths_aside * damping_ratio);
}

// Near the mode itself, or a multiple of it, where a law leaves its mark. A spring that hardens or softens
// moves the frequency, and its multiples, by what the modes lie apart that stand for it.
bool stands_for_a_law(double log_frequency, const Band& band, double mode_log_frequency,
                      double damping_ratio) {
    constexpr double most_multiples = 9.0, least_width = 0.03, width_of_broad = 0.2;
    if (near_mode(log_frequency, mode_log_frequency, damping_ratio)) return true;
    // A viscous fit of a broad decay misses its frequency by some per cent.
    const double width = std::max(least_width, width_of_broad * damping_ratio);
    const double lowest = std::exp(log_frequency - band.highest) / (1.0 + width);
    const double highest = std::exp(log_frequency - band.lowest) / (1.0 - width);
    const double multiple = std::max(1.0, std::ceil(lowest));
    return multiple <= most_multiples && multiple < highest;
}

// The mode alone from several damping ratios: with components about it, its own may have been anything.
ProjectedFit refitted(const DecayModel& model, const DecaySamples& samples) {
    std::optional<ProjectedFit> best;
    for (const double ratio : {std::max(0.003, model.oscillators.front().damping_ratio()), 0.03, 0.15}) {
        DecayModel start = model;
        start.oscillators.front() = Oscillator::from(ratio, model.oscillators.front().angular_frequency());
        ProjectedFit fit = fit_projected(start, samples, AutoregressiveNoise{});
        if (!best || fit.residual_sum < best->residual_sum) best = std::move(fit);
    }
    return *best;
}

// Beside modes that stand for a law, the one that was put first may be the lesser: the one with the most
// energy within the record, at the middle of the frequencies about it.
struct MainMode {
    std::size_t index = 0;
    double log_frequency = 0.0;
};

MainMode main_mode(const CurveFit& fit, bool mode_given) {
    const std::vector<Oscillator>& modes = fit.fit.model.oscillators;
    MainMode main{0, modes[0].log_frequency};
    if (mode_given || modes.size() < 2) return main;
    const double span = fit.samples.time.maxCoeff();
    std::vector<double> energy;
    for (std::size_t i = 0; i < modes.size(); ++i) {
        const double amplitude = start_amplitude(fit.fit.model, fit.fit.coefficients, i);
        const double fall = 2.0 * modes[i].slowest_rate() * span;
        energy.push_back(amplitude * amplitude * (std::abs(fall) < 1e-6 ? 1.0 : -std::expm1(-fall) / fall));
    }
    main.index = static_cast<std::size_t>(std::ranges::max_element(energy) - energy.begin());
    double sum = 0.0, weighted = 0.0;
    for (std::size_t i = 0; i < modes.size(); ++i) {
        if (std::abs(modes[i].log_frequency - modes[main.index].log_frequency) > same_mode) continue;
        sum += energy[i];
        weighted += energy[i] * modes[i].log_frequency;
    }
    main.log_frequency = weighted / sum;
    return main;
}

bool has_slow_term(const CurveFit& fit) {
    return fit.fit.model.drift || !fit.fit.model.real_poles.empty();
}

// The fit without what may stand for a law.
std::optional<CurveFit> without_components(const CurveFit& fit, bool mode_given, bool keep_slow_terms) {
    CurveFit plain = fit;
    DecayModel& model = plain.fit.model;
    const MainMode main = main_mode(fit, mode_given);
    std::swap(model.oscillators.front(), model.oscillators[main.index]);
    const double ratio = model.oscillators.front().damping_ratio();
    Band band{main.log_frequency, main.log_frequency};
    for (const Oscillator& o : model.oscillators) {
        if (!near_mode(o.log_frequency, main.log_frequency, ratio)) continue;
        band.lowest = std::min(band.lowest, o.log_frequency);
        band.highest = std::max(band.highest, o.log_frequency);
    }
    const auto aside = [&](double log_frequency) {
        return stands_for_a_law(log_frequency, band, main.log_frequency, ratio);
    };
    std::erase_if(model.tones, aside);
    // The mean about which a two-way damper swings moves as the swings get smaller.
    const bool slow_term = !keep_slow_terms && has_slow_term(fit);
    if (slow_term) {
        model.real_poles.clear();
        model.drift = false;
    }
    const auto others = model.oscillators.begin() + 1;
    model.oscillators.erase(std::remove_if(others, model.oscillators.end(),
                                           [&](const Oscillator& o) { return aside(o.log_frequency); }),
                            model.oscillators.end());
    if (main.index == 0 && !slow_term && model.nonlinear_count() == fit.fit.model.nonlinear_count())
        return plain;
    if (model.oscillators.size() == 1) model.oscillators.front().log_frequency = main.log_frequency;
    plain.fit = refitted(model, plain.samples);
    if (!settle(plain)) return std::nullopt;
    return plain;
}

// Findings about components that were put aside no longer hold.
void name_components_anew(CurveFit& fit) {
    std::erase_if(fit.findings, [](const Finding& finding) {
        return finding.code == "second_mode" || finding.code == "steady_tone" ||
               finding.code == "dry_friction" || finding.code == "drift" ||
               finding.code == "slow_exponential";
    });
    describe_components(fit);
    describe_slow_terms(fit);
}

}  // namespace

Measured measured_of(MeasuredQuantity quantity) {
    switch (quantity) {
        case MeasuredQuantity::velocity:
        case MeasuredQuantity::angular_velocity:
            return Measured::velocity;
        case MeasuredQuantity::acceleration:
        case MeasuredQuantity::angular_acceleration:
            return Measured::acceleration;
        default:
            return Measured::displacement;
    }
}

double LawFit::length() const {
    return curve.samples.scale / std::pow(rate, static_cast<double>(measured));
}

std::optional<Index> LawFit::row_of(LawParameter parameter) const {
    const std::vector<LawParameter> free = model().free();
    const auto found = std::ranges::find(free, parameter);
    if (found == free.end()) return std::nullopt;
    return state.coefficients.size() + static_cast<Index>(found - free.begin());
}

namespace {

// Beyond the noise that the search for the event saw. The mean of a block is no noisier than a sample.
bool leaves_more_than_noise(const CurveFit& fit, const Event& event) {
    constexpr double clearly = 1.5;
    return std::sqrt(fit.noise.noise.variance()) * fit.samples.scale > clearly * event.noise_level;
}

// Takes a drift, a mode (but the first `kept`), a tone or a pole out of the model and its coefficients; false
// where there is none of that number.
bool erase_component(DecayModel& model, VectorXd& coefficients, std::size_t number, std::size_t kept) {
    const auto at = [](auto& list, std::size_t i) { return list.begin() + static_cast<std::ptrdiff_t>(i); };
    Index column = 1, columns = 2;
    std::size_t i = number;
    if (model.drift && i-- == 0) {
        columns = 1;
        model.drift = false;
    } else if (i < model.oscillators.size() - kept) {
        column = model.first_oscillator_column() + 2 * static_cast<Index>(kept + i);
        model.oscillators.erase(at(model.oscillators, kept + i));
    } else if ((i -= model.oscillators.size() - kept) < model.tones.size()) {
        column = model.first_tone_column() + 2 * static_cast<Index>(i);
        model.tones.erase(at(model.tones, i));
    } else if ((i -= model.tones.size()) < model.real_poles.size()) {
        columns = 1;
        column = model.linear_count() - static_cast<Index>(model.real_poles.size() - i);
        model.real_poles.erase(at(model.real_poles, i));
    } else {
        return false;
    }
    const VectorXd all = coefficients;
    coefficients.resize(all.size() - columns);
    coefficients << all.head(column), all.tail(all.size() - column - columns);
    return true;
}

// The fit with one component less; nothing where there is none of that number.
std::optional<LawFit> without_component(const LawFit& fit, std::size_t number) {
    LawFit less = fit;
    ProjectedFit& beside = less.curve.fit;
    if (!erase_component(less.state.others, less.state.coefficients, number, 0) ||
        !erase_component(beside.model, beside.coefficients, number, 1))
        return std::nullopt;
    return less;
}

// What stood for the law beside a viscous decay takes from the law what it tells of itself: dropped where it
// is not worth its price beside the law.
LawFit without_needless(LawFit fit) {
    bool dropped = false;
    for (std::size_t number = 0;;) {
        auto less = without_component(fit, number);
        if (!less) break;
        if (settle_law(*less) && less->criterion < fit.criterion) {
            fit = std::move(*less);
            dropped = true;
        } else {
            ++number;
        }
    }
    return dropped ? pruned(grown(std::move(fit))) : fit;
}

// The law that grows from a viscous fit, which is all there is where no term is worth its price.
LawFit law_from(const CurveFit& viscous, Measured measured, bool misfit) {
    LawFit fit;
    fit.curve = fit.viscous = viscous;
    fit.measured = measured;
    fit.rate = viscous.oscillator().angular_frequency();
    fit.state = viscous_state(viscous, measured);
    fit.criterion = criterion_of(viscous);
    fit = pruned(grown(std::move(fit), misfit));
    return fit.terms.count() > 0 ? without_needless(std::move(fit)) : fit;
}

// Rows but those that hold a sample next to one of these instants (s).
DecaySamples without_rows_at(const DecaySamples& samples, const std::vector<double>& instants_s) {
    const double reach = 0.5 * samples.step_s * (1.0 + 1.0 / static_cast<double>(samples.block));
    std::vector<char> kept(static_cast<std::size_t>(samples.size()), 1);
    for (const double t : instants_s)
        for (Index i = 0; i < samples.size(); ++i)
            if (std::abs(samples.time(i) - t) <= reach) kept[static_cast<std::size_t>(i)] = 0;
    DecaySamples rest = samples;
    rest.stretches.clear();
    Index count = 0;
    for (const Stretch& stretch : samples.stretches) {
        bool open = false;
        for (Index i = stretch.begin; i < stretch.begin + stretch.length; ++i) {
            const bool keep = kept[static_cast<std::size_t>(i)] != 0;
            if (keep && !open) rest.stretches.push_back({count, 0});
            open = keep;
            if (!keep) continue;
            ++rest.stretches.back().length;
            rest.time(count) = samples.time(i);
            rest.value(count) = samples.value(i);
            for (Index j = 0; samples.fine_time.size() > 0 && j < samples.block; ++j)
                rest.fine_time(count * samples.block + j) = samples.fine_time(i * samples.block + j);
            ++count;
        }
    }
    rest.time.conservativeResize(count);
    rest.value.conservativeResize(count);
    if (samples.fine_time.size() > 0) rest.fine_time.conservativeResize(count * samples.block);
    return rest;
}

// Where friction turns round the acceleration jumps, and a sample next to the jump may lie on either side of
// it, which no search by derivatives sees: settled and chosen anew without those.
LawFit without_jumps(const LawFit& fit) {
    std::vector<double> turns =
        fit.model()
            .motion(fit.state.law, Measured::displacement, {fit.curve.samples.time.maxCoeff()})
            .reversals;
    for (double& t : turns) t /= fit.rate;
    LawFit again = fit;
    again.curve.samples = without_rows_at(fit.curve.samples, turns);
    if (!settle_law(again)) return fit;
    again = pruned(grown(std::move(again)));
    return again.terms.friction ? again : fit;
}

// What the criterion does not know is how little a short record tells of slow noise, which a term may stand
// for: with the noise integrated over what it may be, one of the terms at least has to differ from nothing.
// What moves frequency and damping ratio far is believed at one chance in 100,000: friction that noise
// feigned was 5.6 of its standard uncertainties, true friction of a tenth of the release is 17 at 30 dB.
bool stands_out_of_noise(const LawFit& fit) {
    constexpr double chance_of_far_moving = 1e-5;
    const double chance = richer_law_level / static_cast<double>(extra_terms.size());
    return std::ranges::any_of(extra_terms, [&](LawParameter p) {
        const auto row = fit.row_of(p);
        if (!row) return false;
        const double level = 1.0 - (p == LawParameter::asymmetry ? chance : chance_of_far_moving);
        VectorXd gradient = VectorXd::Zero(fit.curve.map.rows());
        gradient(*row) = 1.0;
        const Spread spread = spread_of(fit.curve, gradient);
        return std::abs(fit.state.law[p]) > student_t_factor(level, spread.degrees_of_freedom) * spread.scale;
    });
}

// Whether rounding to the recorder's steps may stand for the law: the noise is too small to carry the signal
// over the steps, and nowhere do the two curves lie a step apart. A decay below half a step seems to stick.
bool may_be_rounding(const LawFit& law, const CurveFit& plain, double resolution) {
    constexpr double least_noise = 0.5, apart = 1.0;  // steps
    const double step = resolution / plain.samples.scale;
    const double noise =
        residual_level(plain) * std::sqrt(static_cast<double>(plain.samples.block));  // of a sample
    if (noise > least_noise * resolution) return false;
    const VectorXd curve = plain.samples.value - plain.residual;
    const VectorXd other = law.curve.samples.value - law.curve.residual;
    return curve.size() == other.size() && (curve - other).cwiseAbs().maxCoeff() < apart * step;
}

// A law, and the viscous mode alone from which it grew.
struct Choice {
    LawFit law;
    CurveFit plain;
};

// The best of the laws that are worth their price beside this viscous fit.
std::optional<Choice> best_law(const CurveFit& viscous, const Recording& recording, const Event& event,
                               const CurveFitOptions& options) {
    std::optional<Choice> chosen;
    for (const bool keep_slow_terms : {false, true}) {
        if (keep_slow_terms && !has_slow_term(viscous)) break;
        const auto trial = without_components(viscous, options.near_hz.has_value(), keep_slow_terms);
        if (!trial || !rings_enough(*trial)) continue;
        // Ringing that the noise model took up leaves nothing for the score of a small change to gain.
        const bool misfit = leaves_more_than_noise(*trial, event) ||
                            noise_rings_at(*trial, trial->oscillator().angular_frequency());
        LawFit law = law_from(*trial, measured_of(recording.quantity), misfit);
        const bool beats = law.terms.count() > 0 &&
                           law.criterion + surcharge(law.terms, *trial) < criterion_of(viscous) &&
                           !may_be_rounding(law, *trial, recording.resolution);
        if (beats && (!chosen || law.criterion <= chosen->law.criterion)) chosen = {std::move(law), *trial};
    }
    return chosen;
}

// A viscous fit that left another noise behind the decay was cut to it, one that took a damper's turn for a
// knock to what lies before; over so few rows modes and a drift may stand for any law. The best law over all
// that is read, where it leaves nothing but noise, and the same throughout.
std::optional<Choice> law_of_whole_decay(const CurveFit& viscous, const Recording& recording,
                                         const Event& event, const CurveFitOptions& options) {
    const std::size_t begin = viscous.window.begin, end = end_of_fit(event);
    if (event.by_hand || begin + viscous.window.size() >= end) return std::nullopt;
    CurveFit whole = viscous;
    cut_again(whole, recording, begin, end);
    whole.samples = block_means(whole.window, viscous.samples.block);
    whole.fit = fit_projected(whole.fit.model, whole.samples, whole.noise.noise);
    if (!settle(whole)) return std::nullopt;
    auto chosen = best_law(whole, recording, event, options);
    if (!chosen || !same_noise_behind(chosen->law.curve, event) ||
        leaves_more_than_noise(chosen->law.curve, event))
        return std::nullopt;
    return chosen;
}

}  // namespace

std::optional<LawFit> choose_law(const CurveFit& viscous, const Recording& recording, const Event& event,
                                 const CurveFitOptions& options) {
    if (!viscous.valid) return std::nullopt;
    std::optional<Choice> chosen = best_law(viscous, recording, event, options);
    if (!chosen) chosen = law_of_whole_decay(viscous, recording, event, options);
    if (!chosen) return std::nullopt;
    LawFit fit = std::move(chosen->law);
    widen(fit, recording, event);
    fit = pruned(fit);
    if (fit.terms.friction && fit.measured == Measured::acceleration) fit = without_jumps(fit);
    if (fit.terms.friction && !settle_branches(fit)) return std::nullopt;
    constexpr double most_growth = 1.1;  // by chance, over a wider window
    if (residual_level(fit.curve) > most_growth * residual_level(chosen->plain)) return std::nullopt;
    if (!estimate_law_noise(fit, fit.model(), noise_with_draws(options)) || !stands_out_of_noise(fit))
        return std::nullopt;
    if (!estimate_noise(fit.viscous, noise_with_draws(options))) return std::nullopt;
    name_components_anew(fit.curve);
    return fit;
}

}  // namespace ringwright::identify
