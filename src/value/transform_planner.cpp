#include "ringwright/transform_planner.hpp"

namespace ringwright {

std::mutex& transform_planner() {
    static std::mutex mutex;
    return mutex;
}

}  // namespace ringwright
