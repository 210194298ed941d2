#pragma once
// Just enough reading of markup for the tests.

#include <string>
#include <vector>

namespace ringwright::markup {

/// What is wrong with the nesting of the tags; empty when every tag is closed in its turn. `html`: the
/// tags of HTML that are never closed are passed over.
[[nodiscard]] std::string nesting_fault(const std::string& text, bool html);
/// Every value of an attribute.
[[nodiscard]] std::vector<std::string> attribute_values(const std::string& text, const std::string& name);
/// How often a text occurs.
[[nodiscard]] std::size_t count_of(const std::string& text, const std::string& wanted);

}  // namespace ringwright::markup
