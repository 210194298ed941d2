#pragma once
// What the report takes out of a result; whatever is absent or of another kind reads as empty.

#include <nlohmann/json.hpp>
#include <optional>
#include <string>
#include <vector>

#include "ringwright/figures.hpp"

namespace ringwright::drawing {

using Json = nlohmann::ordered_json;

/// The member at the end of the keys; null when there is none.
[[nodiscard]] const Json& at(const Json& json, std::initializer_list<const char*> keys);
[[nodiscard]] std::string text_at(const Json& json, std::initializer_list<const char*> keys);
[[nodiscard]] std::optional<double> number_at(const Json& json, std::initializer_list<const char*> keys);
/// The elements of an array; none when it is no array.
[[nodiscard]] const std::vector<Json>& list_at(const Json& json, std::initializer_list<const char*> keys);

/// One entry of a `quantities` object at the digits that its uncertainty supports.
struct QuantityText {
    std::string name, unit, value, uncertainty, low, high, degrees_of_freedom;
    [[nodiscard]] std::string with_unit() const;  ///< "4.2003 Hz"
    /// "4.2003(19)", the uncertainty in the last digits; "2229(13)", "2228.9(7.3)".
    [[nodiscard]] std::string with_uncertainty() const;
    [[nodiscard]] std::string interval() const;  ///< "4.1965 … 4.2041"; empty when there is none
};
[[nodiscard]] QuantityText quantity_text(const std::string& key, const Json& entry);
/// Degrees of freedom; so many that no factor would show it are ∞.
[[nodiscard]] std::string freedom_text(double degrees_of_freedom);
/// The name for people of a quantity's key, "natural frequency".
[[nodiscard]] std::string quantity_name(const std::string& key);
[[nodiscard]] std::string method_name(const std::string& key);
[[nodiscard]] ShownValue shown_value(const Json& entry);

struct MethodKey {
    const char* key;
    const char* name;
};
inline constexpr MethodKey method_keys[] = {{"logarithmic_decrement", "logarithmic decrement"},
                                            {"half_power_bandwidth", "half-power bandwidth"},
                                            {"curve_fit", "curve fit"}};

}  // namespace ringwright::drawing
