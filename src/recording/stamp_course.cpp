#include "recording/stamp_course.hpp"

#include <algorithm>
#include <array>
#include <numeric>

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

constexpr std::size_t lanes = 4;

// Of a signed number: the processor turns it into a double in one step.
double index_of(std::size_t i) {
    return static_cast<double>(static_cast<std::ptrdiff_t>(i));
}

// Of every few stamps, those furthest above and below the line from the first to the last.
class Outline {
  public:
    explicit Outline(std::span<const double> times)
        : times_(times),
          slope_((times.back() - times.front()) / std::max(1.0, static_cast<double>(times.size()) - 1.0)) {
        for (std::size_t begin = 0; begin < times.size(); begin += block) blocks_.push_back(band_of(begin));
    }

    // The hull of one side (1 above, −1 below). A block that stays within the hull of all blocks' furthest
    // stamps adds nothing to it: mostly all but the few that carry its corners.
    [[nodiscard]] std::vector<Corner> hull(double side) const {
        std::vector<Corner> rough, corners;
        add_corner(rough, corner(0), side);
        const auto add = [&](std::size_t i) {
            if (rough.back().index < index_of(i)) add_corner(rough, corner(i), side);
        };
        for (std::size_t i = 0; i < blocks_.size(); ++i) add(furthest(i, side));
        add(times_.size() - 1);
        std::size_t at = 0;
        for (std::size_t i = 0; i < blocks_.size(); ++i) {
            const std::size_t begin = i * block, end = std::min(begin + block, times_.size());
            const double most = side > 0.0 ? blocks_[i].high : -blocks_[i].low;
            std::size_t from = at;
            const double at_begin = hull_at(rough, at, begin, side);
            if (most < std::min(at_begin, hull_at(rough, at, end - 1, side))) continue;
            for (std::size_t k = begin; k < end; ++k)
                if (side * above_line(corner(k)) >= hull_at(rough, from, k, side))
                    add_corner(corners, corner(k), side);
        }
        return corners;
    }

  private:
    static constexpr std::size_t block = 64;

    [[nodiscard]] Corner corner(std::size_t i) const { return {index_of(i), times_[i]}; }
    [[nodiscard]] double above_line(const Corner& corner) const {
        return corner.time - times_.front() - slope_ * corner.index;
    }

    [[nodiscard]] Band band_of(std::size_t begin) const {
        std::array<double, lanes> low{}, high{};
        low.fill(above_line(corner(begin))), high = low;
        const auto take = [&](std::size_t i, std::size_t lane) {
            const double here = above_line(corner(i));
            low[lane] = here < low[lane] ? here : low[lane];
            high[lane] = here > high[lane] ? here : high[lane];
        };
        const std::size_t end = std::min(begin + block, times_.size());
        std::size_t i = begin;
        for (; i + lanes <= end; i += lanes)
            for (std::size_t lane = 0; lane < lanes; ++lane) take(i + lane, lane);
        for (; i < end; ++i) take(i, 0);
        return {*std::ranges::min_element(low), *std::ranges::max_element(high)};
    }

    [[nodiscard]] std::size_t furthest(std::size_t i, double side) const {
        const double wanted = side > 0.0 ? blocks_[i].high : blocks_[i].low;
        std::size_t at = i * block;
        while (at + 1 < std::min((i + 1) * block, times_.size()) && above_line(corner(at)) != wanted) ++at;
        return at;
    }

    // How far the hull lies beyond the line at sample i; `at` is a corner at or before it and moves on.
    [[nodiscard]] double hull_at(const std::vector<Corner>& hull, std::size_t& at, std::size_t i,
                                 double side) const {
        const double index = index_of(i);
        while (at + 1 < hull.size() && hull[at + 1].index <= index) ++at;
        const double here = side * above_line(hull[at]);
        if (at + 1 == hull.size()) return here;
        const double share = (index - hull[at].index) / (hull[at + 1].index - hull[at].index);
        return here + share * (side * above_line(hull[at + 1]) - here);
    }

    std::span<const double> times_;
    double slope_ = 0.0;
    std::vector<Band> blocks_;
};

}  // namespace

StampCourse course_of(std::span<const double> times) {
    StampCourse course;
    if (times.empty()) return course;
    course.count = times.size();
    course.first = times.front();
    course.last = times.back();
    // Sums side by side: they do not wait for each other.
    std::array<double, lanes> sum{}, weighted{};
    const auto take = [&](std::size_t i, std::size_t lane) {
        const double past = times[i] - course.first;
        sum[lane] += past;
        weighted[lane] += past * index_of(i);
    };
    std::size_t i = 0;
    for (; i + lanes <= times.size(); i += lanes)
        for (std::size_t lane = 0; lane < lanes; ++lane) take(i + lane, lane);
    for (; i < times.size(); ++i) take(i, 0);
    course.sum = std::accumulate(sum.begin(), sum.end(), 0.0L);
    course.weighted = std::accumulate(weighted.begin(), weighted.end(), 0.0L);
    // NaN fails the comparison.
    std::size_t steps = times[0] == times[0] ? 1 : 0;
    for (std::size_t k = 1; k < times.size(); ++k) steps += times[k] > times[k - 1] ? 1 : 0;
    course.forward = steps == times.size();
    if (!course.forward) return course;
    const Outline outline(times);
    course.upper = outline.hull(1.0);
    course.lower = outline.hull(-1.0);
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
