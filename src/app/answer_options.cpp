#include "app/answer_options.hpp"

#include <fmt/format.h>

#include <CLI/App.hpp>
#include <CLI/Config.hpp>
#include <CLI/Formatter.hpp>
#include <cmath>
#include <optional>
#include <string_view>

#include "ringwright/error.hpp"
#include "ringwright/measured_value.hpp"

namespace ringwright::app {
namespace {

constexpr const char* group = "About the answer";

bool drop_prefix(std::string_view& text, std::string_view prefix) {
    if (!text.starts_with(prefix)) return false;
    text.remove_prefix(prefix.size());
    return true;
}

void trim(std::string_view& text) {
    while (!text.empty() && text.front() == ' ') text.remove_prefix(1);
    while (!text.empty() && text.back() == ' ') text.remove_suffix(1);
}

/// "50 ppm", "1 %", "0.01"; "± 1 %" is a tolerance, taken as a rectangular distribution. As a part of one.
double relative_uncertainty(std::string_view text, const char* option) {
    const std::string written(text);
    trim(text);
    const bool tolerance = drop_prefix(text, "±") || drop_prefix(text, "+/-");
    double scale = 1.0;
    for (const auto& [suffix, factor] :
         {std::pair{"ppm", 1e-6}, std::pair{"ppb", 1e-9}, std::pair{"%", 1e-2}})
        if (text.ends_with(suffix)) {
            text.remove_suffix(std::string_view(suffix).size());
            scale = factor;
            break;
        }
    trim(text);
    const double part = parse_number(text, option) * scale;
    if (part < 0.0 || part >= 1.0)
        throw UsageError({option, "", fmt::format("{} is not between 0 and 100 %", written),
                          "Example: --time-base \"50 ppm\" --sensor-gain \"1 %\""});
    return tolerance ? part / std::sqrt(3.0) : part;
}

struct GivenAmplitude {
    double value = 0.0;
    std::optional<MeasuredQuantity> of;
};

/// "2 mm", "0.5 g", "3 deg": the unit says what it is an amplitude of; a plain number is in the SI unit of
/// the samples.
GivenAmplitude amplitude_from(const std::string& text) {
    const std::size_t end = text.find_last_of("0123456789.,");
    const std::size_t unit_start = end == std::string::npos ? 0 : text.find_first_not_of(' ', end + 1);
    GivenAmplitude amplitude;
    if (unit_start == std::string::npos) {
        amplitude.value = parse_number(text, "--at-amplitude");
    } else {
        const Dimension dimension = parse_unit(text.substr(unit_start), "--at-amplitude").dimension;
        amplitude.value = parse_measured_value(text, "--at-amplitude", dimension).value;
        for (const MeasuredQuantity quantity :
             {MeasuredQuantity::displacement, MeasuredQuantity::velocity, MeasuredQuantity::acceleration,
              MeasuredQuantity::angle, MeasuredQuantity::angular_velocity,
              MeasuredQuantity::angular_acceleration})
            if (dimension_of(quantity) == dimension) amplitude.of = quantity;
    }
    if (!(amplitude.value > 0.0))
        throw UsageError({"--at-amplitude", "", fmt::format("{} is not above zero", text),
                          "Example: --at-amplitude \"2 mm\""});
    return amplitude;
}

template <typename Whole>
Whole whole_number(const std::string& text, const char* option, Whole most) {
    const double number = parse_number(text, option);
    if (number < 0.0 || number != std::floor(number) || number > static_cast<double>(most))
        throw UsageError({option, "", fmt::format("{} is no whole number from 0 to {}", text, most),
                          fmt::format("Example: {} 4", option)});
    return static_cast<Whole>(number);
}

}  // namespace

void add_answer_options(CLI::App& command, AnswerArguments& arguments) {
    command.add_option("--confidence", arguments.confidence, "Confidence level of the intervals")
        ->type_name("P")
        ->capture_default_str()
        ->group(group);
    command.add_option("--format", arguments.format, "Form of the answer")
        ->type_name("text|json|csv")
        ->capture_default_str()
        ->group(group);
    command
        .add_option("-o,--output", arguments.output,
                    "Write the answer to this file; a name that ends in .html, .pdf, .svg or .png is drawn")
        ->type_name("FILE")
        ->group(group);
}

Format format_from(const AnswerArguments& arguments) {
    if (arguments.format == "text") return Format::text;
    if (arguments.format == "json") return Format::json;
    if (arguments.format == "csv") return Format::csv;
    throw UsageError({"--format", "", fmt::format("\"{}\" is no form that is known", arguments.format),
                      "Give text, json or csv"});
}

double confidence_from(const AnswerArguments& arguments) {
    std::string_view text = arguments.confidence;
    trim(text);
    const double scale = text.ends_with('%') ? 0.01 : 1.0;
    if (scale < 1.0) text.remove_suffix(1);
    trim(text);
    const double level = parse_number(text, "--confidence") * scale;
    if (!(level >= 0.5) || !(level <= 0.9999))
        throw UsageError({"--confidence", "",
                          fmt::format("{} is not between 0.5 and 0.9999", arguments.confidence),
                          "Example: --confidence 0.95"});
    return level;
}

void add_analysis_options(CLI::App& command, AnalysisArguments& arguments) {
    const auto add = [&](const char* name, std::string& text, const char* value, const char* help) {
        command.add_option(name, text, help)->type_name(value)->group(group);
    };
    add("--time-base", arguments.time_base, "PART",
        "Standard uncertainty of the recorder's clock, e.g. \"50 ppm\"; \"± 50 ppm\" is a tolerance");
    add("--sensor-gain", arguments.sensor_gain, "PART", "The same of the sensor's gain, e.g. \"1 %\"");
    add("--at-amplitude", arguments.at_amplitude, "VALUE",
        "Amplitude at which an equivalent damping ratio is stated, e.g. \"2 mm\"");
    add("--seed", arguments.seed, "N",
        "Seed of the bootstrap; the same recording and seed give the same answer");
    add("--jobs", arguments.jobs, "N",
        "Threads; 0 is as many as the machine has. The answer does not depend on it");
}

AnalysisOptions analysis_options(const RecordingArguments& recording, const ArticleArguments& article,
                                 const AnswerArguments& answer, const AnalysisArguments& analysis) {
    AnalysisOptions options;
    options.event = event_options(recording);
    options.event.progress = search_progress();
    options.identify.near_hz = near_hz(recording);
    options.identify.modes = mode_count(recording);
    options.identify.confidence_level = confidence_from(answer);
    options.article = article_from(article);
    if (!analysis.time_base.empty())
        options.time_base_ppm = 1e6 * relative_uncertainty(analysis.time_base, "--time-base");
    if (!analysis.sensor_gain.empty())
        options.sensor_gain_relative = relative_uncertainty(analysis.sensor_gain, "--sensor-gain");
    if (!analysis.at_amplitude.empty()) {
        const GivenAmplitude amplitude = amplitude_from(analysis.at_amplitude);
        options.identify.at_amplitude = amplitude.value;
        options.identify.amplitude_of = amplitude.of;
    }
    if (!analysis.seed.empty())
        options.identify.seed = whole_number<std::uint64_t>(analysis.seed, "--seed", std::uint64_t{1} << 53U);
    if (!analysis.jobs.empty()) options.jobs = whole_number<unsigned>(analysis.jobs, "--jobs", 1024U);
    return options;
}

RecordingInput input_of(OpenedRecording opened, const std::optional<MeasuredValue>& added_mass) {
    return {std::move(opened.recording), added_mass, std::move(opened.stretches)};
}

std::vector<RecordingInput> read_all(const std::vector<LoadedFile>& files, const ReadOptions& options) {
    std::vector<RecordingInput> inputs;
    for (const LoadedFile& file : files)
        inputs.push_back(input_of(open_with_progress(file.file, options), file.added_mass));
    return inputs;
}

}  // namespace ringwright::app
