#pragma once
// A recording: the samples of one channel in SI units, its clock, what was measured, where it came from, its
// health.

#include <cstdint>
#include <functional>
#include <optional>
#include <string>
#include <string_view>
#include <vector>

#include "ringwright/finding.hpp"
#include "ringwright/units.hpp"

namespace ringwright {

enum class MeasuredQuantity {
    displacement,
    velocity,
    acceleration,
    angle,
    angular_velocity,
    angular_acceleration
};
/// "displacement", "angular-velocity" … as in `--quantity`.
[[nodiscard]] std::string_view to_text(MeasuredQuantity quantity);
[[nodiscard]] std::optional<MeasuredQuantity> measured_quantity_from_text(std::string_view text);
[[nodiscard]] Dimension dimension_of(MeasuredQuantity quantity);
/// True for angle and its derivatives.
[[nodiscard]] bool is_torsional(MeasuredQuantity quantity);

/// When the samples were taken. Uniform: `times_s` is empty and sample i was taken at start_s +
/// i/sample_rate_hz. Otherwise `times_s` holds one strictly increasing time a sample and sample_rate_hz is
/// one over their median step.
struct SampleClock {
    double sample_rate_hz = 1.0;
    double start_s = 0.0;
    std::vector<double> times_s;
    [[nodiscard]] bool uniform() const { return times_s.empty(); }
    [[nodiscard]] double time_of(std::size_t sample) const {
        return uniform() ? start_s + static_cast<double>(sample) / sample_rate_hz : times_s[sample];
    }
};

/// Samples [begin, end).
struct SampleRange {
    std::size_t begin = 0;
    std::size_t end = 0;
};

struct Origin {
    std::string file;    ///< as the user named it; "-" for standard input
    std::string sha256;  ///< of the bytes of the file, lower-case hex
    std::uint64_t bytes = 0;
    std::string channel;  ///< name of the channel, or its 1-based number
};

struct Recording {
    std::vector<double> samples;  ///< in SI units where `scaled`, else in `unit` as recorded
    SampleClock clock;
    MeasuredQuantity quantity = MeasuredQuantity::displacement;
    Unit unit;  ///< the unit it came in; symbol "full scale" for an uncalibrated sound file, "" when not
                ///< stated
    bool scaled = true;  ///< false: the samples are not in SI units, so amplitudes in metres cannot be told
    bool quantity_known = true;  ///< false: neither header, unit nor option said what was measured
    Origin origin;
    double resolution = 0.0;  ///< smallest step between different values, same unit as samples; 0: not known
    std::vector<SampleRange> clipped;  ///< runs of samples at a rail
    std::vector<SampleRange> gaps;     ///< sample index before and after which time was lost (begin, begin+1)
    Findings findings;

    [[nodiscard]] std::size_t size() const { return samples.size(); }
    [[nodiscard]] double duration_s() const;
};

/// Called now and then with the share done (0 … 1) while a file is read.
using ReadProgress = std::function<void(double)>;

/// What the user said of the recording; whatever is absent is found from the file.
struct ReadOptions {
    std::optional<std::string> channel;      ///< name or 1-based number among all columns or tracks
    std::optional<std::string> time_column;  ///< name, 1-based number or "none"
    std::optional<double> rate_hz;
    std::optional<MeasuredQuantity> quantity;
    std::optional<std::string> unit;
    std::optional<std::string> sensitivity;  ///< e.g. "100 mV/g"
    std::optional<std::string> full_scale;   ///< e.g. "5 V"; volts at digital full scale
    ReadProgress progress;
};

/// Reads one channel of a CSV or sound file; `path` "-" reads standard input. The kind of file is told from
/// its bytes. Throws InputError (file, place, cause, remedy) when it cannot be read or used, UsageError for
/// an unusable option.
[[nodiscard]] Recording read_recording(const std::string& path, const ReadOptions& options = {});
/// The same from bytes in memory; `name` stands for the file in messages and in Origin.
[[nodiscard]] Recording read_recording_from_memory(std::string_view bytes, const std::string& name,
                                                   const ReadOptions& options = {});

/// One column or track as `inspect` shows it.
struct ChannelSummary {
    std::string name;
    std::string unit;                                 ///< as written, may be empty
    std::string role;                                 ///< "time", "signal", "text", "empty"
    std::size_t values = 0;                           ///< cells or frames with a finite number
    std::size_t missing = 0;                          ///< empty, NaN, overflow or text
    double minimum = 0.0, maximum = 0.0, mean = 0.0;  ///< as recorded
};

/// What is in a file, all channels.
struct FileSummary {
    std::string file, sha256;
    std::uint64_t bytes = 0;
    std::string format;  ///< "CSV", "WAV" …
    std::string
        dialect;  ///< e.g. "semicolon, decimal comma, UTF-8, 14 preamble lines" or "PCM 24 bit, 2 channels"
    std::vector<ChannelSummary> channels;
    Findings findings;
};
[[nodiscard]] FileSummary summarise_file(const std::string& path, const ReadOptions& options = {});

}  // namespace ringwright
