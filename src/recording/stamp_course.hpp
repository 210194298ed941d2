#pragma once
// What the stamps of a long recording say about its clock, without the stamps themselves: a steady clock is
// found while they are read, and the memory for one number a sample is saved.

#include <cstddef>
#include <span>
#include <vector>

namespace ringwright {

/// Stamps that only go forward. Whatever straight line is laid through them, those furthest above and below
/// it are corners of the upper and the lower hull, of which there are few.
struct StampCourse {
    struct Corner {
        double index = 0.0;
        double time = 0.0;
    };
    std::size_t count = 0;
    double first = 0.0, last = 0.0;
    long double sum = 0.0L;       ///< of the stamps less the first
    long double weighted = 0.0L;  ///< of the same, each times its index
    std::vector<Corner> upper, lower;
    bool forward =
        true;  ///< every stamp is a number and greater than the one before; nothing else holds if not
};

[[nodiscard]] StampCourse course_of(std::span<const double> times);

/// The course of the stamps of both, those of `later` behind.
void append(StampCourse& course, const StampCourse& later);

/// Distances of the lowest and the highest stamp from the line start + step * index.
struct Band {
    double low = 0.0, high = 0.0;
};
[[nodiscard]] Band band_about(const StampCourse& course, double start, double step);

}  // namespace ringwright
