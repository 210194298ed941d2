#include "app/messages.hpp"

#include <fmt/format.h>
#include <sys/stat.h>
#include <unistd.h>

#include <algorithm>
#include <cerrno>
#include <cstdio>
#include <cstring>
#include <filesystem>

#include "ringwright/safe_file.hpp"

namespace ringwright::app {
namespace {

bool reader_gone = false;

void write_standard_output(std::string_view text) {
    while (!text.empty()) {
        const ssize_t written = ::write(STDOUT_FILENO, text.data(), text.size());
        if (written < 0 && errno == EINTR) continue;
        if (written < 0 && errno == EPIPE) {
            reader_gone = true;
            return;
        }
        if (written < 0)
            throw OutputError({"standard output", "",
                               fmt::format("cannot be written: {}", std::strerror(errno)),
                               "Make room, or write to a file with -o"});
        text.remove_prefix(static_cast<std::size_t>(written));
    }
}

}  // namespace

std::string without_period(std::string text) {
    std::ranges::replace(text, '\n', ' ');
    text.erase(text.find_last_not_of(" .") + 1);
    return text;
}

void say(const Problem& problem) {
    Problem shown = problem;
    shown.remedy = without_period(shown.remedy);
    std::string line = "ringwright: " + to_text(shown);
    std::ranges::replace_if(
        line, [](char character) { return static_cast<unsigned char>(character) < 0x20; }, '?');
    const bool closed = shown.remedy.empty() || shown.remedy.ends_with('?') || shown.remedy.ends_with('!');
    line += closed ? "\n" : ".\n";
    std::fwrite(line.data(), 1, line.size(), stderr);
}

bool errors_follow_answer() {
    struct stat answer {
    }, errors{};
    return ::fstat(STDOUT_FILENO, &answer) == 0 && ::fstat(STDERR_FILENO, &errors) == 0 &&
           answer.st_dev == errors.st_dev && answer.st_ino == errors.st_ino;
}

void write_answer(std::string_view text, const std::string& output) {
    if (output.empty() || output == "-")
        write_standard_output(text);
    else
        write_file_safely(output, text);
}

bool standard_output_is_closed() {
    return reader_gone;
}

void refuse_overwriting(const std::string& output, const std::vector<std::string>& inputs) {
    if (output.empty() || output == "-") return;
    for (const std::string& input : inputs) {
        std::error_code error;
        if (!std::filesystem::equivalent(input, output, error) || error) continue;
        if (!std::filesystem::is_regular_file(input, error)) continue;
        throw UsageError({"-o", "", fmt::format("{} is one of the recordings", output),
                          "Name another file for the answer; recordings are never overwritten"});
    }
}

}  // namespace ringwright::app
