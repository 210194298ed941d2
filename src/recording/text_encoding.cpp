#include "recording/text_encoding.hpp"

#include <algorithm>
#include <array>
#include <cstdint>

namespace ringwright {
namespace {

using namespace std::string_view_literals;

void append_utf8(std::string& out, std::uint32_t code) {
    const auto put = [&out](std::uint32_t byte) { out += static_cast<char>(byte); };
    if (code < 0x80) {
        put(code);
    } else if (code < 0x800) {
        put(0xC0 | (code >> 6));
        put(0x80 | (code & 0x3F));
    } else if (code < 0x10000) {
        put(0xE0 | (code >> 12));
        put(0x80 | ((code >> 6) & 0x3F));
        put(0x80 | (code & 0x3F));
    } else {
        put(0xF0 | (code >> 18));
        put(0x80 | ((code >> 12) & 0x3F));
        put(0x80 | ((code >> 6) & 0x3F));
        put(0x80 | (code & 0x3F));
    }
}

std::uint32_t unit_at(std::string_view bytes, std::size_t at, bool big_endian) {
    const auto first = static_cast<unsigned char>(bytes[at]);
    const auto second = static_cast<unsigned char>(bytes[at + 1]);
    return big_endian ? (std::uint32_t{first} << 8) | second : (std::uint32_t{second} << 8) | first;
}

// A lone surrogate becomes U+FFFD.
std::string from_utf16(std::string_view bytes, bool big_endian) {
    std::string out;
    out.reserve(bytes.size() / 2 + 16);
    for (std::size_t at = 0; at + 1 < bytes.size(); at += 2) {
        std::uint32_t code = unit_at(bytes, at, big_endian);
        if (code >= 0xD800 && code < 0xDC00 && at + 3 < bytes.size()) {
            const std::uint32_t low = unit_at(bytes, at + 2, big_endian);
            if (low >= 0xDC00 && low < 0xE000) {
                code = 0x10000 + ((code - 0xD800) << 10) + (low - 0xDC00);
                at += 2;
            }
        }
        if (code >= 0xD800 && code < 0xE000) code = 0xFFFD;
        append_utf8(out, code);
    }
    return out;
}

// Without a byte order mark: text of digits in UTF-16 has a zero in nearly every second byte.
int utf16_by_zeros(std::string_view bytes) {
    const std::string_view head = bytes.substr(0, 1024);
    std::array<std::size_t, 2> zeros{};
    for (std::size_t i = 0; i < head.size(); ++i)
        if (head[i] == '\0') ++zeros[i % 2];
    const std::size_t pairs = head.size() / 2;
    if (pairs < 8) return 0;
    if (zeros[1] > pairs * 8 / 10 && zeros[0] < pairs / 10) return 1;
    if (zeros[0] > pairs * 8 / 10 && zeros[1] < pairs / 10) return 2;
    return 0;
}

// A run of zero bytes counts as one control byte: a logger whose card lost a piece of the file leaves one.
bool looks_binary(std::string_view text) {
    const std::string_view head = text.substr(0, 65536);
    std::size_t control = 0, zeros = 0;
    for (std::size_t i = 0; i < head.size(); ++i) {
        const auto byte = static_cast<unsigned char>(head[i]);
        if (byte == 0 && ++zeros > head.size() / 2) return true;
        if (byte == 0 && i > 0 && head[i - 1] == '\0') continue;
        if (byte < 32 && byte != '\n' && byte != '\r' && byte != '\t' && byte != '\f' && byte != 0x1A &&
            byte != 0x1B)
            ++control;
    }
    return control > head.size() / 50;
}

// Length of the well-formed sequence at `at`, 0 when there is none (Unicode 15, table 3-7).
std::size_t utf8_length(std::string_view s, std::size_t at) {
    const auto byte = [&](std::size_t i) {
        return at + i < s.size() ? static_cast<unsigned char>(s[at + i]) : static_cast<unsigned char>(0);
    };
    const auto tail = [&](std::size_t i) { return (byte(i) & 0xC0) == 0x80; };
    const unsigned char lead = byte(0);
    if (lead < 0x80) return 1;
    if (lead >= 0xC2 && lead <= 0xDF) return tail(1) ? 2 : 0;
    if (lead >= 0xE0 && lead <= 0xEF) {
        if ((lead == 0xE0 && byte(1) < 0xA0) || (lead == 0xED && byte(1) > 0x9F)) return 0;
        return tail(1) && tail(2) ? 3 : 0;
    }
    if (lead >= 0xF0 && lead <= 0xF4) {
        if ((lead == 0xF0 && byte(1) < 0x90) || (lead == 0xF4 && byte(1) > 0x8F)) return 0;
        return tail(1) && tail(2) && tail(3) ? 4 : 0;
    }
    return 0;
}

// The first part of the file holds the labels; a sequence cut at its end does not count against it.
bool head_is_utf8(std::string_view text) {
    constexpr std::size_t head = std::size_t{1} << 20;
    if (text.size() <= head) return is_utf8(text);
    std::size_t end = head;
    while (end > head - 4 && (static_cast<unsigned char>(text[end]) & 0xC0) == 0x80) --end;
    return is_utf8(text.substr(0, end));
}

}  // namespace

bool is_utf8(std::string_view bytes) {
    for (std::size_t at = 0; at < bytes.size();) {
        const std::size_t length = utf8_length(bytes, at);
        if (length == 0) return false;
        at += length;
    }
    return true;
}

DecodedText decode_text(std::string_view bytes) {
    DecodedText decoded;
    const int zeros = utf16_by_zeros(bytes);
    if (bytes.starts_with("\xFF\xFE"sv) || zeros == 1) {
        decoded.owned = from_utf16(bytes.starts_with("\xFF\xFE"sv) ? bytes.substr(2) : bytes, false);
        decoded.encoding = "UTF-16LE";
    } else if (bytes.starts_with("\xFE\xFF"sv) || zeros == 2) {
        decoded.owned = from_utf16(bytes.starts_with("\xFE\xFF"sv) ? bytes.substr(2) : bytes, true);
        decoded.encoding = "UTF-16BE";
    } else if (bytes.starts_with("\xEF\xBB\xBF"sv)) {
        decoded.text = bytes.substr(3);
        decoded.encoding = "UTF-8 with byte order mark";
    } else {
        decoded.text = bytes;
        decoded.latin1 = !head_is_utf8(bytes);
        decoded.encoding = decoded.latin1 ? "Latin-1" : "UTF-8";
    }
    const bool owns = decoded.encoding.starts_with("UTF-16");
    std::string_view text = owns ? std::string_view(decoded.owned) : decoded.text;
    while (!text.empty() && text.back() == '\0') text.remove_suffix(1), ++decoded.trailing_nuls;
    decoded.binary = looks_binary(text);
    if (owns)
        decoded.owned.resize(text.size());
    else
        decoded.text = text;
    return decoded;
}

std::string label_text(std::string_view piece, bool latin1) {
    if (!latin1 && is_utf8(piece)) return std::string(piece);
    std::string out;
    for (const char c : piece) append_utf8(out, static_cast<unsigned char>(c));
    return out;
}

}  // namespace ringwright
