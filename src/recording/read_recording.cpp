#include <algorithm>
#include <array>
#include <cmath>
#include <future>
#include <memory>
#include <string>

#include "recording/csv_reader.hpp"
#include "recording/health.hpp"
#include "recording/input_bytes.hpp"
#include "recording/long_csv.hpp"
#include "recording/sound_reader.hpp"
#include "ringwright/error.hpp"
#include "ringwright/long_recording.hpp"
#include "ringwright/recording.hpp"

namespace ringwright {
namespace {

using namespace std::string_view_literals;

struct Foreign {
    std::string_view sign;
    std::string_view what;
};

constexpr std::array<Foreign, 13> foreign_files = {
    {{"PK\x03\x04"sv, "a zip archive or a spreadsheet workbook"},
     {"\xD0\xCF\x11\xE0"sv, "a spreadsheet workbook"},
     {"%PDF"sv, "a PDF document"},
     {"\x1F\x8B"sv, "a compressed file"},
     {"BZh"sv, "a compressed file"},
     {"\xFD"
      "7zXZ"sv,
      "a compressed file"},
     {"7z\xBC\xAF"sv, "a compressed file"},
     {"\x89PNG"sv, "a picture"},
     {"\xFF\xD8\xFF"sv, "a picture"},
     {"GIF8"sv, "a picture"},
     {"\x89HDF"sv, "an HDF5 file"},
     {"\x7F"
      "ELF"sv,
      "a program"},
     {"SQLite format 3"sv, "a database"}}};

void refuse_foreign(std::string_view bytes, const std::string& file) {
    for (const Foreign& foreign : foreign_files)
        if (bytes.starts_with(foreign.sign))
            throw InputError(Problem{file, "", "this is " + std::string(foreign.what) + ", not a recording",
                                     "Export the recording as CSV or WAV."});
}

std::string shown_name(const std::string& name) {
    return name == "-" ? "standard input" : name;
}

void check_options(const ReadOptions& options) {
    if (options.rate_hz && !(std::isfinite(*options.rate_hz) && *options.rate_hz > 0.0))
        throw UsageError(Problem{"--rate", "", "the sampling rate must be a positive number of hertz",
                                 "Write it like --rate 2000."});
}

// The hash of a large file is computed beside the reading.
std::future<std::string> hash_beside(std::string_view bytes) {
    constexpr std::size_t large = std::size_t{1} << 20;
    return std::async(bytes.size() > large ? std::launch::async : std::launch::deferred, sha256_hex, bytes);
}

Recording recording_from(std::string_view bytes, const std::string& name, const ReadOptions& options) {
    check_options(options);
    Recording recording;
    recording.origin.file = shown_name(name);
    recording.origin.bytes = bytes.size();
    auto hash = hash_beside(bytes);
    if (is_sound(bytes)) {
        read_sound(bytes, options, recording);
    } else {
        refuse_foreign(bytes, recording.origin.file);
        read_csv(bytes, options, recording);
    }
    examine_health(recording);
    recording.origin.sha256 = hash.get();
    recording.origin.file = name;
    return recording;
}

std::unique_ptr<LongRecording> open_long(const std::shared_ptr<const InputBytes>& input,
                                         const std::string& path, const ReadOptions& options,
                                         const LongLimits& limits) {
    const std::string_view bytes = input->view();
    const bool sound = is_sound(bytes);
    const std::size_t samples = sound ? frames_stated(bytes, shown_name(path)) : rows_estimate(bytes);
    if (samples <= limits.held_whole) return nullptr;
    check_options(options);
    Recording facts;
    facts.origin.file = shown_name(path);
    facts.origin.bytes = bytes.size();
    auto hash = hash_beside(bytes);
    if (!sound) refuse_foreign(bytes, facts.origin.file);
    auto recording = sound ? open_long_sound(input, options, std::move(facts), limits)
                           : open_long_csv(input, options, std::move(facts), limits);
    if (recording) recording->name(path, hash.get());
    return recording;
}

}  // namespace

Recording read_recording(const std::string& path, const ReadOptions& options) {
    const InputBytes input(path);
    return recording_from(input.view(), path, options);
}

Recording read_recording_from_memory(std::string_view bytes, const std::string& name,
                                     const ReadOptions& options) {
    if (bytes.empty())
        throw InputError(Problem{shown_name(name), "", "the file is empty",
                                 "Export the recording again; the logger may have been stopped too soon."});
    return recording_from(bytes, name, options);
}

std::unique_ptr<LongRecording> open_long_recording(const std::string& path, const ReadOptions& options,
                                                   const LongLimits& limits) {
    return open_long(std::make_shared<const InputBytes>(path), path, options, limits);
}

OpenedRecording open_recording(const std::string& path, const ReadOptions& options,
                               const LongLimits& limits) {
    const auto input = std::make_shared<const InputBytes>(path);
    if (std::shared_ptr<const LongRecording> recording = open_long(input, path, options, limits))
        return {recording->facts(), recording};
    return {recording_from(input->view(), path, options), nullptr};
}

FileSummary summarise_file(const std::string& path, const ReadOptions& options) {
    const InputBytes input(path);
    FileSummary summary;
    summary.file = shown_name(path);
    summary.bytes = input.view().size();
    if (is_sound(input.view())) {
        summarise_sound(input.view(), options, summary);
    } else {
        refuse_foreign(input.view(), summary.file);
        summarise_csv(input.view(), options, summary);
    }
    summary.sha256 = sha256_hex(input.view());
    summary.file = path;
    return summary;
}

}  // namespace ringwright
