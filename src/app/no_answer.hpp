#pragma once
// Why nothing answered.

#include "ringwright/analysis.hpp"
#include "ringwright/error.hpp"

namespace ringwright::app {

/// As one problem to put right.
[[nodiscard]] Problem why_no_answer(const Identification& identification);

}  // namespace ringwright::app
