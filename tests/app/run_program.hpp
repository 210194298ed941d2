#pragma once
// Runs the program as a user does, in a folder of its own.

#include <sys/wait.h>
#include <unistd.h>

#include <cstdlib>
#include <filesystem>
#include <fstream>
#include <sstream>
#include <string>
#include <vector>

namespace ringwright::test {

struct Outcome {
    int status = -1;
    std::string out, err;
};

class Bench {
  public:
    Bench()
        : folder_(std::filesystem::temp_directory_path() / ("ringwright-app-" + std::to_string(::getpid()))) {
        std::filesystem::create_directories(folder_);
    }
    Bench(const Bench&) = delete;
    Bench& operator=(const Bench&) = delete;
    ~Bench() { std::filesystem::remove_all(folder_); }

    [[nodiscard]] std::string path(const std::string& name) const { return (folder_ / name).string(); }
    std::string write(const std::string& name, const std::string& bytes) const {
        std::ofstream(path(name), std::ios::binary) << bytes;
        return path(name);
    }
    [[nodiscard]] std::string read(const std::string& name) const {
        std::ostringstream text;
        text << std::ifstream(path(name), std::ios::binary).rdbuf();
        return text.str();
    }

    /// `input` is a file for standard input; `redirect` what stands for `>FILE` where the answer goes
    /// elsewhere.
    [[nodiscard]] Outcome run(const std::vector<std::string>& arguments,
                              const std::string& input = "/dev/null",
                              const std::string& redirect = "") const {
        std::ostringstream command;
        command << quoted(RINGWRIGHT_PROGRAM);
        for (const std::string& argument : arguments) command << ' ' << quoted(argument);
        command << " <" << quoted(input) << " 2>" << quoted(path("err"));
        if (redirect.empty())
            command << " >" << quoted(path("out"));
        else
            command << ' ' << redirect;
        const int status = std::system(command.str().c_str());
        return {WIFEXITED(status) ? WEXITSTATUS(status) : -1, redirect.empty() ? read("out") : "",
                read("err")};
    }

  private:
    static std::string quoted(const std::string& text) {
        std::string shell(1, '\'');
        for (const char character : text) {
            if (character == '\'')
                shell.append("'\\''");
            else
                shell.push_back(character);
        }
        shell.push_back('\'');
        return shell;
    }
    std::filesystem::path folder_;
};

}  // namespace ringwright::test
