#pragma once
// The result for people, as UTF-8 text for a terminal or a test record.

#include <string>

#include "ringwright/analysis.hpp"

namespace ringwright {

/// What was read, the three methods side by side for every release, the result with one line for each
/// quantity that can be copied into a test record, the budget of what was derived, findings last, and the
/// caution that goes with a measurement. Times in s on the recording's clock.
[[nodiscard]] std::string to_text(const Identification& identification);

/// The parts of it that other commands share: the result lines; the budget; all findings, gathered where
/// several releases share one.
[[nodiscard]] std::string result_lines(const Identification& identification);
[[nodiscard]] std::string budget_text(const Identification& identification);
[[nodiscard]] std::string findings_text(const Identification& identification);
/// Two sentences: what the tested things can do to people, and that the output is a measurement and no
/// release.
[[nodiscard]] std::string caution_text();

}  // namespace ringwright
