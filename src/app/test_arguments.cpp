#include "app/test_arguments.hpp"

#include <fmt/format.h>

#include <CLI/App.hpp>
#include <CLI/Config.hpp>
#include <CLI/Formatter.hpp>
#include <nlohmann/json.hpp>

#include "ringwright/error.hpp"

namespace ringwright::app {
namespace {

void fill(std::string& argument, const std::optional<std::string>& text) {
    if (argument.empty() && text) argument = *text;
}

std::optional<std::string> text_of(const std::optional<MeasuredValue>& measured) {
    return measured ? std::optional(measured->text) : std::nullopt;
}

std::optional<std::string> text_of(const std::optional<double>& number) {
    return number ? std::optional(fmt::format("{}", *number)) : std::nullopt;
}

}  // namespace

void add_test_options(CLI::App& command, TestArguments& arguments) {
    arguments.command = &command;
    add_file_arguments(command, arguments.files);
    arguments.files.file_option->required(false);
    add_recording_options(command, arguments.recording);
    add_article_options(command, arguments.article);
    add_answer_options(command, arguments.answer);
    add_analysis_options(command, arguments.analysis);
}

void fill_from_sheet(const TestSheet& sheet, RecordingArguments& recording, ArticleArguments& article) {
    fill(recording.channel, sheet.channel);
    fill(recording.time_column, sheet.time_column);
    fill(recording.rate, text_of(sheet.rate_hz));
    fill(recording.quantity, sheet.quantity);
    fill(recording.unit, sheet.unit);
    fill(recording.sensitivity, sheet.sensitivity);
    fill(recording.full_scale, sheet.full_scale);
    fill(recording.test, sheet.kind);
    if (article.mass.empty() && article.inertia.empty()) {
        fill(article.mass, text_of(sheet.mass));
        fill(article.inertia, text_of(sheet.inertia));
    }
    fill(article.spring_mass, text_of(sheet.spring_mass));
    fill(article.gravity, text_of(sheet.gravity));
}

std::vector<LoadedFile> files_from(const TestSheet& sheet) {
    std::vector<LoadedFile> files;
    for (const SheetRecording& recording : sheet.recordings)
        files.push_back({recording.path, recording.added_mass});
    return files;
}

PreparedTest prepare(const TestArguments& arguments, const std::optional<TestSheet>& sheet) {
    RecordingArguments recording = arguments.recording;
    ArticleArguments article = arguments.article;
    if (sheet) fill_from_sheet(*sheet, recording, article);
    PreparedTest test;
    test.files = files_from(*arguments.command, arguments.files);
    if (test.files.empty() && sheet) test.files = files_from(*sheet);
    if (test.files.empty())
        throw UsageError({"FILE", "", "no recording is named",
                          "Name it on the command line, or in the sheet under [[recordings]]"});
    test.read = read_options(recording);
    test.options = analysis_options(recording, article, arguments.answer, arguments.analysis);
    return test;
}

Identification run(const PreparedTest& test) {
    return identify(read_all(test.files, test.read), test.options);
}

std::string sheet_facts_json(const TestSheet& sheet) {
    nlohmann::ordered_json json{{"file", sheet.file}, {"sha256", sha256_of(sheet.text)}};
    const auto put = [&](const char* key, const std::optional<std::string>& text) {
        if (text) json[key] = *text;
    };
    const auto put_date = [&](const char* key, const std::optional<Date>& date) {
        if (date) json[key] = to_text(*date);
    };
    put("article_type", sheet.article_type);
    put("serial", sheet.serial);
    put("article_note", sheet.article_note);
    put("operator", sheet.test_operator);
    put_date("date", sheet.date);
    put("test_note", sheet.test_note);
    put("sensor", sheet.sensor);
    put_date("sensor_calibrated", sheet.sensor_calibrated);
    put_date("sensor_due", sheet.sensor_due);
    return json.dump(-1, ' ', false, nlohmann::ordered_json::error_handler_t::replace);
}

}  // namespace ringwright::app
