#pragma once
// A verdict and a comparison as JSON and as text.

#include <nlohmann/json_fwd.hpp>
#include <string>

#include "ringwright/comparison.hpp"
#include "ringwright/conformity.hpp"

namespace ringwright {

/// The value of the key `verdict` in ringwright.identification.v1 (docs/judging.md). SI units; what
/// does not exist has no key.
[[nodiscard]] nlohmann::ordered_json to_json(const Verdict& verdict, bool torsional);
/// The verdict as a table of limits, then what each decision says, then the overall decision.
[[nodiscard]] std::string to_text(const Verdict& verdict, bool torsional);
/// One row a limit, with a header row.
[[nodiscard]] std::string to_csv(const Verdict& verdict, bool torsional);
/// "conforms", "does not conform", "undecided".
[[nodiscard]] std::string spoken(Decision decision);

/// The value of the key `quantities` in ringwright.comparison.v1.
[[nodiscard]] nlohmann::ordered_json to_json(const Comparison& comparison, bool torsional);
/// The comparison as a table, and a sentence for each quantity.
[[nodiscard]] std::string to_text(const Comparison& comparison, bool torsional);
/// One row a quantity, with a header row.
[[nodiscard]] std::string to_csv(const Comparison& comparison, bool torsional);

}  // namespace ringwright
