// Reads a recording and does nothing with it: read_only FILE prints the samples and the seconds it took
// inside the process.

#include <fmt/format.h>

#include <chrono>

#include "ringwright/recording.hpp"

int main(int count, char** arguments) {
    if (count != 2) return 2;
    const auto begun = std::chrono::steady_clock::now();
    const ringwright::Recording recording = ringwright::read_recording(arguments[1]);
    const std::chrono::duration<double> took = std::chrono::steady_clock::now() - begun;
    fmt::print("{} {:.6f}\n", recording.size(), took.count());
}
