#include "app/judging.hpp"

#include <cmath>

namespace ringwright::app {
namespace {

/// Contributions that every release draws anew; all others come from what was weighed or calibrated.
bool drawn_anew(const BudgetLine& line) {
    return line.source.starts_with("noise in the record") || line.source.starts_with("repeatability") ||
           line.source.find("frequency") != std::string::npos ||
           line.source.find("damping ratio") != std::string::npos;
}

/// Root of the sum of squares of the contributions from what is weighed or calibrated.
double from_inputs(const PooledResult& result, Quantity quantity) {
    double squares = 0.0;
    for (const BudgetLine& line : result.budget)
        if (line.quantity == quantity && !drawn_anew(line)) squares += line.contribution * line.contribution;
    return std::sqrt(squares);
}

}  // namespace

std::map<Quantity, UncertaintyParts> uncertainty_parts(const PooledResult& result) {
    std::map<Quantity, UncertaintyParts> parts;
    for (const auto& [quantity, estimate] : result.quantities) {
        const double u = estimate.standard_uncertainty;
        const double inputs = std::min(u, from_inputs(result, quantity));
        parts[quantity] = {std::sqrt(u * u - inputs * inputs), inputs, result.event_count};
    }
    return parts;
}

CommonContributions common_contributions(const PooledResult& before, const PooledResult& after) {
    CommonContributions common;
    for (const auto& [quantity, estimate] : before.quantities)
        if (after.quantities.contains(quantity))
            common[quantity] = {
                std::min(estimate.standard_uncertainty, from_inputs(before, quantity)),
                std::min(after.quantities.at(quantity).standard_uncertainty, from_inputs(after, quantity))};
    return common;
}

}  // namespace ringwright::app
