// ringwright report: the report, or one figure, of a result that a command wrote as JSON.

#include <fmt/format.h>

#include <CLI/App.hpp>
#include <CLI/Config.hpp>
#include <CLI/Formatter.hpp>
#include <memory>
#include <nlohmann/json.hpp>

#include "app/command.hpp"
#include "app/drawing.hpp"
#include "app/messages.hpp"
#include "app/result_report.hpp"
#include "ringwright/error.hpp"
#include "ringwright/result_json.hpp"

namespace ringwright::app {
namespace {

struct ReportArguments {
    std::string result, output;
    std::vector<std::string> folders;
    DrawingArguments drawing;
};

int run_report(const ReportArguments& arguments) {
    if (!drawn_form_of(arguments.output))
        throw UsageError({"-o", "", fmt::format("\"{}\" asks for no form that is known", arguments.output),
                          "Give a name that ends in .html, .pdf, .svg or .png"});
    const auto result = read_result_json(arguments.result, "");
    refuse_overwriting(arguments.output, {arguments.result});
    draw_result({result, arguments.result, arguments.result, arguments.folders, std::nullopt},
                arguments.drawing, arguments.output);
    return done;
}

}  // namespace

void add_report_command(CLI::App& app, Context& context) {
    CLI::App* command =
        app.add_subcommand("report", "The report of a result as HTML or PDF, or one figure of it");
    auto arguments = std::make_shared<ReportArguments>();
    command
        ->add_option("RESULT", arguments->result,
                     "What identify, verify, compare, ledger chart or ledger gauge wrote as JSON")
        ->type_name("RESULT.json")
        ->required();
    command
        ->add_option("-o,--output", arguments->output,
                     "Where to write it; the ending says in which form: .html, .pdf, .svg or .png")
        ->type_name("FILE")
        ->required();
    add_drawing_options(*command, arguments->drawing,
                        std::string(identification_figures) + ", comparison, chart, gauge");
    command
        ->add_option("--recordings", arguments->folders,
                     "Folder in which the recordings are looked for as well")
        ->type_name("FOLDER");
    command->footer(
        "Figures that show samples are drawn from the recordings, which are found again by name and hash.\n"
        "Example: ringwright report result.json -o report.html\n"
        "Example: ringwright report result.json --figure decay-1 -o decay.svg");
    command->callback(
        [arguments, &context] { context.run = [arguments] { return run_report(*arguments); }; });
}

}  // namespace ringwright::app
