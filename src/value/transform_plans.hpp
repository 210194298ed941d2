#pragma once
// What FFTW's planner decided on the machine that built the program (cmake/write_transform_plans.cpp).

#include <cstddef>

namespace ringwright {

/// The decision for a forward transform of `length` real numbers (a power of two from 16 to 2²¹), in FFTW's
/// own notation ("wisdom"); null for other lengths. Planning anew takes 1 ms for 8,192 numbers, reading this
/// 0.2 ms.
[[nodiscard]] const char* kept_decision(std::size_t length);

}  // namespace ringwright
