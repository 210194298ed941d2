#pragma once
#include <mutex>

namespace ringwright {

/// FFTW plans share state that is not safe to touch from several threads at once, and the rooms that
/// transform run side by side: all of them make and destroy their plans under this one lock. Executing a plan
/// needs none.
[[nodiscard]] std::mutex& transform_planner();

}  // namespace ringwright
