#pragma once
// A folder of recordings to work through, in a folder that goes away with it.

#include <fmt/format.h>
#include <sys/stat.h>
#include <unistd.h>

#include <filesystem>
#include <fstream>
#include <nlohmann/json.hpp>
#include <sstream>
#include <string>
#include <vector>

#include "app/bench_recordings.hpp"
#include "faults/process.hpp"

namespace ringwright::test {

using Json = nlohmann::ordered_json;

inline std::string bytes_of(const std::filesystem::path& file) {
    std::ostringstream text;
    text << std::ifstream(file, std::ios::binary).rdbuf();
    return text.str();
}

inline std::vector<std::string> lines_of(const std::string& text) {
    std::vector<std::string> lines;
    std::istringstream stream(text);
    for (std::string line; std::getline(stream, line);) lines.push_back(line);
    return lines;
}

class Workplace {
  public:
    Workplace()
        : folder_(std::filesystem::temp_directory_path() / fmt::format("ringwright-faults-{}", ::getpid())) {
        std::filesystem::remove_all(folder_);
        std::filesystem::create_directories(folder_);
    }
    Workplace(const Workplace&) = delete;
    Workplace& operator=(const Workplace&) = delete;
    ~Workplace() {
        std::error_code error;
        std::filesystem::remove_all(folder_, error);
    }
    [[nodiscard]] std::string path(const std::string& name) const { return (folder_ / name).string(); }
    [[nodiscard]] std::string read(const std::string& name) const { return bytes_of(path(name)); }
    std::string write(const std::string& name, const std::string& bytes) const {
        std::filesystem::create_directories(std::filesystem::path(path(name)).parent_path());
        std::ofstream(path(name), std::ios::binary) << bytes;
        return path(name);
    }
    /// `count` releases of known damping under NAME/000.csv …; the fourth is no recording, the sixth rests.
    std::string archive(const std::string& name, std::size_t count) const {
        for (std::size_t i = 0; i < count; ++i) {
            const auto seed = static_cast<std::uint64_t>(i);
            std::string text = pluck_csv(0.01 + 0.002 * static_cast<double>(i % 40), 1 + seed);
            if (i == 3) text = "nothing to see\n";
            if (i == 5) text = resting();
            write(fmt::format("{}/{:03}.csv", name, i), text);
        }
        return path(name);
    }

  private:
    static std::string resting() {
        std::string text = "time (s),displacement (mm)\n";
        for (int i = 0; i < 1500; ++i) text += fmt::format("{:.4f},1.5\n", i / 500.0);
        return text;
    }
    std::filesystem::path folder_;
};

/// The file that each line of the answer is about.
inline std::vector<std::string> files_in(const std::string& answer) {
    std::vector<std::string> files;
    for (const std::string& line : lines_of(answer))
        files.push_back(Json::parse(line)["recordings"][0]["file"].get<std::string>());
    return files;
}

}  // namespace ringwright::test
