#include "recording/stamp_course.hpp"

#include <algorithm>

namespace ringwright {
namespace {

using Corner = StampCourse::Corner;

// How far b lies above the line from a to c, times their distance: at or below 0 for a corner of no upper
// hull.
double rise(const Corner& a, const Corner& b, const Corner& c) {
    return (b.time - a.time) * (c.index - a.index) - (c.time - a.time) * (b.index - a.index);
}

void add_corner(std::vector<Corner>& hull, const Corner& corner, double side) {
    while (hull.size() >= 2 && side * rise(hull[hull.size() - 2], hull.back(), corner) <= 0.0)
        hull.pop_back();
    hull.push_back(corner);
}

}  // namespace

StampCourse course_of(std::span<const double> times) {
    StampCourse course;
    if (times.empty()) return course;
    course.count = times.size();
    course.first = times.front();
    course.last = times.back();
    double sum = 0.0, weighted = 0.0;
    for (std::size_t i = 0; i < times.size(); ++i) {
        // NaN fails the comparison.
        if (!(i == 0 ? times[0] == times[0] : times[i] > times[i - 1])) course.forward = false;
        const double index = static_cast<double>(i), past = times[i] - course.first;
        sum += past;
        weighted += past * index;
    }
    course.sum = sum;
    course.weighted = weighted;
    for (std::size_t i = 0; course.forward && i < times.size(); ++i) {
        const Corner corner{static_cast<double>(i), times[i]};
        add_corner(course.upper, corner, 1.0);
        add_corner(course.lower, corner, -1.0);
    }
    return course;
}

void append(StampCourse& course, const StampCourse& later) {
    if (later.count == 0) return;
    if (course.count == 0) {
        course = later;
        return;
    }
    course.forward = course.forward && later.forward && later.first > course.last;
    const auto shift = static_cast<double>(course.count);
    const auto n = static_cast<long double>(later.count);
    const long double ahead = static_cast<long double>(later.first) - course.first;
    const long double indices = n * (n - 1.0L) / 2.0L + n * static_cast<long double>(shift);
    course.sum += later.sum + n * ahead;
    course.weighted += later.weighted + static_cast<long double>(shift) * later.sum + ahead * indices;
    for (const Corner& corner : later.upper)
        add_corner(course.upper, {corner.index + shift, corner.time}, 1.0);
    for (const Corner& corner : later.lower)
        add_corner(course.lower, {corner.index + shift, corner.time}, -1.0);
    course.count += later.count;
    course.last = later.last;
}

Band band_about(const StampCourse& course, double start, double step) {
    Band band;
    const auto distance = [&](const Corner& corner) { return corner.time - start - step * corner.index; };
    for (std::size_t i = 0; i < course.upper.size(); ++i) {
        const double above = distance(course.upper[i]);
        band.high = i == 0 ? above : std::max(band.high, above);
    }
    for (std::size_t i = 0; i < course.lower.size(); ++i) {
        const double below = distance(course.lower[i]);
        band.low = i == 0 ? below : std::min(band.low, below);
    }
    return band;
}

}  // namespace ringwright
