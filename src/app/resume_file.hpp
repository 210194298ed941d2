#pragma once
// The answers of a batch as they are finished, kept so that an interrupted run can be continued.

#include <chrono>
#include <cstddef>
#include <cstdint>
#include <string>
#include <string_view>
#include <utility>
#include <vector>

namespace ringwright::app {

/// One line of JSON for each finished recording, in the order of the batch, from its first recording on:
/// docs/batch.md says what is promised of it. The file is locked while this lives.
class ResumeFile {
  public:
    /// Opens the file, or makes it. Throws OutputError where it cannot be written or where another run has it
    /// open, UsageError where it is no ordinary file.
    explicit ResumeFile(const std::string& path);
    ResumeFile(const ResumeFile&) = delete;
    ResumeFile& operator=(const ResumeFile&) = delete;
    /// What was appended is on the disk. Says nothing where that fails; sync() does.
    ~ResumeFile();

    [[nodiscard]] const std::string& path() const { return path_; }
    /// Whole lines, those that were there and those appended.
    [[nodiscard]] std::size_t size() const { return starts_.size() - 1; }
    /// Line i with its line feed. Throws InputError.
    [[nodiscard]] std::string line(std::size_t i) const;
    /// Bytes behind the last line feed: a line that was being written when its writer was killed.
    [[nodiscard]] std::string torn_line() const;
    /// Cuts the torn line and every line from `first` on. Throws OutputError.
    void cut_from(std::size_t first);

    /// Appends a line (with its line feed) whole or not at all. It outlives the death of this process at
    /// once, and a loss of power within half a second. Throws OutputError.
    void append(std::string_view line);
    /// Everything appended is on the disk. Throws OutputError.
    void sync();
    /// The same where the last time is a quarter of a second ago; to be called now and then.
    void sync_when_due();

  private:
    using Clock = std::chrono::steady_clock;
    [[noreturn]] void fail(int cause) const;
    [[nodiscard]] std::string bytes(std::uint64_t begin, std::uint64_t end) const;
    void find_lines();

    std::string path_;
    int descriptor_ = -1;
    std::uint64_t file_size_ = 0;
    std::vector<std::uint64_t> starts_{0};  ///< of each line, and the end of the last
    bool unsynced_ = false;
    Clock::time_point synced_at_ = Clock::now();
};

}  // namespace ringwright::app
