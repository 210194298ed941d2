// ringwright identify: frequency, damping and stiffness, each with its interval.

#include <fmt/format.h>

#include <CLI/App.hpp>
#include <CLI/Config.hpp>
#include <CLI/Formatter.hpp>
#include <memory>

#include "app/command.hpp"
#include "app/drawing.hpp"
#include "app/filing.hpp"
#include "app/identify_answers.hpp"
#include "app/identify_batch.hpp"
#include "app/messages.hpp"
#include "app/no_answer.hpp"
#include "app/test_arguments.hpp"
#include "ringwright/error.hpp"

namespace ringwright::app {
namespace {

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
    write_answer(
        form ? drawn_text(identification, arguments, *form) : answer_text(identification, arguments, format),
        arguments.answer.output);
    if (identification.answered() && !arguments.ledger.empty())
        file_result(arguments.ledger, filed_text(identification, arguments), arguments.read_sheet,
                    given_options(*arguments.command), recordings_of(identification));
    if (identification.answered()) return done;
    say(why_no_answer_after(identification, form ? Format::json : format, arguments.answer.output));
    return no_answer;
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
    check_batch_options(arguments);
    if (!arguments.sheet.empty()) {
        arguments.read_sheet = read_test_sheet(arguments.sheet);
        fill_from_sheet(*arguments.read_sheet, arguments.recording, arguments.article);
    }
    const std::vector<LoadedFile> files = all_files(arguments);
    const AnalysisOptions options =
        analysis_options(arguments.recording, arguments.article, arguments.answer, arguments.analysis);
    if (arguments.separate) return identify_separately(arguments, files, options);
    refuse_overwriting(arguments.answer.output, arguments.files.files);
    return identify_together(arguments, files, options);
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
        ->add_flag(
            "--separate", arguments->separate,
            "One result for each FILE, in their order; JSON: one document a line. A folder stands for the "
            "recordings in it")
        ->group("About the answer");
    command
        ->add_option(
            "--resume", arguments->resume,
            "With --separate: keep each finished answer as a line of JSON in this file, and go on behind "
            "those that are there")
        ->type_name("FILE")
        ->group("About the answer");
    command
        ->add_option("--shard", arguments->shard, "With --separate: only part I of N of the FILEs, e.g. 3/8")
        ->type_name("I/N")
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
        "Recordings of more than 12 million samples are read in stretches (docs/formats.md).\n"
        "Example: ringwright identify pluck.csv --mass \"3.20(1) kg\"\n"
        "Example: ringwright identify bare.csv --added-mass \"0 kg\" loaded.csv --added-mass \"1.000(1) "
        "kg\"\n"
        "Example: ringwright identify --separate archive/ --resume archive.jsonl -o answers.jsonl\n"
        "With --separate the exit status is that of the gravest FILE: 3 before 4 before 0.");
    command->callback(
        [arguments, &context] { context.run = [arguments] { return run_identify(*arguments); }; });
}

}  // namespace ringwright::app
