#include <algorithm>
#include <array>

#include "ringwright/conformity.hpp"

namespace ringwright {
namespace {

constexpr std::array rules{DecisionRule::simple_acceptance, DecisionRule::guarded_acceptance,
                           DecisionRule::guarded_rejection};
constexpr std::array decisions{Decision::conforms, Decision::does_not_conform, Decision::undecided};

template <class Values>
auto named(const Values& values, std::string_view text) {
    const auto found = std::ranges::find_if(values, [&](auto value) { return to_text(value) == text; });
    return found == values.end() ? std::nullopt : std::optional(*found);
}

}  // namespace

std::string_view to_text(DecisionRule rule) {
    switch (rule) {
        case DecisionRule::simple_acceptance:
            return "simple acceptance";
        case DecisionRule::guarded_acceptance:
            return "guarded acceptance";
        case DecisionRule::guarded_rejection:
            return "guarded rejection";
    }
    return "";
}

std::optional<DecisionRule> decision_rule_from_text(std::string_view text) {
    return named(rules, text);
}

std::string_view to_text(Decision decision) {
    switch (decision) {
        case Decision::conforms:
            return "conforms";
        case Decision::does_not_conform:
            return "does_not_conform";
        case Decision::undecided:
            return "undecided";
    }
    return "";
}

std::optional<Decision> decision_from_text(std::string_view text) {
    return named(decisions, text);
}

}  // namespace ringwright
