#pragma once
// The result as JSON, schema `ringwright.identification.v1` (docs/formats.md). Never NaN or infinity: what
// does not exist has no key.

#include <nlohmann/json_fwd.hpp>
#include <string>
#include <string_view>

#include "ringwright/analysis.hpp"
#include "ringwright/estimate.hpp"
#include "ringwright/finding.hpp"

namespace ringwright {

/// The whole identification.
[[nodiscard]] nlohmann::ordered_json to_json(const Identification& identification);

/// `{"value", "unit", "standard_uncertainty", "interval": [low, high], "degrees_of_freedom"}`; the interval
/// is absent when an end is infinite, the degrees of freedom when they are. Null when value or uncertainty is
/// not finite.
[[nodiscard]] nlohmann::ordered_json to_json(const Estimate& estimate, std::string_view unit);
[[nodiscard]] nlohmann::ordered_json to_json(const Quantities& quantities, bool torsional);
[[nodiscard]] nlohmann::ordered_json to_json(const Findings& findings);
/// `{"name": "ringwright", "version": …}`
[[nodiscard]] nlohmann::ordered_json software_json();

/// Puts the name of a recording into its object: `file`, with U+FFFD for bytes that are no UTF-8, and then its
/// bytes as hexadecimal digits in `file_hex`, so that any name leads back to its file.
void put_file_name(nlohmann::ordered_json& object, const std::string& file);

/// JSON text; bytes that are no UTF-8 (a file name) are replaced, so that it is always valid. `indent` < 0:
/// one line. Ends with a line feed.
[[nodiscard]] std::string to_text(const nlohmann::ordered_json& json, int indent = 2);

/// The estimates in an object such as `result.quantities`; unknown keys are passed over. An absent interval
/// becomes infinite, absent degrees of freedom become infinite. Throws InputError (file `name`, key, remedy)
/// where an entry is not what the schema says.
[[nodiscard]] Quantities quantities_from_json(const nlohmann::ordered_json& object, const std::string& name);

/// Reads a JSON document that a command wrote. Throws InputError naming the file when it cannot be read, is
/// no JSON, or has another schema than `schema` (empty: any).
[[nodiscard]] nlohmann::ordered_json read_result_json(const std::string& path, std::string_view schema);

}  // namespace ringwright
