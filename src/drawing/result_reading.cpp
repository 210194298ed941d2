#include "drawing/result_reading.hpp"

#include <fmt/format.h>

#include <cmath>
#include <limits>

#include "ringwright/estimate.hpp"
#include "ringwright/measured_value.hpp"

namespace ringwright::drawing {
namespace {

const Json nothing;

double number_or(const Json& json, const char* key, double otherwise) {
    return number_at(json, {key}).value_or(otherwise);
}

Estimate estimate_of(const Json& entry) {
    constexpr double infinite = std::numeric_limits<double>::infinity();
    Estimate estimate;
    estimate.value = number_or(entry, "value", 0.0);
    estimate.standard_uncertainty = number_or(entry, "standard_uncertainty", 0.0);
    estimate.degrees_of_freedom = number_or(entry, "degrees_of_freedom", infinite);
    const auto& ends = list_at(entry, {"interval"});
    const bool both = ends.size() == 2 && ends[0].is_number() && ends[1].is_number();
    estimate.interval =
        both ? Interval{ends[0].get<double>(), ends[1].get<double>()} : Interval{-infinite, infinite};
    return estimate;
}

}  // namespace

const Json& at(const Json& json, std::initializer_list<const char*> keys) {
    const Json* here = &json;
    for (const char* key : keys) {
        if (!here->is_object()) return nothing;
        const auto found = here->find(key);
        if (found == here->end()) return nothing;
        here = &*found;
    }
    return *here;
}

std::string text_at(const Json& json, std::initializer_list<const char*> keys) {
    const Json& found = at(json, keys);
    if (found.is_string()) return found.get<std::string>();
    if (found.is_number_integer()) return fmt::format("{}", found.get<long long>());
    return found.is_number() ? fmt::format("{:.6g}", found.get<double>()) : "";
}

std::optional<double> number_at(const Json& json, std::initializer_list<const char*> keys) {
    const Json& found = at(json, keys);
    if (!found.is_number()) return std::nullopt;
    return found.get<double>();
}

const std::vector<Json>& list_at(const Json& json, std::initializer_list<const char*> keys) {
    static const std::vector<Json> none;
    const Json& found = at(json, keys);
    return found.is_array() ? found.get_ref<const Json::array_t&>() : none;
}

std::string QuantityText::with_unit() const {
    return unit.empty() ? value : value + " " + unit;
}

std::string QuantityText::with_uncertainty() const {
    if (uncertainty.empty() || uncertainty.find_first_not_of("0123456789.") != std::string::npos)
        return uncertainty.empty() ? value : value + " ± " + uncertainty;
    const bool below_one = uncertainty.starts_with("0.");
    const std::size_t first = uncertainty.find_first_of("123456789");
    if (first == std::string::npos) return value;
    return value + "(" + (below_one ? uncertainty.substr(first) : uncertainty) + ")";
}

std::string QuantityText::interval() const {
    return low.empty() ? "" : low + " … " + high;
}

QuantityText quantity_text(const std::string& key, const Json& entry) {
    const Estimate estimate = estimate_of(entry);
    const RoundedEstimate rounded = round_to_uncertainty(estimate);
    const std::string unit = text_at(entry, {"unit"});
    QuantityText text{quantity_name(key), unit == "1" ? "" : unit, rounded.value, {}, {}, {}, {}};
    if (number_at(entry, {"standard_uncertainty"})) text.uncertainty = rounded.standard_uncertainty;
    if (std::isfinite(estimate.interval.low)) text.low = rounded.low, text.high = rounded.high;
    if (std::isfinite(estimate.degrees_of_freedom))
        text.degrees_of_freedom = freedom_text(estimate.degrees_of_freedom);
    return text;
}

std::string freedom_text(double degrees_of_freedom) {
    if (degrees_of_freedom >= 1e5) return "∞";
    return degrees_of_freedom >= 100.0 ? fmt::format("{:.0f}", degrees_of_freedom)
                                       : fmt::format("{:.3g}", degrees_of_freedom);
}

std::string quantity_name(const std::string& key) {
    const auto quantity = quantity_from_key(key);
    return quantity ? std::string(name_of(*quantity)) : key;
}

std::string method_name(const std::string& key) {
    for (const MethodKey& method : method_keys)
        if (key == method.key) return method.name;
    return key;
}

ShownValue shown_value(const Json& entry) {
    const Estimate estimate = estimate_of(entry);
    ShownValue shown{estimate.value};
    if (std::isfinite(estimate.interval.low))
        shown.low = estimate.interval.low, shown.high = estimate.interval.high;
    return shown;
}

}  // namespace ringwright::drawing
