#pragma once
// A decay as the search holds it, before it becomes an Event.

#include <string>
#include <vector>

#include "event/course.hpp"
#include "event/free_fall.hpp"
#include "ringwright/event.hpp"

namespace ringwright::event_search {

struct Found {
    Start start;
    Course course;
    std::size_t quiet_begin = 0, quiet_end = 0;
    Findings findings;
    std::vector<Flight> flights = {};  ///< of a drop
    bool hold_seen = false;            ///< of a drop: the recording goes back before the release
    bool beats = false;                ///< with the start's companion
    [[nodiscard]] std::size_t begin() const { return start.position; }
    [[nodiscard]] std::size_t end() const { return course.end; }
    /// First position that belongs to the test: of the fall, or of the decay.
    [[nodiscard]] std::size_t since() const { return flights.empty() ? begin() : flights.front().begin; }
    [[nodiscard]] bool is_drop() const { return !flights.empty(); }
    [[nodiscard]] double cycle() const;  ///< positions of one undamped cycle
};

}  // namespace ringwright::event_search
