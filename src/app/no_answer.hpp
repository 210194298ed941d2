#pragma once
// Why nothing answered.

#include "app/answer_options.hpp"
#include "ringwright/analysis.hpp"
#include "ringwright/error.hpp"

namespace ringwright::app {

/// As one problem to put right.
[[nodiscard]] Problem why_no_answer(const Identification& identification);

/// The same without its reason where that stands in the answer just above: in an answer as text on standard
/// output, with messages going to the same place.
[[nodiscard]] Problem why_no_answer_after(const Identification& identification, Format format,
                                          const std::string& output);

}  // namespace ringwright::app
