#pragma once
// The whole pipeline in memory: recordings in, one identification out.

#include <memory>
#include <optional>
#include <string>
#include <vector>

#include "ringwright/event.hpp"
#include "ringwright/identify.hpp"
#include "ringwright/property.hpp"
#include "ringwright/recording.hpp"

namespace ringwright {

/// One recording to analyse with the mass that was added to the article for it.
struct RecordingInput {
    Recording recording;
    std::optional<MeasuredValue> added_mass;
    /// Of a recording that is read a stretch at a time: `recording` is then its facts.
    std::shared_ptr<const LongRecording> stretches = nullptr;
};

struct AnalysisOptions {
    EventOptions event;
    IdentifyOptions identify;
    Article article;
    std::optional<double> time_base_ppm;         ///< standard uncertainty of the clock, parts per million
    std::optional<double> sensor_gain_relative;  ///< relative standard uncertainty of the sensor's gain
    unsigned jobs =
        0;  ///< threads over events; 0: as many as the machine has. The answer does not depend on it
    /// Keep the samples in the result, of a long recording its overview; off to save memory.
    bool keep_samples = false;
};

struct RecordingIdentification {
    Recording recording;  ///< samples may be released to save memory
    std::optional<MeasuredValue> added_mass;
    std::size_t sample_count = 0;
    double duration_s = 0.0;
    std::vector<EventIdentification> events;
    Findings findings;   ///< of the recording, its events search included
    std::string reason;  ///< why there is no event
};

/// What the releases say together.
struct PooledResult {
    std::string method;  ///< "curve_fit" …; empty when nothing answered
    std::string model;
    std::size_t event_count = 0;
    bool torsional = false;  ///< units of torsion: N·m/rad, N·m·s/rad
    Quantities quantities;
    std::vector<BudgetLine> budget;
    Findings findings;
};

struct Identification {
    double confidence_level = 0.95;
    Article article;  ///< as it was given
    std::vector<RecordingIdentification> recordings;
    PooledResult result;
    /// True when some method answered for some event.
    [[nodiscard]] bool answered() const { return !result.method.empty(); }
};

/// Finds the events of each recording, identifies each, pools them as repeats on one article, derives the
/// properties. The result takes its numbers from the curve fit where that answers at least half of the
/// releases that any method answers, else from the logarithmic decrement, else from the half-power bandwidth.
/// Recordings with different added masses are pooled loading by loading; the frequency and damping stated are
/// then those with the least added, and a finding says so. Never throws for what is in the samples; throws
/// UsageError where from/to lie outside a recording or the article is contradictory (derive_properties), and
/// InputError where a long recording has become shorter. Of a long recording it holds one stretch at a time,
/// and what the fit wants of as many events as there are jobs.
[[nodiscard]] Identification identify(std::vector<RecordingInput> recordings,
                                      const AnalysisOptions& options = {});

}  // namespace ringwright
