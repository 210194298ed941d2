#pragma once
// Finding each release, tap or drop in a recording, and the stretch of free decay that follows it.

#include <cstddef>
#include <optional>
#include <string>
#include <string_view>
#include <vector>

#include "ringwright/finding.hpp"
#include "ringwright/long_recording.hpp"
#include "ringwright/recording.hpp"

namespace ringwright {

enum class TestKind { pluck, tap, drop };
[[nodiscard]] std::string_view to_text(TestKind kind);
[[nodiscard]] std::optional<TestKind> test_kind_from_text(std::string_view text);

/// One free decay. Sample indices, half-open: [quiet_begin, quiet_end) is the undisturbed stretch before the
/// hand or hammer (empty when there is none, then at the end of what belongs to the event before); [begin,
/// end) runs from the first sample of free decay to the noise floor; [end, rest_end) is the stretch of noise
/// after it, up to the next disturbance or the end of the recording.
struct Event {
    TestKind kind = TestKind::pluck;
    bool kind_known = false;  ///< said by the user, or certain from the signal
    std::size_t quiet_begin = 0, quiet_end = 0;
    std::size_t begin = 0, end = 0;
    std::size_t rest_end = 0;
    double frequency_guess_hz = 0.0;  ///< of the strongest mode; 0 when it does not ring
    double noise_level = 0.0;         ///< rms of the noise as the search saw it, units of the samples
    double start_amplitude = 0.0;     ///< of the decay at `begin`, units of the samples
    bool by_hand = false;             ///< window given with from/to
    /// Of a drop: the stretches of free fall before the decay, the fall itself first. Empty where none was
    /// seen.
    std::vector<SampleRange> flights;
    bool hold_seen = false;  ///< of a drop: the recording goes back before the release
    /// Another mode that rings along from the start, as the search saw it; 0 where it saw none.
    double companion_hz = 0.0, companion_damping_ratio = 0.0;
    std::vector<double> hum_hz;  ///< lines of mains hum that run through the whole recording
    Findings findings;
};

struct EventOptions {
    std::optional<TestKind> kind;
    std::optional<double> from_s, to_s;  ///< a window by hand, on the recording's clock
    std::optional<double> near_hz;       ///< the mode meant
    ReadProgress progress;               ///< called while a long recording is searched
    unsigned threads = 1;                ///< the answer does not depend on it
};

struct EventSearch {
    std::vector<Event> events;
    Findings findings;
    std::string reason;  ///< why there is none, in a sentence; empty when there are events
};

/// Finds the free decays of a recording (up to hundreds). Never throws for what is in the samples: a
/// recording with no usable event gives an empty list with the reason. Throws UsageError when from/to lie
/// outside the recording.
[[nodiscard]] EventSearch find_events(const Recording& recording, const EventOptions& options = {});
/// The same for a recording that is read a stretch at a time; stretches overlap, and what a stretch's end
/// cuts is looked at again in one that begins before it. Where a decay alone is longer than a stretch, its
/// first part stands for it, which is a finding. A window by hand may be as long as a stretch.
[[nodiscard]] EventSearch find_events(const LongRecording& recording, const EventOptions& options = {});

}  // namespace ringwright
