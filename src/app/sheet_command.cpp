// ringwright sheet: writes a test sheet to start from, or checks one.

#include <fmt/format.h>

#include <CLI/App.hpp>
#include <CLI/Config.hpp>
#include <CLI/Formatter.hpp>
#include <filesystem>
#include <memory>

#include "app/command.hpp"
#include "app/filing.hpp"
#include "app/messages.hpp"
#include "ringwright/error.hpp"
#include "ringwright/test_sheet.hpp"

namespace ringwright::app {
namespace {

struct SheetArguments {
    std::string sheet, output;
    bool make_template = false;
};

/// A recording that is named but not there is said before anybody drives to the bench.
void require_recordings(const TestSheet& sheet) {
    for (const SheetRecording& recording : sheet.recordings) {
        std::error_code ignored;
        if (!std::filesystem::is_regular_file(recording.path, ignored))
            throw InputError({sheet.file, fmt::format("line {}, key recordings.file", recording.line),
                              fmt::format("there is no recording {}", recording.path),
                              "Correct the name, which is relative to the folder of the sheet"});
    }
}

std::string check_text(const TestSheet& sheet) {
    std::string text = fmt::format("{}: can be used. {} limit{}, {}", sheet.file, sheet.limits.size(),
                                   sheet.limits.size() == 1 ? "" : "s", to_text(sheet.decision.rule));
    if (!sheet.recordings.empty())
        text +=
            fmt::format(", {} recording{}", sheet.recordings.size(), sheet.recordings.size() == 1 ? "" : "s");
    text += "\n";
    for (const SheetLimit& limit : sheet.limits)
        text += fmt::format("  {}: {}\n", name_of(limit.limit.quantity), limit.text);
    for (const Finding& finding : sheet_findings(sheet, today()))
        text += fmt::format("  {}: {}\n", to_text(finding.severity), finding.message);
    return text;
}

int run_sheet(const SheetArguments& arguments) {
    if (arguments.make_template == !arguments.sheet.empty())
        throw UsageError({"sheet", "", "give either --template or a SHEET.toml to check",
                          "Example: ringwright sheet --template -o sheet.toml"});
    if (arguments.make_template) {
        write_answer(test_sheet_template(), arguments.output);
        return done;
    }
    const TestSheet sheet = read_test_sheet(arguments.sheet);
    require_recordings(sheet);
    refuse_overwriting(arguments.output, {arguments.sheet});
    write_answer(check_text(sheet), arguments.output);
    return done;
}

}  // namespace

void add_sheet_command(CLI::App& app, Context& context) {
    CLI::App* command = app.add_subcommand("sheet", "Write a test sheet to start from, or check one");
    auto arguments = std::make_shared<SheetArguments>();
    command->add_option("SHEET", arguments->sheet, "Test sheet to check")->type_name("SHEET.toml");
    command->add_flag("--template", arguments->make_template, "Write a sheet with every key explained");
    command->add_option("-o,--output", arguments->output, "Write to this file")->type_name("FILE");
    command->footer(
        "Example: ringwright sheet --template -o sheet.toml\nExample: ringwright sheet sheet.toml");
    command->callback([arguments, &context] { context.run = [arguments] { return run_sheet(*arguments); }; });
}

}  // namespace ringwright::app
