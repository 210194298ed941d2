// ringwright inspect: what is in a recording.

#include <sys/ioctl.h>
#include <unistd.h>

#include <CLI/App.hpp>
#include <CLI/Config.hpp>
#include <CLI/Formatter.hpp>
#include <memory>
#include <nlohmann/json.hpp>

#include "app/answer_options.hpp"
#include "app/command.hpp"
#include "app/drawing.hpp"
#include "app/messages.hpp"
#include "app/recording_options.hpp"
#include "app/spooled_input.hpp"
#include "ringwright/error.hpp"
#include "ringwright/inspection.hpp"
#include "ringwright/result_json.hpp"

namespace ringwright::app {
namespace {

struct InspectArguments {
    std::vector<std::string> files;
    RecordingArguments recording;
    std::string format = "text", output;
};

/// Columns of the terminal; 100 where the answer does not go to one.
std::size_t terminal_width() {
    winsize size{};
    if (::ioctl(STDOUT_FILENO, TIOCGWINSZ, &size) != 0 || size.ws_col == 0) return 100;
    return size.ws_col;
}

Inspection inspect(const std::string& path, const ReadOptions& read, const EventOptions& event) {
    const SpooledInput input(path);
    Inspection inspection;
    inspection.file = summarise_file(input.path(), read);
    inspection.file.file = path;
    try {
        OpenedRecording opened = open_with_progress(input.path(), read);
        inspection.recording = std::move(opened.recording);
        inspection.recording->origin.file = path;
        inspection.stretches = std::move(opened.stretches);
        inspection.events = inspection.stretches ? find_events(*inspection.stretches, event)
                                                 : find_events(*inspection.recording, event);
    } catch (const InputError& error) {
        inspection.problem = error.problem();
        inspection.problem->file = path == "-" ? "standard input" : path;
    }
    return inspection;
}

std::string inspection_text(const Inspection& inspection, Format format, bool only_one) {
    switch (format) {
        case Format::json:
            return to_text(to_json(inspection), only_one ? 2 : -1);
        case Format::csv:
            return to_csv(inspection);
        case Format::text:
            break;
    }
    return to_text(inspection, terminal_width());
}

int run_inspect(const InspectArguments& arguments) {
    const Format format = format_from(AnswerArguments{"0.95", arguments.format, arguments.output});
    const ReadOptions read = read_options(arguments.recording);
    EventOptions event = event_options(arguments.recording);
    event.progress = search_progress();
    require_known_ending(arguments.output, false);
    refuse_overwriting(arguments.output, arguments.files);
    std::string text;
    int status = done;
    for (const std::string& file : arguments.files) {
        const Inspection inspection = inspect(file, read, event);
        std::string part = inspection_text(inspection, format, arguments.files.size() == 1);
        if (format == Format::csv && !text.empty()) part.erase(0, part.find('\n') + 1);
        if (format == Format::text && !text.empty()) text += "\n";
        text += part;
        if (!inspection.problem) continue;
        say(*inspection.problem);
        status = unusable_input;
    }
    write_answer(text, arguments.output);
    return status;
}

}  // namespace

void add_inspect_command(CLI::App& app, Context& context) {
    CLI::App* command = app.add_subcommand(
        "inspect", "What is in a recording: channels, rate, health, events, and a drawing");
    auto arguments = std::make_shared<InspectArguments>();
    command->add_option("FILE", arguments->files, "Recordings, CSV or sound files; - is standard input")
        ->required()
        ->type_name("");
    add_recording_options(*command, arguments->recording);
    command->add_option("--format", arguments->format, "Form of the answer")
        ->type_name("text|json|csv")
        ->capture_default_str();
    command->add_option("-o,--output", arguments->output, "Write the answer to this file")->type_name("FILE");
    command->footer(
        "Recordings of more than 12 million samples are read in stretches (docs/formats.md).\n"
        "Example: ringwright inspect pluck.csv --channel laser");
    command->callback(
        [arguments, &context] { context.run = [arguments] { return run_inspect(*arguments); }; });
}

}  // namespace ringwright::app
