#pragma once
// How a command joins the program: it adds a subcommand with its options to the parser and says what to run.
//
// To add a command: write src/app/NAME_command.cpp with `void add_NAME_command(CLI::App& app, Context&
// context)`, declare it here, and name it in main.cpp. Only the command that the first word names is added,
// so it must not count on another. The callback of the subcommand sets `context.run`; what it throws and
// returns becomes the exit status.

#include <functional>

namespace CLI {
class App;
}

namespace ringwright::app {

/// Exit statuses of the program (docs/formats.md).
enum ExitStatus : int {
    done = 0,
    limit_not_met = 1,
    wrong_usage = 2,
    unusable_input = 3,
    no_answer = 4,
    undecided = 5,
    unwritable_output = 6,
};

struct Context {
    std::function<int()> run;  ///< set by the command that was named; returns the exit status
};

void add_identify_command(CLI::App& app, Context& context);
void add_inspect_command(CLI::App& app, Context& context);
void add_verify_command(CLI::App& app, Context& context);
void add_compare_command(CLI::App& app, Context& context);
void add_sheet_command(CLI::App& app, Context& context);
void add_ledger_command(CLI::App& app, Context& context);
void add_report_command(CLI::App& app, Context& context);

}  // namespace ringwright::app
