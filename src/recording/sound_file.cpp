#include "recording/sound_file.hpp"

#include <cstdint>
#include <cstdio>
#include <cstring>

#include "recording/input_bytes.hpp"
#include "ringwright/error.hpp"

namespace ringwright {
namespace {

std::uint32_t little_endian(std::string_view bytes, std::size_t at) {
    std::uint32_t value = 0;
    for (std::size_t i = 4; i-- > 0;) value = (value << 8) | static_cast<unsigned char>(bytes[at + i]);
    return value;
}

// A recorder that lost power leaves a data chunk of length 0: it is read to the end of the file.
Patch data_length_patch(std::string_view bytes) {
    Patch patch;
    if (!bytes.starts_with("RIFF")) return patch;
    for (std::size_t at = 12; at + 8 <= bytes.size();) {
        const std::uint32_t size = little_endian(bytes, at + 4);
        if (bytes.substr(at, 4) == "data") {
            const std::size_t there = std::min<std::size_t>(bytes.size() - at - 8, 0x7FFFFFF0);
            patch.active = size == 0 && there > 64;
            patch.at = at + 4;
            for (std::size_t i = 0; i < 4; ++i) patch.bytes[i] = static_cast<char>((there >> (8 * i)) & 0xFF);
            return patch;
        }
        at += std::size_t{8} + size + (size & 1U);
    }
    return patch;
}

sf_count_t file_length(void* user) {
    return static_cast<sf_count_t>(static_cast<ByteFile*>(user)->bytes.size());
}

sf_count_t seek_to(sf_count_t offset, int whence, void* user) {
    auto* file = static_cast<ByteFile*>(user);
    const sf_count_t base = whence == SEEK_SET ? 0 : whence == SEEK_CUR ? file->at : file_length(user);
    file->at = std::clamp<sf_count_t>(base + offset, 0, file_length(user));
    return file->at;
}

sf_count_t read_bytes(void* target, sf_count_t count, void* user) {
    auto* file = static_cast<ByteFile*>(user);
    const sf_count_t available = std::clamp<sf_count_t>(count, 0, file_length(user) - file->at);
    const auto begin = static_cast<std::size_t>(file->at), size = static_cast<std::size_t>(available);
    std::memcpy(target, file->bytes.data() + begin, size);
    for (std::size_t i = 0; file->patch.active && i < 4; ++i)
        if (const std::size_t place = file->patch.at + i; place >= begin && place < begin + size)
            static_cast<char*>(target)[place - begin] = file->patch.bytes[i];
    was_read(file->bytes.substr(begin, size));
    file->at += available;
    return available;
}

sf_count_t write_nothing(const void*, sf_count_t, void*) {
    return 0;
}
sf_count_t position(void* user) {
    return static_cast<ByteFile*>(user)->at;
}

}  // namespace

SoundFile::SoundFile(std::string_view bytes, const std::string& name)
    : file_{bytes, 0, data_length_patch(bytes)} {
    SF_VIRTUAL_IO io{file_length, seek_to, read_bytes, write_nothing, position};
    handle_.reset(sound_library().open_virtual(&io, SFM_READ, &info_, &file_));
    const bool usable = handle_ && info_.channels > 0 && info_.samplerate > 0 && info_.channels <= 4096;
    if (usable) return;
    std::string reason =
        handle_ ? "it names no tracks or no sampling rate" : sound_library().strerror(nullptr);
    while (!reason.empty() && (reason.back() == '.' || reason.back() == '\n')) reason.pop_back();
    throw InputError(Problem{name, "", "the sound file cannot be decoded (" + reason + ")",
                             "The file may be cut or damaged; export it again as WAV."});
}

std::string SoundFile::name_of(int format) const {
    SF_FORMAT_INFO names{};
    names.format = format;
    if (sound_library().command(handle_.get(), SFC_GET_FORMAT_INFO, &names, sizeof names) != 0 ||
        names.name == nullptr)
        return "";
    return names.name;
}

void SoundFile::Closer::operator()(SNDFILE* handle) const {
    sound_library().close(handle);
}

}  // namespace ringwright
