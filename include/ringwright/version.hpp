#pragma once
#include <string_view>
namespace ringwright {
/// Version of the library, e.g. "0.1.0".
[[nodiscard]] std::string_view version();
}  // namespace ringwright
