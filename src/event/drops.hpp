#pragma once
// Drops: a fall, perhaps bounces, and the free decay in the last unbroken contact.

#include <string>
#include <vector>

#include "event/found.hpp"
#include "ringwright/recording.hpp"

namespace ringwright::event_search {

/// A fall after which nothing rings as a mass on a spring does; positions of the series.
struct RefusedFall {
    std::size_t begin = 0, end = 0;
    std::string reason;
};

struct Drops {
    std::vector<Found> found;
    std::vector<RefusedFall> refused;
};

/// The drops of a recording in SI units. `said`: the user says that the article was dropped.
[[nodiscard]] Drops find_drops(const Pyramid& pyramid, double rate_hz, MeasuredQuantity quantity, bool said);

}  // namespace ringwright::event_search
