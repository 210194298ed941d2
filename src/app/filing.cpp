#include "app/filing.hpp"

#include <fmt/format.h>

#include <CLI/App.hpp>
#include <CLI/Config.hpp>
#include <CLI/Formatter.hpp>
#include <algorithm>
#include <array>
#include <cstdio>
#include <cstdlib>

namespace ringwright::app {
namespace {

constexpr std::array<std::string_view, 16> left_out{
    "before", "after", "recordings", "figure", "paper",    "added-mass", "output", "format",
    "ledger", "sheet", "help",       "jobs",   "separate", "reason",     "resume", "shard"};

std::string long_name(const CLI::Option& option) {
    return option.get_lnames().empty() ? std::string() : option.get_lnames().front();
}

}  // namespace

std::vector<std::string> given_options(const CLI::App& command) {
    std::vector<std::string> given;
    for (const CLI::Option* option : command.get_options()) {
        const std::string name = long_name(*option);
        if (option->count() == 0 || name.empty() || std::ranges::find(left_out, name) != left_out.end())
            continue;
        if (option->get_items_expected_max() == 0)
            given.push_back("--" + name);
        else
            for (const std::string& value : option->results())
                given.push_back(fmt::format("--{}={}", name, value));
    }
    return given;
}

std::vector<LedgerRecording> recordings_of(const Identification& identification) {
    std::vector<LedgerRecording> recordings;
    for (const RecordingIdentification& identified : identification.recordings) {
        const Origin& origin = identified.recording.origin;
        recordings.push_back({origin.file, origin.sha256, origin.bytes, origin.channel,
                              identified.added_mass ? identified.added_mass->text : std::string()});
    }
    return recordings;
}

void file_result(const std::string& ledger_path, const std::string& result_json,
                 const std::optional<TestSheet>& sheet, std::vector<std::string> options,
                 std::vector<LedgerRecording> recordings) {
    NewEntry entry;
    entry.result_json = result_json;
    if (sheet) {
        entry.sheet_name = sheet->file;
        entry.sheet_text = sheet->text;
    }
    entry.arguments = std::move(options);
    entry.recordings = std::move(recordings);
    const EntrySummary filed = Ledger::open_or_create(ledger_path).add(entry);
    fmt::print(stderr, "ringwright: filed as entry {} of {}\n", filed.number, ledger_path);
}

std::string ledger_path_from(const std::string& option) {
    if (!option.empty()) return option;
    const char* environment = std::getenv("RINGWRIGHT_LEDGER");
    return environment && *environment ? environment : "ringwright.ledger";
}

Date today() {
    return std::chrono::floor<std::chrono::days>(std::chrono::system_clock::now());
}

}  // namespace ringwright::app
