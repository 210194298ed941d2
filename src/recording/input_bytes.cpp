#include "recording/input_bytes.hpp"

#include <fcntl.h>
#include <openssl/evp.h>
#include <sys/mman.h>
#include <sys/stat.h>
#include <unistd.h>

#include <algorithm>
#include <array>
#include <cerrno>
#include <cstdint>
#include <cstring>
#include <memory>
#include <mutex>
#include <vector>

#include "ringwright/error.hpp"

namespace ringwright {
namespace {

/// Mapped files up to this size stay in memory once they were read: they are read more than once.
constexpr std::size_t largest_kept = std::size_t{1} << 28;
/// Of larger ones, the bytes after which what was read is given back.
constexpr std::size_t read_at_once = std::size_t{1} << 25;

/// The large files that are mapped, so that nothing else is ever given back: of memory that holds no file it
/// would be lost.
class LargeMappings {
  public:
    void add(std::string_view bytes) {
        const std::scoped_lock lock(guard_);
        mappings_.push_back({bytes, 0});
    }
    void remove(std::string_view bytes) {
        const std::scoped_lock lock(guard_);
        std::erase_if(mappings_, [&](const Mapping& m) { return m.bytes.data() == bytes.data(); });
    }
    void was_read(std::string_view bytes) {
        const std::scoped_lock lock(guard_);
        for (Mapping& mapping : mappings_) {
            const auto first = address(mapping.bytes), at = address(bytes);
            if (at < first || at >= first + mapping.bytes.size()) continue;
            mapping.read += bytes.size();
            if (mapping.read < read_at_once) return;
            mapping.read = 0;
            ::madvise(const_cast<char*>(mapping.bytes.data()), mapping.bytes.size(), MADV_DONTNEED);
            return;
        }
    }

  private:
    struct Mapping {
        std::string_view bytes;
        std::size_t read = 0;
    };
    static std::uintptr_t address(std::string_view bytes) {
        return reinterpret_cast<std::uintptr_t>(bytes.data());
    }
    std::mutex guard_;
    std::vector<Mapping> mappings_;
};

LargeMappings& large_mappings() {
    static LargeMappings mappings;
    return mappings;
}

class Descriptor {
  public:
    explicit Descriptor(int number) : number_(number) {}
    ~Descriptor() {
        if (number_ > STDERR_FILENO) ::close(number_);
    }
    Descriptor(const Descriptor&) = delete;
    Descriptor& operator=(const Descriptor&) = delete;
    [[nodiscard]] int number() const { return number_; }

  private:
    int number_;
};

[[noreturn]] void refuse(const std::string& name, const std::string& found, const std::string& remedy) {
    throw InputError(Problem{name == "-" ? "standard input" : name, "", found, remedy});
}

[[noreturn]] void refuse_open(const std::string& path, int error) {
    if (error == ENOENT || error == ENOTDIR)
        refuse(path, "there is no such file", "Check the name and the folder.");
    if (error == EACCES || error == EPERM)
        refuse(path, "the file may not be read",
               "Ask for the right to read it, or copy it to a folder of yours.");
    refuse(path, std::string("the file cannot be opened (") + std::strerror(error) + ")",
           "Check the name and the drive that it is on.");
}

}  // namespace

InputBytes::InputBytes(const std::string& path) {
    const bool standard_input = path == "-";
    if (path.find('\0') != std::string::npos) refuse_open(path, ENOENT);
    const Descriptor file(standard_input ? STDIN_FILENO : ::open(path.c_str(), O_RDONLY | O_CLOEXEC));
    if (file.number() < 0) refuse_open(path, errno);
    struct stat status {};
    if (::fstat(file.number(), &status) != 0) refuse_open(path, errno);
    if (S_ISDIR(status.st_mode))
        refuse(path, "this is a folder, not a recording",
               "Name the files in it, for example with folder/*.csv.");
    const bool mappable = S_ISREG(status.st_mode) && status.st_size > 0 && !standard_input;
    if (mappable) map(file.number(), static_cast<std::size_t>(status.st_size));
    if (mapping_ == nullptr) read_all(file.number(), path);
    if (view_.empty())
        refuse(path, "the file is empty",
               "Export the recording again; the logger may have been stopped too soon.");
}

InputBytes::~InputBytes() {
    if (mapping_ == nullptr) return;
    if (mapping_size_ > largest_kept) large_mappings().remove(view_);
    ::munmap(mapping_, mapping_size_);
}

void InputBytes::map(int descriptor, std::size_t size) {
    void* mapping = ::mmap(nullptr, size, PROT_READ, MAP_PRIVATE, descriptor, 0);
    if (mapping == MAP_FAILED) return;
    mapping_ = mapping;
    mapping_size_ = size;
    ::madvise(mapping, size, MADV_SEQUENTIAL);
    view_ = {static_cast<const char*>(mapping), size};
    if (size > largest_kept) large_mappings().add(view_);
}

void InputBytes::read_all(int descriptor, const std::string& name) {
    constexpr std::size_t block = std::size_t{1} << 18;
    std::unique_ptr<char[]> buffer(new char[block]);
    for (;;) {
        const ssize_t count = ::read(descriptor, buffer.get(), block);
        if (count < 0 && errno == EINTR) continue;
        if (count < 0)
            refuse(name, std::string("reading failed (") + std::strerror(errno) + ")",
                   "Check the drive or the pipe that it comes from.");
        if (count == 0) break;
        owned_.append(buffer.get(), static_cast<std::size_t>(count));
    }
    view_ = owned_;
}

void will_read(std::string_view bytes) {
#ifdef MADV_POPULATE_READ
    static const auto page = static_cast<std::uintptr_t>(::sysconf(_SC_PAGESIZE));
    const std::uintptr_t begin = reinterpret_cast<std::uintptr_t>(bytes.data()) / page * page;
    const std::uintptr_t end = reinterpret_cast<std::uintptr_t>(bytes.data()) + bytes.size();
    if (begin < end) ::madvise(reinterpret_cast<void*>(begin), end - begin, MADV_POPULATE_READ);
#else
    static_cast<void>(bytes);
#endif
}

void was_read(std::string_view bytes) {
    large_mappings().was_read(bytes);
}

std::string sha256_hex(std::string_view bytes) {
    std::array<unsigned char, EVP_MAX_MD_SIZE> digest{};
    unsigned int length = 0;
    const std::unique_ptr<EVP_MD_CTX, decltype(&EVP_MD_CTX_free)> context(EVP_MD_CTX_new(), &EVP_MD_CTX_free);
    EVP_DigestInit_ex(context.get(), EVP_sha256(), nullptr);
    constexpr std::size_t block = std::size_t{1} << 20;
    for (std::size_t at = 0; at < bytes.size(); at += block) {
        const std::string_view part = bytes.substr(at, block);
        EVP_DigestUpdate(context.get(), part.data(), part.size());
        was_read(part);
    }
    EVP_DigestFinal_ex(context.get(), digest.data(), &length);
    constexpr std::string_view hex = "0123456789abcdef";
    std::string text;
    for (unsigned int i = 0; i < length; ++i) {
        text += hex[digest[i] >> 4];
        text += hex[digest[i] & 15];
    }
    return text;
}

}  // namespace ringwright
