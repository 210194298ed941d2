#include "app/resume_file.hpp"

#include <fcntl.h>
#include <fmt/format.h>
#include <sys/file.h>
#include <sys/stat.h>
#include <unistd.h>

#include <cerrno>
#include <cstring>
#include <filesystem>

#include "ringwright/error.hpp"

namespace ringwright::app {
namespace {

constexpr auto between_syncs = std::chrono::milliseconds(250);

void sync_folder_of(const std::string& path) {
    const auto folder = std::filesystem::path(path).parent_path();
    const int descriptor = ::open(folder.empty() ? "." : folder.c_str(), O_RDONLY | O_DIRECTORY | O_CLOEXEC);
    if (descriptor < 0) return;
    ::fsync(descriptor);
    ::close(descriptor);
}

}  // namespace

ResumeFile::ResumeFile(const std::string& path) : path_(path) {
    descriptor_ = ::open(path.c_str(), O_RDWR | O_CREAT | O_CLOEXEC, 0666);
    if (descriptor_ < 0) fail(errno);
    try {
        struct stat status {};
        if (::fstat(descriptor_, &status) != 0) fail(errno);
        if (!S_ISREG(status.st_mode))
            throw UsageError({"--resume", "", path + " is no ordinary file",
                              "Name a file that this run can write and read again"});
        if (::flock(descriptor_, LOCK_EX | LOCK_NB) != 0)
            throw OutputError({path, "", "another run is writing to it",
                               "Wait for it to end, or name another file with --resume"});
        file_size_ = static_cast<std::uint64_t>(status.st_size);
        find_lines();
        sync_folder_of(path);
    } catch (...) {
        ::close(descriptor_);
        throw;
    }
}

ResumeFile::~ResumeFile() {
    if (unsynced_) ::fdatasync(descriptor_);
    ::close(descriptor_);
}

void ResumeFile::fail(int cause) const {
    throw OutputError({path_, "", fmt::format("cannot be written: {}", std::strerror(cause)),
                       cause == ENOSPC ? "Make room on the disk and run the same command again; what is "
                                         "finished is kept"
                                       : "Check the folder and its permissions, or name another file"});
}

std::string ResumeFile::bytes(std::uint64_t begin, std::uint64_t end) const {
    std::string text(end - begin, '\0');
    for (std::size_t have = 0; have < text.size();) {
        const ssize_t count =
            ::pread(descriptor_, text.data() + have, text.size() - have, static_cast<off_t>(begin + have));
        if (count < 0 && errno == EINTR) continue;
        if (count <= 0)
            throw InputError({path_, "",
                              count < 0 ? std::strerror(errno) : "became shorter while it was read",
                              "Let no other program write to it while a run uses it"});
        have += static_cast<std::size_t>(count);
    }
    return text;
}

void ResumeFile::find_lines() {
    constexpr std::uint64_t block = std::uint64_t{1} << 22U;
    for (std::uint64_t at = 0; at < file_size_; at += block) {
        const std::string text = bytes(at, std::min(file_size_, at + block));
        for (std::size_t feed = text.find('\n'); feed != std::string::npos; feed = text.find('\n', feed + 1))
            starts_.push_back(at + feed + 1);
    }
}

std::string ResumeFile::line(std::size_t i) const {
    return bytes(starts_[i], starts_[i + 1]);
}

std::string ResumeFile::torn_line() const {
    return bytes(starts_.back(), file_size_);
}

void ResumeFile::cut_from(std::size_t first) {
    starts_.resize(std::min(starts_.size(), first + 1));
    if (::ftruncate(descriptor_, static_cast<off_t>(starts_.back())) != 0) fail(errno);
    file_size_ = starts_.back();
    unsynced_ = true;
    sync();
}

void ResumeFile::append(std::string_view line) {
    const std::uint64_t end = file_size_ + line.size();
    for (std::uint64_t at = file_size_; at < end;) {
        const ssize_t count =
            ::pwrite(descriptor_, line.data() + (at - file_size_), end - at, static_cast<off_t>(at));
        if (count < 0 && errno == EINTR) continue;
        if (count < 0) {
            const int cause = errno;
            // Half a line helps nobody; where even that fails, the next run cuts it.
            if (::ftruncate(descriptor_, static_cast<off_t>(file_size_)) != 0) fail(errno);
            fail(cause);
        }
        at += static_cast<std::uint64_t>(count);
    }
    file_size_ = end;
    starts_.push_back(end);
    unsynced_ = true;
    sync_when_due();
}

void ResumeFile::sync_when_due() {
    if (Clock::now() - synced_at_ >= between_syncs) sync();
}

void ResumeFile::sync() {
    if (!unsynced_) return;
    if (::fdatasync(descriptor_) != 0) fail(errno);
    unsynced_ = false;
    synced_at_ = Clock::now();
}

}  // namespace ringwright::app
