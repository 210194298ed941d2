#pragma once
// Text files in UTF-8, UTF-16 or Latin-1, as UTF-8.

#include <string>
#include <string_view>

namespace ringwright {

/// Text in UTF-8, or in Latin-1 where `latin1` (the digits and separators are the same bytes in both, so that
/// nothing has to be copied; labels go through `label_text`). `text` points into the bytes given, or into
/// `owned`.
struct DecodedText {
    std::string encoding;  ///< "UTF-8", "UTF-8 with byte order mark", "UTF-16LE", "UTF-16BE", "Latin-1"
    std::string_view text;
    std::string owned;
    bool latin1 = false;
    bool binary = false;            ///< holds many control bytes or runs of NULs: no text at all
    std::size_t trailing_nuls = 0;  ///< dropped at the end: a logger that lost power
};

/// Tells the encoding from the byte order mark, else from the bytes themselves.
[[nodiscard]] DecodedText decode_text(std::string_view bytes);

/// A piece of the text as UTF-8; ill-formed bytes are read as Latin-1.
[[nodiscard]] std::string label_text(std::string_view piece, bool latin1);

[[nodiscard]] bool is_utf8(std::string_view bytes);

}  // namespace ringwright
