#pragma once
// One line on a terminal that says how far a batch is.

#include <chrono>
#include <cstddef>
#include <string>

namespace ringwright::app {

/// "412 of 1000 recordings, 3 without an answer, 2 min 10 s left", from the pace of this run. Empty pace
/// (none done yet): without the time.
[[nodiscard]] std::string progress_text(std::size_t done, std::size_t total, std::size_t without_answer,
                                        std::size_t done_before, double elapsed_s);

/// The line on standard error, written over itself; nothing at all where that is no terminal.
class BatchProgress {
  public:
    BatchProgress(std::size_t total, std::size_t done_before);
    BatchProgress(const BatchProgress&) = delete;
    BatchProgress& operator=(const BatchProgress&) = delete;
    ~BatchProgress() { clear(); }
    void count(bool answered);
    /// At most four times a second.
    void show();
    void clear();
    [[nodiscard]] std::size_t done() const { return done_; }

  private:
    using Clock = std::chrono::steady_clock;
    std::size_t total_, done_before_, done_, without_answer_ = 0;
    Clock::time_point started_ = Clock::now(), shown_at_ = started_;
    bool terminal_, visible_ = false;
};

}  // namespace ringwright::app
