#pragma once
// The bytes of an input: a file mapped into memory, standard input read whole, or bytes that a caller holds.

#include <cstddef>
#include <string>
#include <string_view>

namespace ringwright {

/// Holds the bytes for as long as it lives. A regular file is mapped, never copied; it is opened for reading
/// only.
class InputBytes {
  public:
    /// Throws InputError when `path` is missing, a directory, not readable or empty. "-" is standard input.
    explicit InputBytes(const std::string& path);
    ~InputBytes();
    InputBytes(const InputBytes&) = delete;
    InputBytes& operator=(const InputBytes&) = delete;

    [[nodiscard]] std::string_view view() const { return view_; }

  private:
    void map(int descriptor, std::size_t size);
    void read_all(int descriptor, const std::string& name);

    std::string owned_;
    void* mapping_ = nullptr;
    std::size_t mapping_size_ = 0;
    std::string_view view_;
};

/// Tells the system that these bytes of a file are read now, so that it maps them at once and not page by
/// page. Only a hint.
void will_read(std::string_view bytes);

/// Tells that these bytes were read and are not needed soon. Of a large mapped file the memory is given back
/// now and then, so that no more of it than some ten megabytes is held; the bytes can be read again at any
/// time. Does nothing for other bytes. From any thread.
void was_read(std::string_view bytes);

/// SHA-256 of the bytes as 64 lower-case hexadecimal digits (FIPS 180-4).
[[nodiscard]] std::string sha256_hex(std::string_view bytes);

}  // namespace ringwright
