#pragma once
// What poppler-utils tell of a PDF.

#include <string>

namespace ringwright::pdf {

/// What the command prints about the PDF ("pdfinfo", "pdffonts", "pdftotext -layout" …).
[[nodiscard]] std::string told_by(const std::string& tool, const std::string& pdf);
[[nodiscard]] std::string text_of(const std::string& pdf);

}  // namespace ringwright::pdf
