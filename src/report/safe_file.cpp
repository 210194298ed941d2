#include "ringwright/safe_file.hpp"

#include <fcntl.h>
#include <fmt/format.h>
#include <sys/stat.h>
#include <unistd.h>

#include <cerrno>
#include <cstdio>
#include <cstdlib>
#include <cstring>
#include <filesystem>

#include "ringwright/error.hpp"

namespace ringwright {
namespace {

[[noreturn]] void fail(const std::string& path, int cause) {
    throw OutputError({path, "", fmt::format("cannot be written: {}", std::strerror(cause)),
                       cause == ENOSPC ? "Make room on the disk or write elsewhere with -o"
                                       : "Check the folder and its permissions, or write elsewhere with -o"});
}

std::string folder_of(const std::string& path) {
    const auto folder = std::filesystem::path(path).parent_path();
    return folder.empty() ? "." : folder.string();
}

/// An open file that is closed, and removed while it is not yet in its place, whatever happens. It has no
/// name until it is whole, where the file system can do that (Linux, O_TMPFILE): then even a writer that is
/// killed leaves nothing behind.
class Draft {
  public:
    explicit Draft(const std::string& target) : target_(target) {
        descriptor_ = ::open(folder_of(target).c_str(), O_TMPFILE | O_WRONLY | O_CLOEXEC, 0600);
        if (descriptor_ >= 0 && ::access("/proc/self/fd", X_OK) == 0) return;
        if (descriptor_ >= 0) ::close(descriptor_);
        name_ = target + ".XXXXXX";
        descriptor_ = ::mkostemp(name_.data(), O_CLOEXEC);
        if (descriptor_ < 0) fail(target_, errno);
    }
    Draft(const Draft&) = delete;
    Draft& operator=(const Draft&) = delete;
    ~Draft() {
        if (descriptor_ >= 0) ::close(descriptor_);
        if (!placed_ && !name_.empty()) ::unlink(name_.c_str());
    }
    [[nodiscard]] int descriptor() const { return descriptor_; }

    void place() {
        if (::fsync(descriptor_) != 0) fail(target_, errno);
        if (name_.empty()) give_name();
        const int closed = ::close(descriptor_);
        descriptor_ = -1;
        if (closed != 0) fail(target_, errno);
        if (::rename(name_.c_str(), target_.c_str()) != 0) fail(target_, errno);
        placed_ = true;
    }

  private:
    /// A link cannot replace a file, a rename can: so first a name that nobody has.
    void give_name() {
        const std::string here = fmt::format("/proc/self/fd/{}", descriptor_);
        for (int i = 0; i < 1000; ++i) {
            const std::string name = fmt::format("{}.{}-{}", target_, ::getpid(), i);
            if (::linkat(AT_FDCWD, here.c_str(), AT_FDCWD, name.c_str(), AT_SYMLINK_FOLLOW) == 0) {
                name_ = name;
                return;
            }
            if (errno != EEXIST) break;
        }
        fail(target_, errno);
    }

    std::string target_, name_;
    int descriptor_ = -1;
    bool placed_ = false;
};

void write_all(int descriptor, std::string_view bytes, const std::string& path) {
    while (!bytes.empty()) {
        const ssize_t written = ::write(descriptor, bytes.data(), bytes.size());
        if (written < 0 && errno == EINTR) continue;
        if (written < 0) fail(path, errno);
        bytes.remove_prefix(static_cast<std::size_t>(written));
    }
}

void set_permissions(int descriptor, const std::string& path) {
    struct stat old {};
    if (::stat(path.c_str(), &old) == 0) {
        ::fchmod(descriptor, old.st_mode & 07777U);
        return;
    }
    const mode_t mask = ::umask(0);
    ::umask(mask);
    ::fchmod(descriptor, 0666U & ~mask);
}

using PieceWriter = std::function<void(const PieceTaker&)>;

void write_directly(const std::string& path, const PieceWriter& write) {
    const int descriptor = ::open(path.c_str(), O_WRONLY | O_CLOEXEC);
    if (descriptor < 0) fail(path, errno);
    try {
        write([&](std::string_view bytes) { write_all(descriptor, bytes, path); });
    } catch (...) {
        ::close(descriptor);
        throw;
    }
    if (::close(descriptor) != 0) fail(path, errno);
}

void sync_folder_of(const std::string& path) {
    const int descriptor = ::open(folder_of(path).c_str(), O_RDONLY | O_DIRECTORY | O_CLOEXEC);
    if (descriptor < 0) return;  // The file itself is safe; not every file system lets a folder be synced.
    ::fsync(descriptor);
    ::close(descriptor);
}

/// The file behind a symbolic link, so that the link stays a link.
std::string behind_links(const std::string& path) {
    std::error_code error;
    if (!std::filesystem::is_symlink(path, error)) return path;
    const auto target = std::filesystem::weakly_canonical(path, error);
    return error ? path : target.string();
}

}  // namespace

void write_file_safely(const std::string& path, std::string_view bytes) {
    write_pieces_safely(path, [&](const PieceTaker& take) { take(bytes); });
}

void write_pieces_safely(const std::string& path, const PieceWriter& write) {
    struct stat existing {};
    if (::stat(path.c_str(), &existing) == 0) {
        if (S_ISDIR(existing.st_mode)) fail(path, EISDIR);
        if (!S_ISREG(existing.st_mode)) return write_directly(path, write);
    }
    const std::string target = behind_links(path);
    Draft draft(target);
    write([&](std::string_view bytes) { write_all(draft.descriptor(), bytes, path); });
    set_permissions(draft.descriptor(), target);
    draft.place();
    sync_folder_of(target);
}

}  // namespace ringwright
