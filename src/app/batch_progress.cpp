#include "app/batch_progress.hpp"

#include <fmt/format.h>
#include <unistd.h>

#include <cstdio>

namespace ringwright::app {
namespace {

std::string duration_text(double seconds) {
    const auto whole = static_cast<long>(seconds + 0.5);
    if (whole < 60) return fmt::format("{} s", whole);
    if (whole < 3600) return fmt::format("{} min {} s", whole / 60, whole % 60);
    return fmt::format("{} h {} min", whole / 3600, whole % 3600 / 60);
}

}  // namespace

std::string progress_text(std::size_t done, std::size_t total, std::size_t without_answer,
                          std::size_t done_before, double elapsed_s) {
    std::string text = fmt::format("{} of {} recordings", done, total);
    if (without_answer > 0) text += fmt::format(", {} without an answer", without_answer);
    if (done <= done_before || done >= total) return text;
    const double each_s = elapsed_s / static_cast<double>(done - done_before);
    return text + fmt::format(", {} left", duration_text(each_s * static_cast<double>(total - done)));
}

BatchProgress::BatchProgress(std::size_t total, std::size_t done_before)
    : total_(total), done_before_(done_before), done_(0), terminal_(::isatty(STDERR_FILENO) != 0) {}

void BatchProgress::count(bool answered) {
    ++done_;
    without_answer_ += answered ? 0 : 1;
    // The time begins where the work does, behind what is only said again.
    if (done_ == done_before_) started_ = Clock::now();
    show();
}

void BatchProgress::show() {
    const auto now = Clock::now();
    if (!terminal_ || now - shown_at_ < std::chrono::milliseconds(250)) return;
    shown_at_ = now;
    visible_ = true;
    const double elapsed_s = std::chrono::duration<double>(now - started_).count();
    fmt::print(stderr, "\r{}\033[K", progress_text(done_, total_, without_answer_, done_before_, elapsed_s));
    std::fflush(stderr);
}

void BatchProgress::clear() {
    if (!visible_) return;
    visible_ = false;
    std::fputs("\r\033[K", stderr);
    std::fflush(stderr);
}

}  // namespace ringwright::app
