#include "app/recording_options.hpp"

#include <fmt/format.h>
#include <unistd.h>

#include <CLI/App.hpp>
#include <CLI/Config.hpp>
#include <CLI/Formatter.hpp>
#include <chrono>
#include <cmath>
#include <cstdio>
#include <memory>

#include "ringwright/error.hpp"
#include "ringwright/measured_value.hpp"

namespace ringwright::app {
namespace {

constexpr const char* group = "About the recording";

std::optional<std::string> if_given(const std::string& text) {
    return text.empty() ? std::nullopt : std::optional(text);
}

std::optional<double> number_if_given(const std::string& text, const char* option) {
    return text.empty() ? std::nullopt : std::optional(parse_number(text, option));
}

std::optional<double> positive_if_given(const std::string& text, const char* option, const char* example) {
    const auto number = number_if_given(text, option);
    if (number && !(*number > 0.0))
        throw UsageError(
            {option, "", fmt::format("{} is not above zero", text), fmt::format("Example: {}", example)});
    return number;
}

/// Text on standard error that is wiped when the work is done.
class ProgressLine {
  public:
    explicit ProgressLine(std::string what) : what_(std::move(what)), started_(Clock::now()) {}
    ProgressLine(const ProgressLine&) = delete;
    ProgressLine& operator=(const ProgressLine&) = delete;
    ~ProgressLine() { wipe(); }
    void wipe() {
        if (shown_) std::fputs("\r\033[K", stderr);
        shown_ = false;
    }
    void show(double share) {
        if (Clock::now() - started_ < std::chrono::milliseconds(500)) return;
        const int percent = static_cast<int>(100.0 * share);
        if (percent == percent_) return;
        percent_ = percent;
        shown_ = true;
        fmt::print(stderr, "\r{} {:3d} %\033[K", what_, percent);
        std::fflush(stderr);
    }

  private:
    using Clock = std::chrono::steady_clock;
    std::string what_;
    Clock::time_point started_;
    int percent_ = -1;
    bool shown_ = false;
};

}  // namespace

void add_recording_options(CLI::App& command, RecordingArguments& arguments) {
    const auto add = [&](const char* name, std::string& text, const char* value, const char* help) {
        command.add_option(name, text, help)->type_name(value)->group(group);
    };
    add("--channel", arguments.channel, "NAME|N", "Column or track to analyse, by name or number from 1");
    add("--time-column", arguments.time_column, "NAME|N|none", "Column that holds the time");
    add("--rate", arguments.rate, "HZ", "Sampling rate, where the file does not say it");
    add("--quantity", arguments.quantity, "QUANTITY",
        "displacement, velocity, acceleration, angle, angular-velocity or angular-acceleration");
    add("--unit", arguments.unit, "UNIT", "Unit of the samples, e.g. mm, g, m/s2");
    add("--sensitivity", arguments.sensitivity, "VALUE", "Of the sensor, e.g. \"100 mV/g\"");
    add("--full-scale", arguments.full_scale, "VALUE",
        "Sound files: voltage at digital full scale, e.g. \"5 V\"");
    add("--test", arguments.test, "pluck|tap|drop", "How the article was set moving");
    add("--from", arguments.from, "S", "Begin of the window by hand, in seconds on the recording's clock");
    add("--to", arguments.to, "S", "End of the window by hand");
    add("--near", arguments.near, "HZ", "The mode meant, where there are several");
    add("--modes", arguments.modes, "N", "Number of modes to fit");
}

ReadOptions read_options(const RecordingArguments& arguments) {
    ReadOptions options;
    options.channel = if_given(arguments.channel);
    options.time_column = if_given(arguments.time_column);
    options.rate_hz = positive_if_given(arguments.rate, "--rate", "--rate 2000");
    options.unit = if_given(arguments.unit);
    options.sensitivity = if_given(arguments.sensitivity);
    options.full_scale = if_given(arguments.full_scale);
    if (arguments.quantity.empty()) return options;
    options.quantity = measured_quantity_from_text(arguments.quantity);
    if (!options.quantity)
        throw UsageError({"--quantity", "",
                          fmt::format("\"{}\" is no quantity that is known", arguments.quantity),
                          "Give displacement, velocity, acceleration, angle, angular-velocity or "
                          "angular-acceleration"});
    return options;
}

EventOptions event_options(const RecordingArguments& arguments) {
    EventOptions options;
    options.from_s = number_if_given(arguments.from, "--from");
    options.to_s = number_if_given(arguments.to, "--to");
    options.near_hz = near_hz(arguments);
    if (options.from_s && options.to_s && !(*options.from_s < *options.to_s))
        throw UsageError({"--to", "", fmt::format("{} is not after --from {}", arguments.to, arguments.from),
                          "Give the window as --from 1.2 --to 3.4"});
    if (arguments.test.empty()) return options;
    options.kind = test_kind_from_text(arguments.test);
    if (!options.kind)
        throw UsageError({"--test", "",
                          fmt::format("\"{}\" is no kind of test that is known", arguments.test),
                          "Give pluck, tap or drop"});
    return options;
}

std::optional<double> near_hz(const RecordingArguments& arguments) {
    return positive_if_given(arguments.near, "--near", "--near 12.5");
}

std::optional<int> mode_count(const RecordingArguments& arguments) {
    const auto number = positive_if_given(arguments.modes, "--modes", "--modes 2");
    if (!number) return std::nullopt;
    if (*number != std::floor(*number) || *number > 100.0)
        throw UsageError({"--modes", "", fmt::format("{} is no whole number from 1 to 100", arguments.modes),
                          "Example: --modes 2"});
    return static_cast<int>(*number);
}

OpenedRecording open_with_progress(const std::string& path, ReadOptions options) {
    ProgressLine line("reading " + (path == "-" ? "standard input" : path));
    if (::isatty(STDERR_FILENO) != 0) options.progress = [&line](double share) { line.show(share); };
    return open_recording(path, options);
}

ReadProgress search_progress() {
    if (::isatty(STDERR_FILENO) == 0) return {};
    return [line = std::make_shared<ProgressLine>("searching")](double share) {
        if (share < 1.0)
            line->show(share);
        else
            line->wipe();
    };
}

}  // namespace ringwright::app
