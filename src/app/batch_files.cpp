#include "app/batch_files.hpp"

#include <fmt/format.h>
#include <glob.h>

#include <algorithm>
#include <array>
#include <charconv>
#include <filesystem>
#include <string_view>
#include <utility>

#include "ringwright/counting.hpp"

namespace ringwright::app {
namespace {

namespace fs = std::filesystem;

/// What recordings are called (docs/formats.md); what is read is told from the bytes.
constexpr std::array<std::string_view, 19> recording_endings{
    ".csv",  ".tsv",  ".txt",  ".dat", ".asc",  ".prn",  ".tab", ".wav", ".wave", ".w64",
    ".rf64", ".bw64", ".flac", ".aif", ".aiff", ".aifc", ".caf", ".au",  ".snd"};

bool named_as_recording(const fs::path& path) {
    std::string ending = path.extension().string();
    std::ranges::transform(ending, ending.begin(), [](char c) {
        return c >= 'A' && c <= 'Z' ? static_cast<char>(c - 'A' + 'a') : c;
    });
    return std::ranges::find(recording_endings, std::string_view(ending)) != recording_endings.end();
}

struct FolderContents {
    std::vector<std::string> recordings, others;
};

/// Throws std::filesystem::filesystem_error where the folder cannot be read.
FolderContents contents_of(const std::string& folder) {
    FolderContents contents;
    for (const fs::directory_entry& entry : fs::directory_iterator(folder)) {
        std::error_code error;
        const std::string name = entry.path().filename().string();
        const bool recording =
            !name.starts_with('.') && named_as_recording(entry.path()) && entry.is_regular_file(error);
        (recording ? contents.recordings : contents.others).push_back(name);
    }
    std::ranges::sort(contents.recordings);
    std::ranges::sort(contents.others);
    return contents;
}

std::string first_names(const std::vector<std::string>& names) {
    constexpr std::size_t most = 5;
    std::string text;
    for (std::size_t i = 0; i < std::min(names.size(), most); ++i) text += (i > 0 ? ", " : "") + names[i];
    return names.size() > most ? text + fmt::format(" and {} more", names.size() - most) : text;
}

void add_folder(const LoadedFile& folder, BatchList& list) {
    try {
        const FolderContents contents = contents_of(folder.file);
        const bool closed = folder.file.ends_with('/');
        for (const std::string& name : contents.recordings)
            list.files.push_back({{folder.file + (closed ? "" : "/") + name, folder.added_mass}});
        if (contents.recordings.empty())
            list.files.push_back(
                {folder, Problem{folder.file, "", "there is no recording in this folder",
                                 "Name the files themselves where their names do not end in .csv, "
                                 ".txt, .wav and the like; folders in it are not entered"}});
        if (!contents.others.empty())
            list.passed_over.push_back(
                {folder.file, "",
                 fmt::format("{} passed over, not named like a recording: {}",
                             counted(contents.others.size(), "entry was", "entries were"),
                             first_names(contents.others)),
                 "Name what is to be read as a FILE of its own"});
    } catch (const fs::filesystem_error& error) {
        list.files.push_back(
            {folder,
             Problem{folder.file, "", fmt::format("the folder cannot be read ({})", error.code().message()),
                     "Ask for the right to read it, or name the files"}});
    }
}

std::vector<std::string> matches_of(const std::string& pattern) {
    glob_t found{};
    std::vector<std::string> names;
    if (::glob(pattern.c_str(), GLOB_NOSORT, nullptr, &found) == 0)
        names.assign(found.gl_pathv, found.gl_pathv + found.gl_pathc);
    ::globfree(&found);
    std::ranges::sort(names);
    return names;
}

void add_named(const LoadedFile& named, BatchList& list) {
    std::error_code error;
    const fs::file_status status = fs::status(named.file, error);
    if (named.file != "-" && fs::is_directory(status)) return add_folder(named, list);
    const bool pattern = !fs::exists(status) && named.file.find_first_of("*?[") != std::string::npos;
    const auto matches = pattern ? matches_of(named.file) : std::vector<std::string>{};
    if (matches.empty()) list.files.push_back({named});
    for (const std::string& match : matches)
        if (fs::is_directory(match, error))
            add_folder({match, named.added_mass}, list);
        else
            list.files.push_back({{match, named.added_mass}});
}

[[noreturn]] void refuse_shard(const std::string& text) {
    throw UsageError({"--shard", "", fmt::format("\"{}\" is no part of a whole", text),
                      "Give part and number of parts, as in --shard 3/8"});
}

std::size_t count_from(std::string_view digits, const std::string& text) {
    std::size_t value = 0;
    const auto [end, error] = std::from_chars(digits.data(), digits.data() + digits.size(), value);
    if (error != std::errc() || end != digits.data() + digits.size() || value == 0 || value > 1'000'000)
        refuse_shard(text);
    return value;
}

/// ⌊count · part / parts⌋ without overflow.
std::size_t share(std::size_t count, std::size_t part, std::size_t parts) {
    return count / parts * part + count % parts * part / parts;
}

}  // namespace

BatchList batch_list(const std::vector<LoadedFile>& files) {
    BatchList list;
    for (const LoadedFile& file : files) add_named(file, list);
    return list;
}

std::size_t Shard::begin(std::size_t count) const {
    return share(count, part - 1, parts);
}

std::size_t Shard::end(std::size_t count) const {
    return share(count, part, parts);
}

Shard shard_from(const std::string& text) {
    if (text.empty()) return {};
    const std::size_t slash = text.find('/');
    if (slash == std::string::npos) refuse_shard(text);
    const std::string_view whole = text;
    const Shard shard{count_from(whole.substr(0, slash), text), count_from(whole.substr(slash + 1), text)};
    if (shard.part > shard.parts) refuse_shard(text);
    return shard;
}

}  // namespace ringwright::app
