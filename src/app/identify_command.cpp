// ringwright identify: frequency, damping and stiffness, each with its interval.

#include <fmt/format.h>

#include <CLI/App.hpp>
#include <CLI/Config.hpp>
#include <CLI/Formatter.hpp>
#include <memory>
#include <new>
#include <nlohmann/json.hpp>

#include "app/answer_options.hpp"
#include "app/article_options.hpp"
#include "app/command.hpp"
#include "app/drawing.hpp"
#include "app/filing.hpp"
#include "app/in_order.hpp"
#include "app/messages.hpp"
#include "app/no_answer.hpp"
#include "app/recording_options.hpp"
#include "app/test_arguments.hpp"
#include "ringwright/error.hpp"
#include "ringwright/result_csv.hpp"
#include "ringwright/result_json.hpp"
#include "ringwright/result_text.hpp"

namespace ringwright::app {
namespace {

struct IdentifyArguments {
    const CLI::App* command = nullptr;
    FileArguments files;
    RecordingArguments recording;
    ArticleArguments article;
    AnswerArguments answer;
    AnalysisArguments analysis;
    DrawingArguments drawing;
    bool separate = false;
    std::string sheet, ledger;
    std::optional<TestSheet> read_sheet;
};

/// The result with what the sheet says of article and test, and the options that give it again.
nlohmann::ordered_json document_of(const Identification& identification, const IdentifyArguments& arguments) {
    nlohmann::ordered_json json = to_json(identification);
    if (arguments.read_sheet)
        json["test_sheet"] = nlohmann::ordered_json::parse(sheet_facts_json(*arguments.read_sheet));
    json["options"] = given_options(*arguments.command);
    return json;
}

std::string filed_text(const Identification& identification, const IdentifyArguments& arguments) {
    return to_text(document_of(identification, arguments), -1);
}

std::string answer_text(const Identification& identification, const IdentifyArguments& arguments,
                        Format format, bool one_line, bool with_header) {
    switch (format) {
        case Format::json:
            return to_text(document_of(identification, arguments), one_line ? -1 : 2);
        case Format::csv: {
            const std::string csv = to_csv(identification);
            return with_header ? csv : csv.substr(csv.find('\n') + 1);
        }
        case Format::text:
            break;
    }
    return to_text(identification);
}

std::string drawn_text(const Identification& identification, const IdentifyArguments& arguments,
                       DrawnForm form) {
    return drawn_answer({filed_text(identification, arguments), "", sample_figures(identification), {}},
                        arguments.drawing, form);
}

int identify_together(const IdentifyArguments& arguments, const std::vector<LoadedFile>& files,
                      AnalysisOptions options) {
    const Format format = format_from(arguments.answer);
    const auto form = drawn_form_of(arguments.answer.output);
    options.identify.pictures = options.keep_samples = form.has_value();
    const Identification identification =
        identify(read_all(files, read_options(arguments.recording)), options);
    write_answer(form ? drawn_text(identification, arguments, *form)
                      : answer_text(identification, arguments, format, false, true),
                 arguments.answer.output);
    if (identification.answered() && !arguments.ledger.empty())
        file_result(arguments.ledger, filed_text(identification, arguments), arguments.read_sheet,
                    given_options(*arguments.command), recordings_of(identification));
    if (identification.answered()) return done;
    say(why_no_answer_after(identification, form ? Format::json : format, arguments.answer.output));
    return no_answer;
}

/// The answer for one FILE of several that are not pooled.
struct SeparateAnswer {
    std::string text;
    int status = done;
    Problem problem;
    std::string to_file = {};  ///< for the ledger; empty without an answer
    std::vector<LedgerRecording> recordings = {};
};

/// A FILE that cannot be read still has its line, so that lines and FILEs go together.
std::string unreadable_text(const LoadedFile& file, const Problem& problem, double confidence,
                            Format format) {
    if (format != Format::json) return {};
    return to_text(
        nlohmann::ordered_json{
            {"schema", "ringwright.identification.v1"},
            {"software", software_json()},
            {"confidence_level", confidence},
            {"recordings",
             {{{"file", file.file},
               {"error", {{"place", problem.place}, {"cause", problem.found}, {"remedy", problem.remedy}}},
               {"findings", nlohmann::ordered_json::array()},
               {"events", nlohmann::ordered_json::array()}}}},
            {"result", {{"event_count", 0}, {"quantities", nlohmann::ordered_json::object()}}}},
        -1);
}

SeparateAnswer identify_one(const IdentifyArguments& arguments, const LoadedFile& file,
                            const ReadOptions& read, const AnalysisOptions& options, Format format,
                            bool with_header) {
    try {
        std::vector<RecordingInput> input;
        input.push_back({read_recording(file.file, read), file.added_mass});
        const Identification identification = identify(std::move(input), options);
        SeparateAnswer answer{answer_text(identification, arguments, format, true, with_header), done, {}};
        if (!identification.answered()) {
            answer.status = no_answer,
            answer.problem = why_no_answer_after(identification, format, arguments.answer.output);
        } else if (!arguments.ledger.empty()) {
            answer.to_file = filed_text(identification, arguments);
            answer.recordings = recordings_of(identification);
        }
        return answer;
    } catch (const InputError& error) {
        return {unreadable_text(file, error.problem(), options.identify.confidence_level, format),
                unusable_input, error.problem()};
    } catch (const UsageError& error) {
        return {"", wrong_usage, error.problem()};
    } catch (const std::bad_alloc&) {
        const Problem problem{file.file, "", "the machine has not enough memory for this",
                              "Use fewer --jobs"};
        return {unreadable_text(file, problem, options.identify.confidence_level, format), unusable_input,
                problem};
    }
}

/// An unreadable FILE (3) weighs more than one without an answer (4); a usage error (2) most.
int graver(int first, int second) {
    const auto weight = [](int status) { return status == done ? 0 : 10 - status; };
    return weight(first) >= weight(second) ? first : second;
}

int identify_separately(const IdentifyArguments& arguments, const std::vector<LoadedFile>& files,
                        AnalysisOptions options) {
    const Format format = format_from(arguments.answer);
    const ReadOptions read = read_options(arguments.recording);
    const unsigned jobs = options.jobs;
    options.jobs = 1;  // The threads go to the files.
    int status = done;
    std::string collected;
    const bool to_file = !arguments.answer.output.empty();
    in_order<SeparateAnswer>(
        files.size(), jobs,
        [&](std::size_t i) { return identify_one(arguments, files[i], read, options, format, i == 0); },
        [&](std::size_t i, const SeparateAnswer& answer) {
            const std::string text =
                (format == Format::text && i > 0 && !answer.text.empty() ? "\n" : "") + answer.text;
            if (to_file)
                collected += text;
            else
                write_answer(text, "");
            if (!answer.to_file.empty())
                file_result(arguments.ledger, answer.to_file, arguments.read_sheet,
                            given_options(*arguments.command), answer.recordings);
            if (answer.status != done) say(answer.problem);
            status = graver(status, answer.status);
        });
    if (to_file) write_answer(collected, arguments.answer.output);
    return status;
}

/// The FILEs of the command line, else those of the sheet.
std::vector<LoadedFile> all_files(const IdentifyArguments& arguments) {
    std::vector<LoadedFile> files = files_from(*arguments.command, arguments.files);
    if (files.empty() && arguments.read_sheet) files = files_from(*arguments.read_sheet);
    if (files.empty())
        throw UsageError(
            {"identify", "", "FILE is required", "Name a recording, or a --sheet that names them"});
    return files;
}

int run_identify(IdentifyArguments arguments) {
    const bool drawn = require_drawable(arguments.answer.output, arguments.drawing);
    if (drawn && arguments.separate)
        throw UsageError({"--separate", "", "a report or figure is of one result",
                          "Leave --separate out, or give one FILE at a time"});
    if (!arguments.sheet.empty()) {
        arguments.read_sheet = read_test_sheet(arguments.sheet);
        fill_from_sheet(*arguments.read_sheet, arguments.recording, arguments.article);
    }
    const std::vector<LoadedFile> files = all_files(arguments);
    const AnalysisOptions options =
        analysis_options(arguments.recording, arguments.article, arguments.answer, arguments.analysis);
    refuse_overwriting(arguments.answer.output, arguments.files.files);
    return arguments.separate ? identify_separately(arguments, files, options)
                              : identify_together(arguments, files, options);
}

}  // namespace

void add_identify_command(CLI::App& app, Context& context) {
    CLI::App* command = app.add_subcommand(
        "identify", "Natural frequency, damping ratio and stiffness from recordings of a free decay");
    auto arguments = std::make_shared<IdentifyArguments>();
    arguments->command = command;
    add_file_arguments(*command, arguments->files);
    arguments->files.file_option->required(false);
    add_recording_options(*command, arguments->recording);
    add_article_options(*command, arguments->article);
    add_answer_options(*command, arguments->answer);
    add_analysis_options(*command, arguments->analysis);
    add_drawing_options(*command, arguments->drawing, identification_figures);
    command
        ->add_flag("--separate", arguments->separate,
                   "One result for each FILE, in their order; JSON: one document a line")
        ->group("About the answer");
    command
        ->add_option("--sheet", arguments->sheet,
                     "Test sheet with article, recording and recordings; options win over it")
        ->type_name("SHEET.toml")
        ->group("About the article");
    command->add_option("--ledger", arguments->ledger, "File the result in this ledger")
        ->type_name("FILE")
        ->group("About the answer");
    command->footer(
        "Several FILEs are repeats on one article and are pooled, unless --separate is given.\n"
        "Example: ringwright identify pluck.csv --mass \"3.20(1) kg\"\n"
        "Example: ringwright identify bare.csv --added-mass \"0 kg\" loaded.csv --added-mass \"1.000(1) "
        "kg\"\n"
        "With --separate the exit status is that of the gravest FILE: 3 before 4 before 0.");
    command->callback(
        [arguments, &context] { context.run = [arguments] { return run_identify(*arguments); }; });
}

}  // namespace ringwright::app
