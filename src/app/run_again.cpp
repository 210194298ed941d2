#include "app/run_again.hpp"

#include <fmt/format.h>

#include <CLI/App.hpp>
#include <CLI/Config.hpp>
#include <CLI/Formatter.hpp>
#include <algorithm>
#include <filesystem>
#include <nlohmann/json.hpp>

#include "app/answer_options.hpp"
#include "app/article_options.hpp"
#include "app/messages.hpp"
#include "app/recording_options.hpp"
#include "ringwright/error.hpp"
#include "ringwright/measured_value.hpp"

namespace ringwright::app {
namespace {

namespace fs = std::filesystem;
using Json = nlohmann::ordered_json;

struct Arguments {
    RecordingArguments recording;
    ArticleArguments article;
    AnswerArguments answer;
    AnalysisArguments analysis;
};

std::string text_of(const Json& object, const char* key) {
    const auto found = object.find(key);
    return found != object.end() && found->is_string() ? found->get<std::string>() : "";
}

Arguments arguments_of(const Json& result) {
    CLI::App parser;
    Arguments arguments;
    add_recording_options(parser, arguments.recording);
    add_article_options(parser, arguments.article);
    add_answer_options(parser, arguments.answer);
    add_analysis_options(parser, arguments.analysis);
    std::string rule;  // of a verdict; what is drawn of the samples does not depend on it
    parser.add_option("--rule", rule);
    std::vector<std::string> given;
    for (const Json& option : result.value("options", Json::array()))
        if (option.is_string()) given.push_back(option.get<std::string>());
    std::ranges::reverse(given);  // CLI11 takes them from the end
    parser.parse(given);
    return arguments;
}

/// A sheet may have said what the options do not: the result has what came of it.
void fill_from_result(const Json& recording, RecordingArguments& arguments) {
    const auto fill = [&](std::string& argument, const char* key) {
        if (argument.empty()) argument = text_of(recording, key);
    };
    fill(arguments.channel, "channel");
    fill(arguments.quantity, "quantity");
    if (arguments.sensitivity.empty()) fill(arguments.unit, "unit");
}

std::vector<fs::path> places_of(const std::string& named, const std::string& result_file,
                                const std::vector<std::string>& folders) {
    const fs::path path = named;
    std::vector<fs::path> places{path};
    const fs::path beside = fs::path(result_file).parent_path();
    places.push_back(beside / path);
    places.push_back(beside / path.filename());
    for (const std::string& folder : folders) places.push_back(fs::path(folder) / path.filename());
    return places;
}

/// The recording with the hash that the result names, or nothing and why.
std::optional<Recording> find_recording(const Json& wanted, const std::vector<fs::path>& places,
                                        const ReadOptions& options, std::string& why) {
    const std::string hash = text_of(wanted, "sha256");
    why = "the recording was not found";
    for (const fs::path& place : places) {
        std::error_code error;
        if (!fs::is_regular_file(place, error)) continue;
        try {
            Recording recording = read_with_progress(place.string(), options);
            if (!hash.empty() && recording.origin.sha256 == hash) return recording;
            why = place.string() + " is another recording (its hash differs)";
        } catch (const InputError& error_in_file) {
            why = without_period(to_text(error_in_file.problem()));
        }
    }
    return std::nullopt;
}

bool read_recordings(const Json& result, const std::string& file, const std::vector<std::string>& folders,
                     const Arguments& arguments, std::vector<RecordingInput>& inputs,
                     std::vector<std::string>& missing) {
    for (const Json& wanted : result.value("recordings", Json::array())) {
        RecordingArguments recording = arguments.recording;
        if (result.contains("test_sheet")) fill_from_result(wanted, recording);
        std::string why;
        auto found = find_recording(wanted, places_of(text_of(wanted, "file"), file, folders),
                                    read_options(recording), why);
        if (!found) {
            missing.push_back(
                fmt::format("The figures of {} are missing: {}.", text_of(wanted, "file"), why));
            continue;
        }
        RecordingInput input{std::move(*found), std::nullopt};
        const std::string added = text_of(wanted.value("added_mass", Json::object()), "as_written");
        if (!added.empty()) input.added_mass = parse_measured_value(added, "added_mass", Dimension::mass);
        inputs.push_back(std::move(input));
    }
    return missing.empty() && !inputs.empty();
}

}  // namespace

RunAgain run_again(const Json& result, const std::string& file, const std::vector<std::string>& folders) {
    RunAgain again;
    try {
        const Arguments arguments = arguments_of(result);
        AnalysisOptions options =
            analysis_options(arguments.recording, arguments.article, arguments.answer, arguments.analysis);
        options.identify.pictures = true;
        options.keep_samples = true;
        std::vector<RecordingInput> inputs;
        if (read_recordings(result, file, folders, arguments, inputs, again.missing))
            again.identification = identify(std::move(inputs), options);
    } catch (const CLI::ParseError& error) {
        again.missing.push_back(
            fmt::format("Figures are missing: the options in the result cannot be used ({}).",
                        without_period(error.what())));
    } catch (const UsageError& error) {
        again.missing.push_back(
            fmt::format("Figures are missing: {}.", without_period(to_text(error.problem()))));
    }
    return again;
}

}  // namespace ringwright::app
