#pragma once
// A recording that is too long to be held in memory, read a stretch at a time.

#include <cstddef>
#include <memory>
#include <string>
#include <vector>

#include "ringwright/recording.hpp"

namespace ringwright {

/// A recording of more samples than this is read in stretches: held whole and searched it takes about 30
/// bytes a sample, so that this is some 350 MB.
inline constexpr std::size_t longest_held_whole = 12'000'000;
/// Samples of one stretch, about 120 MB while it is searched.
inline constexpr std::size_t longest_stretch = 4'000'000;

struct LongLimits {
    std::size_t held_whole = longest_held_whole;
    std::size_t stretch = longest_stretch;
};

/// One channel of a file that stays on its drive. Samples are counted as in the Recording that
/// `read_recording` would give: rows without a value are left out.
class LongRecording {
  public:
    LongRecording() = default;
    virtual ~LongRecording() = default;
    LongRecording(const LongRecording&) = delete;
    LongRecording& operator=(const LongRecording&) = delete;

    /// All that is known of the recording but its samples: quantity, unit, origin, health, findings. Its
    /// clock has the rate and the start; it counts as uniform whether or not all steps are equal.
    [[nodiscard]] const Recording& facts() const { return facts_; }
    [[nodiscard]] std::size_t size() const { return size_; }
    [[nodiscard]] double duration_s() const { return last_s_ - facts_.clock.start_s; }
    /// Whether sample i was taken at start + i/rate throughout.
    [[nodiscard]] bool equal_steps() const { return equal_steps_; }
    /// The lowest and the highest sample of each of some thousand blocks, in the order in which they came, on
    /// the recording's clock: what a drawing of the whole needs.
    [[nodiscard]] const Recording& overview() const { return overview_; }
    /// Says in the facts how the user named the file, and its hash.
    void name(const std::string& file, const std::string& sha256);
    [[nodiscard]] const LongLimits& limits() const { return limits_; }

    /// The samples [begin, end) as a recording of their own on the recording's clock, with what of `facts`
    /// belongs to them. Precondition: begin < end ≤ size(). Throws InputError when the file has
    /// become shorter. From any thread.
    [[nodiscard]] virtual Recording stretch(SampleRange range) const = 0;
    /// When sample i < size() was taken.
    [[nodiscard]] double time_of(std::size_t sample) const;
    /// First sample that was not taken before this time; size() when there is none.
    [[nodiscard]] virtual std::size_t sample_at(double time_s) const;

  protected:
    /// A recording without samples, with what of `facts` belongs to the range.
    [[nodiscard]] Recording like_facts(SampleRange range) const;

    Recording facts_, overview_;
    std::size_t size_ = 0;
    double last_s_ = 0.0;
    bool equal_steps_ = true;
    LongLimits limits_;
};

/// Goes once through a file for all but its samples. Nothing where the recording is not longer than
/// `limits.held_whole`, or is of a kind that has to be read whole: text in UTF-16, and tables whose times do
/// not go forward from row to row. Throws as `read_recording` does.
[[nodiscard]] std::unique_ptr<LongRecording> open_long_recording(const std::string& path,
                                                                 const ReadOptions& options = {},
                                                                 const LongLimits& limits = {});

/// A recording, whole or as one that is read a stretch at a time.
struct OpenedRecording {
    Recording recording;  ///< where `stretches` is there, its facts
    std::shared_ptr<const LongRecording> stretches;
};
/// Reads a recording as `read_recording` does, or opens it where `open_long_recording` would; goes once
/// through standard input or a pipe.
[[nodiscard]] OpenedRecording open_recording(const std::string& path, const ReadOptions& options = {},
                                             const LongLimits& limits = {});

}  // namespace ringwright
