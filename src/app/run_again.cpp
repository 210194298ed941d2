#include "app/run_again.hpp"

#include <fmt/format.h>

#include <CLI/App.hpp>
#include <CLI/Config.hpp>
#include <CLI/Formatter.hpp>
#include <algorithm>
#include <cmath>
#include <filesystem>
#include <nlohmann/json.hpp>

#include "app/answer_options.hpp"
#include "app/article_options.hpp"
#include "app/messages.hpp"
#include "app/recording_options.hpp"
#include "app/same_figures.hpp"
#include "app/test_arguments.hpp"
#include "ringwright/error.hpp"
#include "ringwright/ledger.hpp"
#include "ringwright/measured_value.hpp"
#include "ringwright/result_json.hpp"

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

/// The intervals of the simple methods are in the result; only where it takes its numbers from one of them is
/// their bootstrap run again. Two replicates are the fewest that have a deviation.
constexpr int fewest_replicates = 2;

std::string text_of(const Json& object, const char* key) {
    const auto found = object.find(key);
    return found != object.end() && found->is_string() ? found->get<std::string>() : "";
}

/// The object under the key; an empty one when there is none.
Json object_of(const Json& json, const char* key) {
    const auto found = json.find(key);
    return found != json.end() && found->is_object() ? *found : Json::object();
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

/// The sheet with the hash that the result names; nothing when it is not there any more.
std::optional<TestSheet> find_sheet(const Json& facts, const std::vector<fs::path>& places) {
    for (const fs::path& place : places) {
        std::error_code error;
        const std::string path = place.string();
        if (fs::is_regular_file(place, error) && sha256_of_file(path) == text_of(facts, "sha256"))
            return read_test_sheet(path);
    }
    return std::nullopt;
}

/// What a sheet said of the article, as the result repeats it.
void fill_from_result(const Json& article, ArticleArguments& arguments) {
    const auto fill = [&](std::string& argument, const char* key) {
        if (argument.empty()) argument = text_of(object_of(article, key), "as_written");
    };
    if (arguments.mass.empty() && arguments.inertia.empty()) {
        fill(arguments.mass, "mass");
        fill(arguments.inertia, "inertia");
    }
    fill(arguments.spring_mass, "spring_mass");
    fill(arguments.gravity, "gravity");
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
std::optional<OpenedRecording> find_recording(const Json& wanted, const std::vector<fs::path>& places,
                                        const ReadOptions& options, std::string& why) {
    const std::string hash = text_of(wanted, "sha256");
    why = "the recording was not found";
    for (const fs::path& place : places) {
        std::error_code error;
        if (!fs::is_regular_file(place, error)) continue;
        try {
            OpenedRecording opened = open_with_progress(place.string(), options);
            if (!hash.empty() && opened.recording.origin.sha256 == hash) return opened;
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
        RecordingInput input = input_of(std::move(*found), std::nullopt);
        const std::string added = text_of(object_of(wanted, "added_mass"), "as_written");
        if (!added.empty()) input.added_mass = parse_measured_value(added, "added_mass", Dimension::mass);
        inputs.push_back(std::move(input));
    }
    return missing.empty() && !inputs.empty();
}

/// The options of the result, and what its sheet added to them.
Arguments all_arguments(const Json& result, const std::string& file, const std::vector<std::string>& folders,
                        std::optional<TestSheet> sheet) {
    Arguments arguments = arguments_of(result);
    const Json facts = object_of(result, "test_sheet");
    if (!sheet && facts.contains("sha256"))
        sheet = find_sheet(facts, places_of(text_of(facts, "file"), file, folders));
    if (sheet) fill_from_sheet(*sheet, arguments.recording, arguments.article);
    fill_from_result(object_of(result, "article"), arguments.article);
    return arguments;
}

std::string now_text(const Quantities& quantities, Quantity quantity) {
    const auto now = quantities.find(quantity);
    return now == quantities.end()
               ? "absent"
               : fmt::format("{:.9g} (u {:.3g})", now->second.value, now->second.standard_uncertainty);
}

/// Within a hundredth of the uncertainty: less than the digits that a report shows.
bool shows_the_same(const Estimate& before, const Estimate& now) {
    const double u = before.standard_uncertainty, room = 0.01 * u;
    const bool value =
        std::abs(now.value - before.value) <= room || match_of(before.value, now.value) != Match::different;
    return value && std::abs(now.standard_uncertainty - u) <= room;
}

/// One sentence over all of them, or none.
std::vector<std::string> differences_of(const Json& result, const Quantities& quantities,
                                        const std::string& file) {
    std::string differences;
    const Json filed = object_of(object_of(result, "result"), "quantities");
    for (const auto& [quantity, before] : quantities_from_json(filed, file)) {
        const auto now = quantities.find(quantity);
        if (now != quantities.end() && shows_the_same(before, now->second)) continue;
        differences += fmt::format("{}{}, in the result {:.9g} (u {:.3g}), now {}",
                                   differences.empty() ? "" : "; ", name_of(quantity), before.value,
                                   before.standard_uncertainty, now_text(quantities, quantity));
    }
    if (differences.empty()) return {};
    return {
        fmt::format("Run again for the figures, not all came out as in the result: {}. The numbers of this "
                    "report are those of the result.",
                    differences)};
}

}  // namespace

RunAgain run_again(const Json& result, const std::string& file, const std::vector<std::string>& folders,
                   const std::optional<TestSheet>& sheet) {
    RunAgain again;
    try {
        const Arguments arguments = all_arguments(result, file, folders, sheet);
        AnalysisOptions options =
            analysis_options(arguments.recording, arguments.article, arguments.answer, arguments.analysis);
        options.identify.pictures = true;
        options.keep_samples = true;
        if (text_of(object_of(result, "result"), "method") == "curve_fit")
            options.identify.replicates = fewest_replicates;
        std::vector<RecordingInput> inputs;
        if (read_recordings(result, file, folders, arguments, inputs, again.missing))
            again.identification = identify(std::move(inputs), options);
        if (again.identification)
            again.differences = differences_of(result, again.identification->result.quantities, file);
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
