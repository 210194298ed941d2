#include "drawing/pdf_tools.hpp"

#include <unistd.h>

#include <array>
#include <catch2/catch.hpp>
#include <cstdio>
#include <filesystem>
#include <fstream>

namespace ringwright::pdf {

std::string told_by(const std::string& tool, const std::string& pdf) {
    const auto path =
        std::filesystem::temp_directory_path() / ("ringwright-report-" + std::to_string(getpid()) + ".pdf");
    std::ofstream(path, std::ios::binary) << pdf;
    const std::string command =
        tool + " '" + path.string() + "'" + (tool.starts_with("pdftotext") ? " -" : "");
    FILE* pipe = popen(command.c_str(), "r");
    REQUIRE(pipe != nullptr);
    std::string text;
    std::array<char, 4096> buffer{};
    while (const std::size_t count = std::fread(buffer.data(), 1, buffer.size(), pipe))
        text.append(buffer.data(), count);
    REQUIRE(pclose(pipe) == 0);
    std::filesystem::remove(path);
    return text;
}

std::string text_of(const std::string& pdf) {
    return told_by("pdftotext -layout", pdf);
}

}  // namespace ringwright::pdf
