#pragma once
// Recordings of known truth for tests and studies: one decaying oscillation with noise of a known kind.

#include <cstdint>
#include <random>
#include <vector>

#include "ringwright/event.hpp"
#include "ringwright/recording.hpp"

namespace simulated {

struct Truth {
    double frequency_hz = 5.0;  // undamped
    double damping_ratio = 0.05;
    double cycles = 20.0;  // undamped periods from the release to the end of the recording
    double samples_per_cycle = 100.0;
    double signal_to_noise_db = 40.0;  // 20 log10(start amplitude / rms of the noise)
    double noise_correlation = 0.0;    // φ of AR(1) noise
    double hum_share = 0.0;            // amplitude of 50 Hz hum over the start amplitude
    double hum_hz = 50.0;
    int bits = 0;                    // 0: not quantised; else steps over ±1.2 start amplitudes
    double clip_share = 0.0;         // rail as share of the start amplitude; 0: no rail
    double jitter_share = 0.0;       // standard deviation of the sampling instants in steps
    double held_cycles = 0.0;        // plateau before the release, undamped periods
    double letting_go_cycles = 0.0;  // over which the holding force falls to nothing, undamped periods
    double offset = 0.3;
};

// Portable across standard libraries: xoshiro-free, by the polar method on mt19937_64.
class Deviates {
  public:
    explicit Deviates(std::uint64_t seed) : engine_(seed) {}
    double uniform() { return static_cast<double>(engine_() >> 11) * 0x1.0p-53; }
    double normal();

  private:
    std::mt19937_64 engine_;
    bool stored_ = false;
    double next_ = 0.0;
};

struct Sample {
    ringwright::Recording recording;
    ringwright::Event event;  // the true one
};

[[nodiscard]] Sample draw(const Truth& truth, Deviates& deviates);

/// Cramér–Rao bounds of ln(frequency) and of the damping ratio for the samples from the release on, for the
/// noise that is present (AR(1) of known correlation and variance), offset and both amplitudes unknown.
struct Bound {
    double log_frequency = 0.0, damping_ratio = 0.0;
};
[[nodiscard]] Bound cramer_rao(const Truth& truth);

}  // namespace simulated
