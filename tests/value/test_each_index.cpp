// Work handed out to threads, and the power spectrum that they share plans of.

#include <algorithm>
#include <array>
#include <atomic>
#include <catch2/catch.hpp>
#include <cmath>
#include <numbers>
#include <stdexcept>
#include <vector>

#include "ringwright/each_index.hpp"
#include "ringwright/power_spectrum.hpp"
#include "value/transform_plans.hpp"

using namespace ringwright;

TEST_CASE("each index is worked on once, on no more threads than asked for") {
    for (const unsigned threads : {0U, 1U, 3U, 50U}) {
        std::vector<std::atomic<int>> calls(40);
        std::atomic<unsigned> highest{0};
        for_each_index(calls.size(), threads, [&](std::size_t i, unsigned thread) {
            ++calls[i];
            unsigned seen = highest;
            while (seen < thread && !highest.compare_exchange_weak(seen, thread)) {
            }
        });
        for (const auto& count : calls) CHECK(count == 1);
        CHECK(highest < std::max(1U, threads));
    }
    CHECK(threads_for(7) == 7);
    CHECK(threads_for(0) >= 1);
}

TEST_CASE("what a call throws is thrown again when all threads have ended") {
    for (const unsigned threads : {1U, 3U}) {
        int calls = 0;  // by the thread that has index 5, which is the only one where there is one
        CHECK_THROWS_AS(for_each_index(1000, threads,
                                       [&](std::size_t i, unsigned) {
                                           if (threads == 1) ++calls;
                                           if (i == 5) throw std::runtime_error("five");
                                       }),
                        std::runtime_error);
        if (threads == 1) CHECK(calls == 6);
    }
    for_each_index(0, 3, [&](std::size_t, unsigned) { FAIL("nothing to do"); });
}

TEST_CASE("the power of a cosine stands at its frequency, and that of all lines is the sum of squares") {
    // n = 64 values, 16 whole cycles in 256 padded to: |DFT|² of the unpadded cosine at its line is (n/2)².
    // Parseval: n Σ y² = P_0 + 2 Σ P_j + P_{n/2}.
    constexpr std::size_t count = 64, length = 256;
    std::vector<double> values;
    double squares = 0.0;
    for (std::size_t k = 0; k < count; ++k) {
        values.push_back(std::cos(2.0 * std::numbers::pi * 4.0 * static_cast<double>(k) / count));
        squares += values.back() * values.back();
    }
    std::array<std::vector<double>, 8> spectra;
    for_each_index(spectra.size(), 4,
                   [&](std::size_t i, unsigned) { spectra[i] = padded_power_spectrum(values, 4.0); });
    for (const auto& power : spectra) {
        REQUIRE(power.size() == length / 2 + 1);
        CHECK(power[16] == Approx(0.25 * count * count));
        double sum = power.front() + power.back();
        for (std::size_t j = 1; j + 1 < power.size(); ++j) sum += 2.0 * power[j];
        CHECK(sum == Approx(length * squares));
        CHECK(power == spectra[0]);
    }
    CHECK(padded_power_spectrum(std::vector<double>{1.0}, 1.0).size() == 9);
}

TEST_CASE("what the planner decided when the program was built is there for each length that is asked for") {
    // Every power of two from the shortest that padded_power_spectrum takes; a spectrum of one spike is flat.
    for (std::size_t length = 16; length <= std::size_t{1} << 21U; length *= 2) {
        CAPTURE(length);
        CHECK(kept_decision(length) != nullptr);
        std::vector<double> spike(length, 0.0);
        spike[length / 3] = 2.0;
        const std::vector<double> power = padded_power_spectrum(spike, 1.0);
        REQUIRE(power.size() == length / 2 + 1);
        const auto [least, most] = std::ranges::minmax(power);
        CHECK(least == Approx(4.0));
        CHECK(most == Approx(4.0));
    }
    CHECK(kept_decision(48) == nullptr);
}
