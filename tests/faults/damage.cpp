#include "faults/damage.hpp"

#include <fmt/format.h>
#include <sndfile.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <cstring>
#include <functional>
#include <numbers>
#include <span>
#include <string_view>
#include <utility>
#include <vector>

#include "support/draws.hpp"

namespace ringwright::test {
namespace {

std::size_t below(Draws& draws, std::size_t end) {
    return end == 0 ? 0 : static_cast<std::size_t>(draws.bits() % end);
}

template <typename Item, std::size_t Size>
const Item& one_of(Draws& draws, const std::array<Item, Size>& items) {
    return items[below(draws, Size)];
}

/// y at 200 samples a period, quiet for a while, released, decaying.
std::vector<double> decay(Draws& draws, std::size_t count) {
    std::vector<double> samples(count);
    const double zeta = 0.005 + 0.2 * draws.uniform(), period = 20.0 + 100.0 * draws.uniform();
    const double begin = 0.1 * static_cast<double>(count);
    for (std::size_t i = 0; i < count; ++i) {
        const double phase = 2.0 * std::numbers::pi * (static_cast<double>(i) - begin) / period;
        samples[i] = 0.002 * draws.normal() + (phase < 0.0 ? 0.0 : std::exp(-zeta * phase) * std::cos(phase));
    }
    return samples;
}

void put(std::string& bytes, std::uint64_t value, std::size_t size) {
    for (std::size_t i = 0; i < size; ++i) bytes += static_cast<char>((value >> (8 * i)) & 0xFFU);
}

/// Sound files as libsndfile writes them into memory.
struct MemoryFile {
    std::string bytes;
    sf_count_t at = 0;
};

std::string sound_file(Draws& draws) {
    static constexpr std::array<int, 11> formats{
        SF_FORMAT_WAV | SF_FORMAT_PCM_16,   SF_FORMAT_WAV | SF_FORMAT_PCM_U8,
        SF_FORMAT_WAV | SF_FORMAT_PCM_24,   SF_FORMAT_WAV | SF_FORMAT_FLOAT,
        SF_FORMAT_WAVEX | SF_FORMAT_PCM_32, SF_FORMAT_RF64 | SF_FORMAT_PCM_16,
        SF_FORMAT_AIFF | SF_FORMAT_PCM_16,  SF_FORMAT_FLAC | SF_FORMAT_PCM_16,
        SF_FORMAT_W64 | SF_FORMAT_DOUBLE,   SF_FORMAT_CAF | SF_FORMAT_ALAC_16,
        SF_FORMAT_WAV | SF_FORMAT_IMA_ADPCM};
    SF_INFO info{};
    info.format = one_of(draws, formats);
    info.channels = 1 + static_cast<int>(below(draws, 2));
    info.samplerate = one_of(draws, std::array<int, 3>{800, 8000, 48000});
    SF_VIRTUAL_IO io{
        [](void* user) { return static_cast<sf_count_t>(static_cast<MemoryFile*>(user)->bytes.size()); },
        [](sf_count_t offset, int whence, void* user) {
            auto* file = static_cast<MemoryFile*>(user);
            const auto size = static_cast<sf_count_t>(file->bytes.size());
            return file->at = offset + (whence == SEEK_SET ? 0 : whence == SEEK_CUR ? file->at : size);
        },
        [](void* target, sf_count_t count, void* user) {
            auto* file = static_cast<MemoryFile*>(user);
            const sf_count_t there = std::min(count, static_cast<sf_count_t>(file->bytes.size()) - file->at);
            std::memcpy(target, file->bytes.data() + file->at,
                        static_cast<std::size_t>(std::max<sf_count_t>(there, 0)));
            file->at += there;
            return there;
        },
        [](const void* source, sf_count_t count, void* user) {
            auto* file = static_cast<MemoryFile*>(user);
            const auto end = static_cast<std::size_t>(file->at + count);
            if (file->bytes.size() < end) file->bytes.resize(end);
            std::memcpy(file->bytes.data() + file->at, source, static_cast<std::size_t>(count));
            file->at += count;
            return count;
        },
        [](void* user) { return static_cast<MemoryFile*>(user)->at; }};
    MemoryFile file;
    SNDFILE* handle = sf_open_virtual(&io, SFM_RDWR, &info, &file);
    if (handle == nullptr) handle = sf_open_virtual(&io, SFM_WRITE, &info, &file);
    if (handle == nullptr) return wav_bytes({}, 2000);
    const std::size_t frames = 800 + below(draws, 4000);
    const auto samples = decay(draws, frames * static_cast<std::size_t>(info.channels));
    sf_writef_double(handle, samples.data(), static_cast<sf_count_t>(frames));
    sf_close(handle);
    return file.bytes;
}

std::string csv_file(Draws& draws) {
    const char delimiter = one_of(draws, std::array<char, 4>{',', ';', '\t', ' '});
    const bool comma = delimiter == ';', time = below(draws, 5) != 0;
    const std::string_view end = one_of(draws, std::array<std::string_view, 3>{"\n", "\r\n", "\r"});
    std::string text = below(draws, 3) == 0 ? fmt::format("# logger 7{}# started{}", end, end) : "";
    if (below(draws, 4) != 0)
        text += fmt::format("{}weg (mm){}", time ? fmt::format("time (s){}", delimiter) : "", end);
    const auto samples = decay(draws, 300 + below(draws, 1500));
    for (std::size_t i = 0; i < samples.size(); ++i) {
        std::string row = time ? fmt::format("{:.4f}{}", static_cast<double>(i) / 400.0, delimiter) : "";
        row += fmt::format("{:.5f}", samples[i]);
        if (comma) std::ranges::replace(row, '.', ',');
        text += row;
        text += end;
    }
    return text;
}

struct Span {
    std::size_t begin, length;
};

Span some_span(Draws& draws, const std::string& bytes, std::size_t most) {
    const std::size_t begin = below(draws, bytes.size());
    return {begin, std::min(1 + below(draws, most), bytes.size() - begin)};
}

void cut(Draws& draws, std::string& bytes) {
    bytes.resize(below(draws, bytes.size()));
}
void flip_bits(Draws& draws, std::string& bytes) {
    const std::size_t count = std::size_t{1} << below(draws, 9);
    for (std::size_t i = 0; i < count && !bytes.empty(); ++i)
        bytes[below(draws, bytes.size())] ^= static_cast<char>(1U << below(draws, 8));
}
void flip_header_bits(Draws& draws, std::string& bytes) {
    for (std::size_t i = 0; i < 6 && !bytes.empty(); ++i)
        bytes[below(draws, std::min<std::size_t>(bytes.size(), 64))] ^=
            static_cast<char>(1U << below(draws, 8));
}
void swap_chunks(Draws& draws, std::string& bytes) {
    const std::size_t length = 1 + below(draws, 1 + bytes.size() / 4);
    if (bytes.size() < 2 * length) return;
    const std::size_t first = below(draws, bytes.size() - 2 * length + 1);
    std::swap_ranges(bytes.begin() + static_cast<std::ptrdiff_t>(first),
                     bytes.begin() + static_cast<std::ptrdiff_t>(first + length),
                     bytes.begin() + static_cast<std::ptrdiff_t>(first + length));
}
void repeat_chunk(Draws& draws, std::string& bytes) {
    const Span span = some_span(draws, bytes, 4096);
    const std::string chunk = bytes.substr(span.begin, span.length);
    for (std::size_t i = below(draws, 20) + 1; i > 0; --i) bytes.insert(span.begin, chunk);
}
void lose_chunk(Draws& draws, std::string& bytes) {
    const Span span = some_span(draws, bytes, 4096);
    bytes.erase(span.begin, span.length);
}
void zero_bytes(Draws& draws, std::string& bytes) {
    const Span span = some_span(draws, bytes, below(draws, 2) == 0 ? 3 : 4096);
    std::fill_n(bytes.begin() + static_cast<std::ptrdiff_t>(span.begin), span.length, '\0');
}
void random_bytes(Draws& draws, std::string& bytes) {
    const Span span = some_span(draws, bytes, below(draws, 2) == 0 ? 16 : bytes.size());
    for (std::size_t i = 0; i < span.length; ++i) bytes[span.begin + i] = static_cast<char>(draws.bits());
}
void byte_order_mark(Draws& draws, std::string& bytes) {
    bytes.insert(
        0, one_of(draws, std::array<std::string_view, 4>{"\xEF\xBB\xBF", "\xFF\xFE", "\xFE\xFF", "RIFF"}));
}

// ── text alone

constexpr std::array<std::string_view, 22> odd_cells{"nan",
                                                     "NaN",
                                                     "inf",
                                                     "-inf",
                                                     "1e308",
                                                     "-1e308",
                                                     "1.7976931348623157e308",
                                                     "1e309",
                                                     "1e-320",
                                                     "-0",
                                                     "",
                                                     "\"",
                                                     "abc",
                                                     "#DIV/0!",
                                                     "0x1F",
                                                     "1,000,000.5",
                                                     "999999999999999999999999",
                                                     "1e999999999999",
                                                     "\"1.5",
                                                     "--3",
                                                     "1e308e308",
                                                     "٣"};

/// Replaces cells at random; `share` of all rows.
void odd_values(Draws& draws, std::string& text, std::size_t one_in) {
    const std::string_view value = one_of(draws, odd_cells);
    const bool always_same = below(draws, 2) == 0, at_end = below(draws, 2) == 0;
    std::string changed;
    for (std::size_t at = 0; at < text.size();) {
        std::size_t end = text.find_first_of("\r\n", at);
        if (end == std::string::npos) end = text.size();
        std::string line = text.substr(at, end - at);
        if (below(draws, one_in) == 0) {
            const std::size_t split = line.find_first_of(",;\t ");
            const std::string_view cell = always_same ? value : one_of(draws, odd_cells);
            if (split == std::string::npos)
                line = cell;
            else if (at_end)
                line = line.substr(0, split + 1).append(cell);
            else
                line = std::string(cell).append(line.substr(split));
        }
        changed += line;
        if (end < text.size()) changed += text[end];
        at = end + 1;
    }
    text = changed;
}
void few_odd_values(Draws& draws, std::string& text) {
    odd_values(draws, text, 50);
}
void many_odd_values(Draws& draws, std::string& text) {
    odd_values(draws, text, 1 + below(draws, 3));
}
void giant_line(Draws& draws, std::string& text) {
    static constexpr std::array<std::string_view, 6> pieces{"7", ",", "1.5,", "\"", "a", "1.5;"};
    std::string giant;
    const std::string_view piece = one_of(draws, pieces);
    for (std::size_t i = 0; i < 200'000; ++i) giant += piece;
    text.insert(below(draws, text.size() + 1), giant);
}
void no_line_ends(Draws&, std::string& text) {
    std::erase(text, '\n');
    std::erase(text, '\r');
}
void quotes(Draws& draws, std::string& text) {
    for (std::size_t i = below(draws, 30) + 1; i > 0; --i)
        text.insert(below(draws, text.size() + 1),
                    one_of(draws, std::array<std::string_view, 4>{"\"", "\"\"", "'", "\\\""}));
}
void scaled(Draws& draws, std::string& text) {
    const std::string_view power = one_of(
        draws,
        std::array<std::string_view, 8>{"e300", "e-300", "e305", "e-310", "e150", "e-150", "e20", "e-20"});
    std::string changed;
    for (std::size_t i = 0; i < text.size(); ++i) {
        const bool ends =
            i > 0 && text[i - 1] >= '0' && text[i - 1] <= '9' && (text[i] == '\n' || text[i] == '\r');
        if (ends) changed += power;
        changed += text[i];
    }
    text = changed;
}
void huge_time(Draws& draws, std::string& text) {
    // A digit before each row's first cell: the time runs at random, or very far.
    const std::string_view digits = one_of(draws, std::array<std::string_view, 3>{"9", "1e300", "-"});
    const std::size_t one_in = 1 + below(draws, 40);
    std::string changed;
    for (const char c : text) {
        changed += c;
        if (c == '\n' && below(draws, one_in) == 0) changed += digits;
    }
    text = changed;
}

// ── sound alone

void claim(Draws& draws, std::string& bytes) {
    // Any field of the first bytes, with the values that arithmetic likes least.
    static constexpr std::array<std::uint64_t, 9> claims{0,
                                                         1,
                                                         0x7FFFFFFF,
                                                         0x80000000,
                                                         0xFFFFFFFF,
                                                         0xFFFFFFFE,
                                                         1'000'000'000'000,
                                                         0x7FFFFFFFFFFFFFFF,
                                                         0xFFFFFFFFFFFFFFFF};
    std::string field;
    put(field, one_of(draws, claims), one_of(draws, std::array<std::size_t, 3>{2, 4, 8}));
    if (below(draws, 2) == 0) std::ranges::reverse(field);
    const std::size_t at = 4 + 2 * below(draws, 40);
    if (at + field.size() <= bytes.size()) bytes.replace(at, field.size(), field);
}
void odd_floats(Draws& draws, std::string& bytes) {
    static constexpr std::array<std::uint64_t, 5> patterns{0x7FC00000, 0x7F800000, 0xFF800000, 0x7F7FFFFF,
                                                           0x00000001};
    for (std::size_t i = below(draws, 20) + 1; i > 0; --i) {
        const std::size_t at = 44 + 4 * below(draws, 800);
        std::string field;
        put(field, one_of(draws, patterns), 4);
        if (at + 4 <= bytes.size()) bytes.replace(at, 4, field);
    }
}

struct Damage {
    const char* name;
    void (*apply)(Draws&, std::string&);
};
constexpr std::array<Damage, 9> of_any{{{"cut", cut},
                                        {"bits flipped", flip_bits},
                                        {"bits of the header flipped", flip_header_bits},
                                        {"chunks swapped", swap_chunks},
                                        {"chunk repeated", repeat_chunk},
                                        {"chunk lost", lose_chunk},
                                        {"zero bytes", zero_bytes},
                                        {"random bytes", random_bytes},
                                        {"byte order mark", byte_order_mark}}};
constexpr std::array<Damage, 7> of_text{{{"few odd values", few_odd_values},
                                         {"many odd values", many_odd_values},
                                         {"giant line", giant_line},
                                         {"no line ends", no_line_ends},
                                         {"quotes", quotes},
                                         {"scaled", scaled},
                                         {"huge time", huge_time}}};
constexpr std::array<Damage, 2> of_sound{{{"claim", claim}, {"odd floats", odd_floats}}};

const Damage& some_damage(Draws& draws, bool text) {
    if (below(draws, 2) == 0) return one_of(draws, of_any);
    return text ? one_of(draws, of_text) : one_of(draws, of_sound);
}

}  // namespace

DamagedFile damaged_file(std::uint64_t seed) {
    Draws draws(seed);
    const bool text = below(draws, 2) == 0;
    DamagedFile file{text ? csv_file(draws) : sound_file(draws), {}, text ? ".csv" : ".wav"};
    for (std::size_t i = below(draws, 3) == 0 ? 2 : 1; i > 0; --i) {
        const Damage& damage = some_damage(draws, text);
        damage.apply(draws, file.bytes);
        file.kind += (file.kind.empty() ? "" : ", ") + std::string(damage.name);
    }
    return file;
}

std::string wav_bytes(const WavClaims& claims, std::size_t frames) {
    std::string bytes = "RIFF";
    const std::size_t data = 2 * frames;
    put(bytes, claims.data_bytes == 0 ? 36 + data : claims.data_bytes, 4);
    bytes += "WAVEfmt ";
    put(bytes, 16, 4);
    put(bytes, claims.format, 2);
    put(bytes, claims.channels, 2);
    put(bytes, claims.rate, 4);
    put(bytes, std::uint64_t{claims.rate} * claims.block_align, 4);
    put(bytes, claims.block_align, 2);
    put(bytes, claims.bits, 2);
    bytes += "data";
    put(bytes, claims.data_bytes == 0 ? data : claims.data_bytes, 4);
    Draws draws(frames);
    for (const double sample : decay(draws, frames))
        put(bytes,
            static_cast<std::uint16_t>(static_cast<std::int16_t>(20000.0 * std::clamp(sample, -1.5, 1.5))),
            2);
    return bytes;
}

std::string rf64_bytes(std::uint64_t claimed_frames, std::size_t frames) {
    std::string bytes = "RF64";
    put(bytes, 0xFFFFFFFF, 4);
    bytes += "WAVEds64";
    put(bytes, 28, 4);
    put(bytes, 2 * claimed_frames + 72, 8);
    put(bytes, 2 * claimed_frames, 8);
    put(bytes, claimed_frames, 8);
    put(bytes, 0, 4);
    const std::string wav = wav_bytes({1, 1, 2, 16, 8000, 0xFFFFFFFF}, frames);
    return bytes + wav.substr(12);
}

}  // namespace ringwright::test
