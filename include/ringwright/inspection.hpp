#pragma once
// What is in a recording file: channels, clock, health, events, and a drawing for the terminal.

#include <cstddef>
#include <memory>
#include <nlohmann/json_fwd.hpp>
#include <optional>
#include <string>

#include "ringwright/error.hpp"
#include "ringwright/event.hpp"
#include "ringwright/recording.hpp"

namespace ringwright {

/// One file as `inspect` sees it. A file whose channels are seen, but none of which can be read as a
/// recording without being told more, has the problem in place of the recording.
struct Inspection {
    FileSummary file;
    std::optional<Recording> recording;
    /// Of a recording that is read a stretch at a time: `recording` is then its facts.
    std::shared_ptr<const LongRecording> stretches = nullptr;
    std::optional<Problem> problem;
    EventSearch events = {};
};

/// For people, lines of `width` columns (40 … 400) where they can be cut.
[[nodiscard]] std::string to_text(const Inspection& inspection, std::size_t width = 100);
/// Schema `ringwright.inspection.v1`.
[[nodiscard]] nlohmann::ordered_json to_json(const Inspection& inspection);
/// One row for each channel, with a header row (RFC 4180): file, channel, name, unit, role, values, missing,
/// minimum, maximum, mean.
[[nodiscard]] std::string to_csv(const Inspection& inspection);

/// The samples in dots of 2 × 4 to a character (Unicode braille): each column of dots spans from the least to
/// the greatest of all samples in it and the line to its neighbours, so that no spike is skipped however long
/// the recording. Extremes at the left, times below, one bar for each event under the curve. `width` and
/// `height` in characters.
[[nodiscard]] std::string draw(const Recording& recording, const std::vector<Event>& events,
                               std::size_t width, std::size_t height);

}  // namespace ringwright
