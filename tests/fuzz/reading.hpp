#pragma once
// What the targets share: options from the first byte, and the exceptions that a user may see.

#include <cmath>
#include <cstddef>
#include <cstdint>
#include <cstdlib>
#include <string_view>

#include "ringwright/error.hpp"
#include "ringwright/recording.hpp"

namespace ringwright::fuzz {

inline std::string_view text_of(const std::uint8_t* data, std::size_t size) {
    return {reinterpret_cast<const char*>(data), size};
}

/// Stops the fuzzer where a promise is broken.
inline void promise(bool kept) {
    if (!kept) std::abort();
}

inline ReadOptions options_from(std::uint8_t choice) {
    ReadOptions options;
    if ((choice & 1U) != 0) options.rate_hz = 1000.0;
    if ((choice & 2U) != 0) options.channel = "1";
    if ((choice & 4U) != 0) options.channel = "weg";
    if ((choice & 8U) != 0) options.time_column = "none";
    if ((choice & 16U) != 0) options.unit = "mm";
    if ((choice & 32U) != 0) options.sensitivity = "100 mV/g";
    if ((choice & 64U) != 0) options.full_scale = "5 V";
    return options;
}

/// Runs `task`; what is wrong with the input has to be said in full.
template <typename Task>
void with_messages(Task task) {
    try {
        task();
    } catch (const InputError& error) {
        promise(!error.problem().found.empty() && !error.problem().remedy.empty());
    } catch (const UsageError& error) {
        promise(!error.problem().found.empty() && !error.problem().remedy.empty());
    }
}

/// A recording holds finite samples on a clock that goes forward.
inline void check(const Recording& recording, std::size_t bytes) {
    // A sound file may pack silence, never without end (sound_reader.cpp).
    promise(recording.size() <= 64 * bytes + 1'000'000);
    promise(recording.clock.sample_rate_hz > 0.0 && std::isfinite(recording.clock.sample_rate_hz));
    for (const double sample : recording.samples) promise(std::isfinite(sample));
    const auto& times = recording.clock.times_s;
    promise(times.empty() || times.size() == recording.size());
    for (std::size_t i = 1; i < times.size(); ++i) promise(times[i] > times[i - 1]);
}

}  // namespace ringwright::fuzz
