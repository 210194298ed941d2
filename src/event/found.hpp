#pragma once
// A decay as the search holds it, before it becomes an Event.

#include <string>
#include <vector>

#include "event/course.hpp"
#include "ringwright/event.hpp"

namespace ringwright::event_search {

struct Found {
    Start start;
    Course course;
    std::size_t quiet_begin = 0, quiet_end = 0;
    Findings findings;
    [[nodiscard]] std::size_t begin() const { return start.position; }
    [[nodiscard]] std::size_t end() const { return course.end; }
    [[nodiscard]] double cycle() const;  ///< positions of one undamped cycle
};

}  // namespace ringwright::event_search
