#include "property/article_model.hpp"

#include <algorithm>
#include <cmath>
#include <numbers>

#include "ringwright/distributions.hpp"

namespace ringwright::property {
namespace {

ModelInput input_from(const Estimate& estimate, std::string name, std::string unit) {
    return {std::move(name), estimate.value,   estimate.standard_uncertainty, estimate.degrees_of_freedom,
            std::move(unit), estimate.interval};
}

ModelInput input_from(const MeasuredValue& measured, std::string name, std::string unit) {
    return {std::move(name), measured.value, measured.standard_uncertainty, measured.degrees_of_freedom,
            std::move(unit), std::nullopt};
}

std::string at_loading(std::string name, const Loading& loading, std::size_t loading_count) {
    if (loading_count < 2) return name;
    return name + (loading.added_mass.value > 0.0 ? " with " + loading.added_mass.text + " added"
                                                  : std::string(" with nothing added"));
}

std::size_t append(ArticleModel& model, ModelInput input) {
    model.inputs.push_back(std::move(input));
    return model.inputs.size() - 1;
}

void append_loading(ArticleModel& model, const Loading& loading, std::size_t count) {
    const std::size_t frequency = append(
        model, input_from(loading.natural_frequency, at_loading("natural frequency", loading, count), "Hz"));
    const std::size_t damping =
        append(model, input_from(loading.damping_ratio, at_loading("damping ratio", loading, count), "1"));
    model.frequency_inputs.push_back(frequency);
    model.damping_inputs.push_back(damping);
    model.added_mass_inputs.push_back(
        append(model, input_from(loading.added_mass, "added mass " + loading.added_mass.text, "kg")));
    if (loading.correlation != 0.0) model.correlations.push_back({frequency, damping, loading.correlation});
}

double square(double value) {
    return value * value;
}

double angular_frequency(const ArticleModel& model, std::span<const double> at, std::size_t loading) {
    return 2.0 * std::numbers::pi * at[model.frequency_inputs[loading]] * (1.0 + at[model.clock_input]);
}

double third_of_spring(const ArticleModel& model, std::span<const double> at) {
    return model.spring_mass_input ? at[*model.spring_mass_input] / 3.0 : 0.0;
}

double moving_mass(const ArticleModel& model, std::span<const double> at, std::size_t loading) {
    return at[*model.mass_input] + third_of_spring(model, at) + at[model.added_mass_inputs[loading]];
}

double relative(const Estimate& estimate) {
    return estimate.standard_uncertainty / std::abs(estimate.value);
}

/// Weights that sum to one from the relative variances of what each loading says.
std::vector<double> normalised_weights(std::vector<double> variances) {
    double sum = 0.0;
    for (double& variance : variances) {
        variance = 1.0 / std::max(variance, 1e-300);
        sum += variance;
    }
    for (double& weight : variances) weight /= sum;
    return variances;
}

void set_weights(ArticleModel& model) {
    std::vector<double> stiffness, damping, line;
    for (const Loading& loading : model.loadings) {
        const double frequency = square(relative(loading.natural_frequency));
        stiffness.push_back(4.0 * frequency);
        damping.push_back(frequency + square(relative(loading.damping_ratio)));
        line.push_back(square(loading.natural_frequency.standard_uncertainty) /
                       std::pow(loading.natural_frequency.value, 6));
    }
    model.stiffness_weights = normalised_weights(std::move(stiffness));
    model.damping_weights = normalised_weights(std::move(damping));
    model.line_weights = normalised_weights(std::move(line));
}

double line_moving_mass(const ArticleModel& model, std::span<const double> at) {
    const Line line = fitted_line(model, at);
    return line.intercept / line.slope;
}

}  // namespace

ArticleModel article_model(const std::vector<Loading>& loadings, const Article& article,
                           const CommonInfluences& influences) {
    ArticleModel model;
    model.loadings = loadings;
    for (const Loading& loading : loadings) append_loading(model, loading, loadings.size());
    if (article.mass) model.mass_input = append(model, input_from(*article.mass, "mass", "kg"));
    if (article.inertia) model.mass_input = append(model, input_from(*article.inertia, "inertia", "kg·m²"));
    if (article.spring_mass)
        model.spring_mass_input = append(model, input_from(*article.spring_mass, "spring mass", "kg"));
    model.clock_input = append(model, {"time base", 0.0, influences.time_base_relative,
                                       std::numeric_limits<double>::infinity(), "1", std::nullopt});
    set_weights(model);
    return model;
}

std::vector<double> values_of(const ArticleModel& model) {
    std::vector<double> values;
    for (const ModelInput& input : model.inputs) values.push_back(input.value);
    return values;
}

ModelFunction mean_stiffness(const ArticleModel& model) {
    return [&model](std::span<const double> at) {
        double sum = 0.0;
        for (std::size_t i = 0; i < model.loadings.size(); ++i)
            sum += model.stiffness_weights[i] * moving_mass(model, at, i) *
                   square(angular_frequency(model, at, i));
        return sum;
    };
}

ModelFunction mean_damping(const ArticleModel& model) {
    return [&model](std::span<const double> at) {
        double sum = 0.0;
        for (std::size_t i = 0; i < model.loadings.size(); ++i)
            sum += model.damping_weights[i] * 2.0 * at[model.damping_inputs[i]] * moving_mass(model, at, i) *
                   angular_frequency(model, at, i);
        return sum;
    };
}

ModelFunction law_coefficient(ArticleModel& model, Quantity quantity) {
    struct Part {
        std::size_t loading, input;
        double weight;
    };
    std::vector<Part> parts;
    double sum = 0.0;
    for (std::size_t i = 0; i < model.loadings.size(); ++i) {
        const Loading& loading = model.loadings[i];
        const auto found = loading.per_mass.find(quantity);
        if (found == loading.per_mass.end()) continue;
        const std::string name = std::string(name_of(quantity)) + " over mass";
        const std::size_t input =
            append(model, input_from(found->second, at_loading(name, loading, model.loadings.size()), ""));
        const double weight = 1.0 / std::max(square(found->second.standard_uncertainty), 1e-300);
        parts.push_back({i, input, weight});
        sum += weight;
    }
    if (parts.empty()) return {};
    for (Part& part : parts) part.weight /= sum;
    return [&model, parts](std::span<const double> at) {
        double value = 0.0;
        for (const Part& part : parts)
            value += part.weight * at[part.input] * moving_mass(model, at, part.loading);
        return value;
    };
}

Line fitted_line(const ArticleModel& model, std::span<const double> at) {
    double mean_mass = 0.0, mean_inverse = 0.0;
    for (std::size_t i = 0; i < model.loadings.size(); ++i) {
        mean_mass += model.line_weights[i] * at[model.added_mass_inputs[i]];
        mean_inverse += model.line_weights[i] / square(angular_frequency(model, at, i));
    }
    double numerator = 0.0, denominator = 0.0;
    for (std::size_t i = 0; i < model.loadings.size(); ++i) {
        const double mass = at[model.added_mass_inputs[i]] - mean_mass;
        numerator += model.line_weights[i] * mass / square(angular_frequency(model, at, i));
        denominator += model.line_weights[i] * mass * mass;
    }
    const double slope = numerator / denominator;
    return {slope, mean_inverse - slope * mean_mass};
}

ModelFunction line_stiffness(const ArticleModel& model) {
    return [&model](std::span<const double> at) { return 1.0 / fitted_line(model, at).slope; };
}

ModelFunction line_mass(const ArticleModel& model) {
    return [&model](std::span<const double> at) {
        return line_moving_mass(model, at) - third_of_spring(model, at);
    };
}

ModelFunction line_damping(const ArticleModel& model) {
    return [&model](std::span<const double> at) {
        const double mass = line_moving_mass(model, at);
        double sum = 0.0;
        for (std::size_t i = 0; i < model.loadings.size(); ++i)
            sum += model.damping_weights[i] * 2.0 * at[model.damping_inputs[i]] *
                   (mass + at[model.added_mass_inputs[i]]) * angular_frequency(model, at, i);
        return sum;
    };
}

LineFit line_fit_quality(const ArticleModel& model) {
    const std::vector<double> at = values_of(model);
    const Line line = fitted_line(model, at);
    double chi_squared = 0.0;
    for (std::size_t i = 0; i < model.loadings.size(); ++i) {
        const double inverse = 1.0 / square(angular_frequency(model, at, i));
        const ModelInput& added = model.inputs[model.added_mass_inputs[i]];
        const double misfit = inverse - line.intercept - line.slope * added.value;
        chi_squared +=
            square(misfit) / (square(2.0 * inverse * relative(model.loadings[i].natural_frequency)) +
                              square(line.slope * added.standard_uncertainty));
    }
    LineFit fit;
    fit.degrees_of_freedom = static_cast<double>(model.loadings.size() - 2);
    fit.p_value = 1.0 - chi_squared_probability(chi_squared, fit.degrees_of_freedom);
    fit.birge_ratio = std::max(1.0, std::sqrt(chi_squared / fit.degrees_of_freedom));
    return fit;
}

namespace {

struct Repeatability {
    double share = 0.0;
    double degrees_of_freedom = 0.0;
};

Repeatability repeatability_of(const ArticleModel& model, std::size_t input) {
    for (std::size_t i = 0; i < model.loadings.size(); ++i) {
        const Loading& loading = model.loadings[i];
        if (input == model.frequency_inputs[i])
            return {loading.frequency_repeatability, loading.repeatability_degrees_of_freedom};
        if (input == model.damping_inputs[i])
            return {loading.damping_repeatability, loading.repeatability_degrees_of_freedom};
    }
    return {};
}

/// `line` reduced to `part` of its variance.
BudgetLine part_of(BudgetLine line, double part) {
    line.standard_uncertainty *= std::sqrt(part);
    line.contribution *= std::sqrt(part);
    line.share *= part;
    return line;
}

bool is_result_input(const ArticleModel& model, std::size_t input) {
    return std::ranges::find(model.frequency_inputs, input) != model.frequency_inputs.end() ||
           std::ranges::find(model.damping_inputs, input) != model.damping_inputs.end();
}

}  // namespace

std::vector<BudgetLine> budget_lines(const ArticleModel& model, const Propagated& propagated,
                                     Quantity quantity) {
    std::vector<BudgetLine> lines;
    for (std::size_t i = 0; i < model.inputs.size(); ++i) {
        const ModelInput& input = model.inputs[i];
        const Contribution& added = propagated.contributions[i];
        if (!(added.contribution > 0.0)) continue;
        const BudgetLine line{
            quantity,          input.name,         input.value, input.standard_uncertainty, input.unit,
            added.sensitivity, added.contribution, added.share, input.degrees_of_freedom};
        const Repeatability repeats = repeatability_of(model, i);
        BudgetLine noise = part_of(line, 1.0 - repeats.share);
        if (is_result_input(model, i)) noise.source = "noise in the record: " + input.name;
        if (noise.contribution > 0.0) lines.push_back(noise);
        if (!(repeats.share > 0.0)) continue;
        BudgetLine scatter = part_of(line, repeats.share);
        scatter.source = "repeatability: " + input.name;
        scatter.degrees_of_freedom = repeats.degrees_of_freedom;
        lines.push_back(scatter);
    }
    return lines;
}

}  // namespace ringwright::property
