#pragma once
// Counts in sentences: "1 row", "2 rows".

#include <cstddef>
#include <string>

namespace ringwright {

/// "1 row has", "2 rows have": the count and the words that go with it. Without `many`, an s is added.
[[nodiscard]] std::string counted(std::size_t count, const std::string& one, const std::string& many = "");

}  // namespace ringwright
