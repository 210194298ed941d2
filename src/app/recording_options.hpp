#pragma once
// Options about the recording, the same for every command that reads one.

#include <optional>
#include <string>

#include "ringwright/event.hpp"
#include "ringwright/long_recording.hpp"
#include "ringwright/recording.hpp"

namespace CLI {
class App;
}

namespace ringwright::app {

/// As they stand on the command line.
struct RecordingArguments {
    std::string channel, time_column, rate, quantity, unit, sensitivity, full_scale, test, from, to, near,
        modes;
};

void add_recording_options(CLI::App& command, RecordingArguments& arguments);
/// Throw UsageError naming the option whose text has no meaning.
[[nodiscard]] ReadOptions read_options(const RecordingArguments& arguments);
[[nodiscard]] EventOptions event_options(const RecordingArguments& arguments);
[[nodiscard]] std::optional<double> near_hz(const RecordingArguments& arguments);
[[nodiscard]] std::optional<int> mode_count(const RecordingArguments& arguments);

/// open_recording with its progress shown on standard error: only on a terminal, only after half a second.
[[nodiscard]] OpenedRecording open_with_progress(const std::string& path, ReadOptions options);

/// Shows how far the search of a long recording has come, likewise; empty where there is no terminal.
[[nodiscard]] ReadProgress search_progress();

}  // namespace ringwright::app
