// Where the numbers of an axis stand. Expected values by hand.
#include <catch2/catch.hpp>
#include <cmath>

#include "drawing/ticks.hpp"

using namespace ringwright::drawing;

namespace {

std::vector<std::string> labels(const Axis& axis) {
    std::vector<std::string> texts;
    for (const Tick& tick : axis.ticks) texts.push_back(tick.label);
    return texts;
}

}  // namespace

TEST_CASE("ticks stand at round numbers within the axis") {
    CHECK(labels(linear_axis(0.0, 10.0, "x", 5)) == std::vector<std::string>{"0", "2", "4", "6", "8", "10"});
    CHECK(labels(linear_axis(-0.05, 0.05, "x", 2)) == std::vector<std::string>{"−0.05", "0.00", "0.05"});
    for (const auto& [low, high] : {std::pair{3.7, 3.9}, std::pair{-1e6, 2e6}, std::pair{1e-9, 2e-9}}) {
        const Axis axis = linear_axis(low, high, "x", 5, 0.05);
        REQUIRE(axis.ticks.size() >= 2);
        for (const Tick& tick : axis.ticks) CHECK((tick.value >= axis.low && tick.value <= axis.high));
    }
}

TEST_CASE("a power of ten common to all numbers moves into the name of the axis") {
    const Axis axis = linear_axis(0.0, 4e-6, "displacement in m", 4);
    CHECK(axis.label == "displacement in m, ×10⁻⁶");
    CHECK(labels(axis) == std::vector<std::string>{"0", "1", "2", "3", "4"});
}

TEST_CASE("an axis of one value or of none still has a range") {
    for (const double value : {0.0, 5.0, -3.0}) {
        const Axis axis = linear_axis(value, value, "x");
        CHECK(axis.low < value);
        CHECK(axis.high > value);
    }
    const Axis axis = linear_axis(NAN, INFINITY, "x");
    CHECK(std::isfinite(axis.low));
    CHECK(axis.high > axis.low);
}

TEST_CASE("a logarithmic axis has 1, 2 and 5 within few decades and only decades within many") {
    CHECK(labels(logarithmic_axis(0.9, 11.0, "a")) == std::vector<std::string>{"1", "2", "5", "10"});
    CHECK(labels(logarithmic_axis(1e-6, 1.0, "a")).front() == "10⁻⁶");
    CHECK(labels(logarithmic_axis(2.5, 16.0, "a")) == std::vector<std::string>{"3", "5", "7", "10"});
}

TEST_CASE("a logarithmic axis of what has no logarithm still has a range") {
    for (const auto& [low, high] : {std::pair{0.0, 0.0}, std::pair{-1.0, 5.0}, std::pair{1.0, 0.0}}) {
        const Axis axis = logarithmic_axis(low, high, "a");
        CHECK(axis.low > 0.0);
        CHECK(axis.high > axis.low);
    }
}

TEST_CASE("a unit of one is not written") {
    CHECK(axis_label("damping ratio", "1") == "damping ratio");
    CHECK(axis_label("displacement", "mm") == "displacement in mm");
}
