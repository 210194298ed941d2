#pragma once
// How much the search works, counted: unlike time it is the same on every machine.

#include <cstddef>

namespace ringwright::event_search {

/// Shapes that were refined to least squares by this thread since it began, of one decay or of two.
inline thread_local std::size_t refined_shapes = 0;

}  // namespace ringwright::event_search
