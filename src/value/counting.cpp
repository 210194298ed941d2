#include "ringwright/counting.hpp"

namespace ringwright {

std::string counted(std::size_t count, const std::string& one, const std::string& many) {
    if (count == 1) return "1 " + one;
    return std::to_string(count) + " " + (many.empty() ? one + "s" : many);
}

}  // namespace ringwright
