#pragma once
// Results, sheets and ledger files for the tests of this folder.

#include <fmt/format.h>
#include <unistd.h>

#include <filesystem>
#include <string>

#include "ringwright/ledger.hpp"

namespace ringwright_test {

/// A folder of its own that goes when the test ends.
class Folder {
  public:
    Folder()
        : path_(std::filesystem::temp_directory_path() /
                fmt::format("ringwright-{}-{}", getpid(), count()++)) {
        std::filesystem::create_directories(path_);
    }
    Folder(const Folder&) = delete;
    Folder& operator=(const Folder&) = delete;
    ~Folder() {
        std::error_code ignored;
        std::filesystem::remove_all(path_, ignored);
    }
    std::string file(const std::string& name) const { return (path_ / name).string(); }
    std::string path() const { return path_.string(); }

  private:
    static int& count() {
        static int folders = 0;
        return folders;
    }
    std::filesystem::path path_;
};

inline std::string result_json(double damping_ratio = 0.27, const std::string& decision = "conforms") {
    return fmt::format(
        R"({{"schema":"ringwright.identification.v1","software":{{"name":"ringwright","version":"0.1.0"}},)"
        R"("confidence_level":0.95,"recordings":[{{"file":"a.csv","sha256":"{:064x}","channel":"laser"}}],)"
        R"("result":{{"method":"curve_fit","event_count":5,"quantities":{{)"
        R"("damping_ratio":{{"value":{},"unit":"1","standard_uncertainty":0.004,"interval":[0.26,0.28],"degrees_of_freedom":4}},)"
        R"("natural_frequency":{{"value":5.0,"unit":"Hz","standard_uncertainty":0.01,"interval":[4.98,5.02]}}}}}},)"
        R"("verdict":{{"decision":"{}"}}}})",
        42, damping_ratio, decision);
}

inline std::string sheet_text(const std::string& serial = "0417", const std::string& who = "day shift",
                              const std::string& date = "2031-04-02") {
    return fmt::format(
        "[article]\ntype = \"sash damper S2\"\nserial = \"{}\"\n[test]\noperator = \"{}\"\ndate = {}\n",
        serial, who, date);
}

inline ringwright::NewEntry new_entry(double damping_ratio = 0.27, const std::string& serial = "0417") {
    ringwright::NewEntry entry;
    entry.result_json = result_json(damping_ratio);
    entry.sheet_name = "sheet.toml";
    entry.sheet_text = sheet_text(serial);
    entry.arguments = {"--test", "pluck"};
    return entry;
}

}  // namespace ringwright_test
