#include "ringwright/version.hpp"

namespace ringwright {

std::string_view version() {
    return RINGWRIGHT_VERSION;
}

}  // namespace ringwright
