#include "app/spooled_input.hpp"

#include <fmt/format.h>
#include <unistd.h>

#include <array>
#include <cerrno>
#include <cstdlib>
#include <cstring>
#include <filesystem>

#include "ringwright/error.hpp"

namespace ringwright::app {
namespace {

[[noreturn]] void fail(const std::string& path) {
    throw OutputError({path, "", fmt::format("standard input cannot be kept: {}", std::strerror(errno)),
                       "Set TMPDIR to a folder with room, or give the recording as a file"});
}

bool copy_chunk(int from, int to) {
    std::array<char, 65536> buffer{};
    const ssize_t count = ::read(from, buffer.data(), buffer.size());
    if (count <= 0) return count < 0 && errno == EINTR;
    for (ssize_t written = 0; written < count;) {
        const ssize_t step = ::write(to, buffer.data() + written, static_cast<std::size_t>(count - written));
        if (step < 0 && errno != EINTR) fail("temporary file");
        if (step > 0) written += step;
    }
    return true;
}

}  // namespace

SpooledInput::SpooledInput(const std::string& path) : path_(path) {
    if (path != "-") return;
    path_ = (std::filesystem::temp_directory_path() / "ringwright-XXXXXX").string();
    const int descriptor = ::mkstemp(path_.data());
    if (descriptor < 0) fail(path_);
    temporary_ = true;
    try {
        while (copy_chunk(STDIN_FILENO, descriptor)) {
        }
    } catch (...) {
        ::close(descriptor);
        ::unlink(path_.c_str());
        throw;
    }
    ::close(descriptor);
}

SpooledInput::~SpooledInput() {
    if (temporary_) ::unlink(path_.c_str());
}

}  // namespace ringwright::app
