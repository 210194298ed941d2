#include "app/interruption.hpp"

#include <unistd.h>

#include <csignal>
#include <initializer_list>

namespace ringwright::app {
namespace {

volatile std::sig_atomic_t noted_signal = 0;

extern "C" void note_signal(int number) {
    noted_signal = number;
}

void act(int number, void (*handler)(int), int flags) {
    struct sigaction action {};
    action.sa_handler = handler;
    action.sa_flags = flags;
    sigemptyset(&action.sa_mask);
    ::sigaction(number, &action, nullptr);
}

/// A caller that ignores SIGINT (nohup, a shell's background job) is not overruled.
bool ignored(int number) {
    struct sigaction action {};
    return ::sigaction(number, nullptr, &action) == 0 && action.sa_handler == SIG_IGN;
}

}  // namespace

InterruptionWatch::InterruptionWatch() {
    noted_signal = 0;
    for (const int number : {SIGINT, SIGTERM})
        if (!ignored(number)) act(number, note_signal, static_cast<int>(SA_RESETHAND | SA_RESTART));
}

InterruptionWatch::~InterruptionWatch() {
    for (const int number : {SIGINT, SIGTERM})
        if (!ignored(number)) act(number, SIG_DFL, 0);
}

bool InterruptionWatch::interrupted() {
    return noted_signal != 0;
}

void end_as_interrupted() {
    const int number = noted_signal == 0 ? SIGINT : noted_signal;
    act(number, SIG_DFL, 0);
    ::kill(::getpid(), number);
    ::_exit(128 + number);
}

}  // namespace ringwright::app
