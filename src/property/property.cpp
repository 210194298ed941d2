#include "ringwright/property.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <numbers>
#include <span>

#include "property/article_model.hpp"
#include "ringwright/error.hpp"
#include "ringwright/propagation.hpp"

namespace ringwright {
namespace {

using property::ArticleModel;

void check_article(const std::vector<Loading>& loadings, const Article& article) {
    if (article.mass && article.inertia)
        throw UsageError({"", "", "a mass and an inertia were both given",
                          "Give --mass for a test in a straight line or --inertia for a torsion test"});
    const auto require_positive = [](const std::optional<MeasuredValue>& value, const char* name) {
        if (value && !(value->value > 0.0))
            throw UsageError(
                {"", "", fmt::format("the {} is not positive", name), "Give the value that was weighed"});
    };
    require_positive(article.mass, "mass");
    require_positive(article.inertia, "inertia");
    require_positive(article.spring_mass, "spring mass");
    for (const Loading& loading : loadings)
        if (loading.added_mass.value < 0.0)
            throw UsageError(
                {"", "", "an added mass is negative",
                 "Give the mass of the article without it as --mass, and what was added as --added-mass"});
}

void add_quantity(PropertyResult& result, const ArticleModel& model, Quantity quantity,
                  const ModelFunction& function, double confidence_level, bool positive = true) {
    const Propagated propagated = propagate(model.inputs, function, model.correlations);
    if (!std::isfinite(propagated.value) || !(propagated.standard_uncertainty > 0.0)) return;
    result.quantities[quantity] =
        estimate_of(propagated, model.inputs, model.correlations, confidence_level, positive);
    const auto lines = property::budget_lines(model, propagated, quantity);
    result.budget.insert(result.budget.end(), lines.begin(), lines.end());
}

void note_heavy_spring(PropertyResult& result, const Article& article, double load) {
    if (!article.spring_mass || !(load > 0.0)) return;
    const double shortfall = 1.0 - rule_of_a_third_ratio(article.spring_mass->value / load);
    // A tenth of a per cent is what a good weighing and a good record leave.
    if (shortfall < 1e-3) return;
    result.findings.push_back(
        {"heavy_spring", Severity::caution,
         fmt::format(
             "The spring weighs {:.0f} % of the load on it, so that counting a third of its mass puts the "
             "stiffness about {:.1f} % too low for a uniform spring. Test with a heavier load",
             100.0 * article.spring_mass->value / load, 100.0 * shortfall)});
}

// Forces of a damping law. Its viscous part may be nothing, and then lies on either side of zero.
void add_law(PropertyResult& result, const std::vector<Loading>& loadings, const Article& article,
             double confidence_level, const CommonInfluences& influences) {
    for (const Quantity quantity :
         {Quantity::damping_coefficient, Quantity::friction_force, Quantity::compression_damping,
          Quantity::rebound_damping, Quantity::quadratic_damping, Quantity::cubic_stiffness}) {
        ArticleModel model = property::article_model(loadings, article, influences);
        const ModelFunction coefficient = property::law_coefficient(model, quantity);
        if (coefficient) add_quantity(result, model, quantity, coefficient, confidence_level, false);
    }
}

bool has_law(const std::vector<Loading>& loadings) {
    return std::ranges::any_of(loadings, [](const Loading& loading) { return !loading.per_mass.empty(); });
}

PropertyResult with_known_mass(const std::vector<Loading>& loadings, const Article& article,
                               double confidence_level, const CommonInfluences& influences) {
    const ArticleModel model = property::article_model(loadings, article, influences);
    PropertyResult result;
    add_quantity(result, model, Quantity::stiffness, property::mean_stiffness(model), confidence_level);
    if (has_law(loadings))
        add_law(result, loadings, article, confidence_level, influences);
    else
        add_quantity(result, model, Quantity::damping_coefficient, property::mean_damping(model),
                     confidence_level);
    if (article.mass)
        note_heavy_spring(result, article, article.mass->value + loadings.front().added_mass.value);
    return result;
}

void check_loadings_differ(const std::vector<Loading>& loadings) {
    const auto [least, most] = std::ranges::minmax_element(
        loadings, {}, [](const Loading& loading) { return loading.added_mass.value; });
    if (most->added_mass.value - least->added_mass.value > 1e-9 * most->added_mass.value) return;
    throw UsageError({"--added-mass", "", "the loadings do not differ",
                      "Test with at least two different added masses, or give --mass"});
}

void widen_by_scatter(PropertyResult& result, ArticleModel& model) {
    const property::LineFit fit = property::line_fit_quality(model);
    if (fit.p_value >= 0.05) return;
    for (const std::size_t input : model.frequency_inputs) {
        model.inputs[input].standard_uncertainty *= fit.birge_ratio;
        model.inputs[input].degrees_of_freedom = fit.degrees_of_freedom;
        model.inputs[input].interval.reset();
    }
    result.findings.push_back(
        {"loading_line_scatter", Severity::caution,
         fmt::format(
             "The loadings lie off the straight line of 1/ω² against added mass by {:.1f} times what their "
             "uncertainties allow (p = {:.2g}); the uncertainties were widened by as much. Check that the "
             "masses sat firmly and that the spring works in its straight range",
             fit.birge_ratio, fit.p_value)});
}

PropertyResult with_unknown_mass(const std::vector<Loading>& loadings, const Article& article, bool torsional,
                                 double confidence_level, const CommonInfluences& influences) {
    check_loadings_differ(loadings);
    PropertyResult result;
    ArticleModel model = property::article_model(loadings, article, influences);
    const property::Line line = property::fitted_line(model, property::values_of(model));
    if (!(line.slope > 0.0) || !(line.intercept > 0.0)) {
        result.findings.push_back({"loading_line_unusable", Severity::defect,
                                   "The frequency does not fall with added mass as it must, so neither "
                                   "stiffness nor mass can be told. "
                                   "Check which added mass belongs to which recording"});
        return result;
    }
    if (loadings.size() > 2) widen_by_scatter(result, model);
    add_quantity(result, model, Quantity::stiffness, property::line_stiffness(model), confidence_level);
    add_quantity(result, model, Quantity::damping_coefficient, property::line_damping(model),
                 confidence_level);
    add_quantity(result, model, torsional ? Quantity::inertia : Quantity::mass, property::line_mass(model),
                 confidence_level);
    if (!article.spring_mass)
        result.findings.push_back(
            {"moving_mass", Severity::note,
             "The mass found from the loadings is all that moves, a third of the spring "
             "included; with --spring-mass that part is taken off"});
    return result;
}

}  // namespace

double rule_of_a_third_ratio(double spring_over_load) {
    // β tan β rises from 0 without bound on (0, π/2).
    double low = 0.0;
    double high = std::numbers::pi / 2.0;
    for (int step = 0; step < 100; ++step) {
        const double middle = 0.5 * (low + high);
        (middle * std::tan(middle) < spring_over_load ? low : high) = middle;
    }
    return (1.0 / spring_over_load + 1.0 / 3.0) * low * low;
}

PropertyResult derive_properties(const std::vector<Loading>& loadings, const Article& article, bool torsional,
                                 double confidence_level, const CommonInfluences& influences) {
    if (loadings.empty()) return {};
    check_article(loadings, article);
    if (article.mass || article.inertia)
        return with_known_mass(loadings, article, confidence_level, influences);
    if (loadings.size() > 1)
        return with_unknown_mass(loadings, article, torsional, confidence_level, influences);
    return {};
}

}  // namespace ringwright
