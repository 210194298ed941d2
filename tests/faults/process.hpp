#pragma once
// The program as a process that can be killed, limited and put into another environment.

#include <fcntl.h>
#include <sys/resource.h>
#include <sys/wait.h>
#include <unistd.h>

#include <chrono>
#include <csignal>
#include <optional>
#include <string>
#include <thread>
#include <vector>

namespace ringwright::test {

/// How a process is started beyond its arguments.
struct Circumstances {
    std::string out = "/dev/null", err = "/dev/null";  ///< files for what it says
    std::string folder = {};                           ///< where it runs; empty: here
    std::vector<std::string> environment = {};         ///< NAME=VALUE, beside what there is
    std::optional<rlim_t> most_file_bytes = {};        ///< RLIMIT_FSIZE
};

/// How a process ended.
struct Ending {
    int status = -1;          ///< exit status; −1 where a signal ended it
    int signal = 0;           ///< that signal
    long peak_kilobytes = 0;  ///< of memory
};

class Process {
  public:
    Process(std::vector<std::string> arguments, const Circumstances& circumstances) {
        arguments.insert(arguments.begin(), RINGWRIGHT_PROGRAM);
        identifier_ = ::fork();
        if (identifier_ == 0) become(arguments, circumstances);
    }
    Process(const Process&) = delete;
    Process& operator=(const Process&) = delete;
    ~Process() {
        if (!ended_) kill(SIGKILL), (void)wait();
    }
    void kill(int signal) const { ::kill(identifier_, signal); }
    void kill_after(std::chrono::microseconds time) const {
        std::this_thread::sleep_for(time);
        kill(SIGKILL);
    }
    Ending wait() {
        int status = 0;
        rusage used{};
        ::wait4(identifier_, &status, 0, &used);
        ended_ = true;
        return {WIFEXITED(status) ? WEXITSTATUS(status) : -1, WIFSIGNALED(status) ? WTERMSIG(status) : 0,
                used.ru_maxrss};
    }

  private:
    static void redirect(const std::string& file, int descriptor) {
        const int opened = ::open(file.c_str(), O_WRONLY | O_CREAT | O_TRUNC, 0666);
        if (opened < 0 || ::dup2(opened, descriptor) < 0) ::_exit(127);
        ::close(opened);
    }

    [[noreturn]] static void become(std::vector<std::string>& arguments, const Circumstances& circumstances) {
        const int nothing = ::open("/dev/null", O_RDONLY);
        ::dup2(nothing, STDIN_FILENO);
        redirect(circumstances.out, STDOUT_FILENO);
        redirect(circumstances.err, STDERR_FILENO);
        if (!circumstances.folder.empty() && ::chdir(circumstances.folder.c_str()) != 0) ::_exit(127);
        for (std::string setting : circumstances.environment) ::putenv(::strdup(setting.c_str()));
        if (circumstances.most_file_bytes) {
            const rlimit limit{*circumstances.most_file_bytes, *circumstances.most_file_bytes};
            ::setrlimit(RLIMIT_FSIZE, &limit);
        }
        std::vector<char*> words;
        for (std::string& argument : arguments) words.push_back(argument.data());
        words.push_back(nullptr);
        ::execv(words.front(), words.data());
        ::_exit(127);
    }

    pid_t identifier_ = -1;
    bool ended_ = false;
};

inline Ending run(const std::vector<std::string>& arguments, const Circumstances& circumstances = {}) {
    return Process(arguments, circumstances).wait();
}

}  // namespace ringwright::test
