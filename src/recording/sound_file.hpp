#pragma once
// A sound file opened for decoding.

#include <algorithm>
#include <array>
#include <cstddef>
#include <memory>
#include <string>
#include <string_view>
#include <vector>

#include "recording/sound_library.hpp"

namespace ringwright {

// Four bytes of a header that are read otherwise than they stand there.
struct Patch {
    std::size_t at = 0;
    std::array<char, 4> bytes{};
    bool active = false;
};

// The bytes as libsndfile's virtual file.
struct ByteFile {
    std::string_view bytes;
    sf_count_t at = 0;
    Patch patch;
};

/// A sound file in memory, decoded block by block.
class SoundFile {
  public:
    static constexpr sf_count_t block_frames = 4096;

    /// Throws InputError when it cannot be decoded. The bytes have to live as long.
    SoundFile(std::string_view bytes, const std::string& name);

    [[nodiscard]] const SF_INFO& info() const { return info_; }
    [[nodiscard]] std::size_t channels() const { return static_cast<std::size_t>(info_.channels); }
    [[nodiscard]] std::size_t byte_count() const { return file_.bytes.size(); }

    // Calls `take(block, frames)` with interleaved frames, from the first to the last that can be decoded.
    template <typename Take>
    void for_each_block(Take take) {
        for_each_block_from(0, most_frames(), take);
    }

    // The same from the frame `first` on, no more than `most` of them.
    template <typename Take>
    void for_each_block_from(sf_count_t first, sf_count_t most, Take take) {
        sound_library().seek(handle_.get(), first, SEEK_SET);
        std::vector<double> block(static_cast<std::size_t>(block_frames) * channels());
        for (sf_count_t done = 0; done < most;) {
            const sf_count_t frames = sound_library().readf_double(handle_.get(), block.data(),
                                                                   std::min(block_frames, most - done));
            if (frames <= 0) break;
            take(block, static_cast<std::size_t>(frames));
            done += frames;
        }
    }

    // Samples bounded by the bytes: packed silence must not grow without end.
    [[nodiscard]] sf_count_t most_frames() const {
        return static_cast<sf_count_t>(byte_count()) * 64 + 1'000'000;
    }

    [[nodiscard]] bool is_float() const {
        const int subtype = info_.format & SF_FORMAT_SUBMASK;
        return subtype == SF_FORMAT_FLOAT || subtype == SF_FORMAT_DOUBLE;
    }

    /// Of a format or its part, in words.
    [[nodiscard]] std::string name_of(int format) const;

  private:
    struct Closer {
        void operator()(SNDFILE* handle) const;
    };
    ByteFile file_;
    SF_INFO info_{};
    std::unique_ptr<SNDFILE, Closer> handle_;
};

}  // namespace ringwright
