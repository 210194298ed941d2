#pragma once
// Ctrl-C and a request to end, noticed by work that has something to say before it ends.

namespace ringwright::app {

/// While it lives, SIGINT and SIGTERM are noted and do not end the process; a second one does, at once.
class InterruptionWatch {
  public:
    InterruptionWatch();
    ~InterruptionWatch();
    InterruptionWatch(const InterruptionWatch&) = delete;
    InterruptionWatch& operator=(const InterruptionWatch&) = delete;
    [[nodiscard]] static bool interrupted();
};

/// Ends the process by the signal that was noted, as its caller expects of an interrupted program (a shell
/// sees 128 + the signal's number). Threads that are still at work end with it.
[[noreturn]] void end_as_interrupted();

}  // namespace ringwright::app
