// The program: parses the command line, runs the command, turns exceptions into one message and an exit
// status.

#include <fmt/format.h>
#include <openssl/crypto.h>

#include <CLI/App.hpp>
#include <CLI/Config.hpp>
#include <CLI/Formatter.hpp>
#include <algorithm>
#include <array>
#include <csignal>
#include <cstdio>
#include <exception>
#include <new>
#include <string>
#include <string_view>

#include "app/command.hpp"
#include "app/large_memory.hpp"
#include "app/messages.hpp"
#include "ringwright/error.hpp"
#include "ringwright/version.hpp"

namespace {

using namespace ringwright;

int guarded(const std::function<int()>& run) {
    try {
        return run();
    } catch (const UsageError& error) {
        app::say(error.problem());
        return app::wrong_usage;
    } catch (const InputError& error) {
        app::say(error.problem());
        return app::unusable_input;
    } catch (const OutputError& error) {
        app::say(error.problem());
        return app::unwritable_output;
    } catch (const std::bad_alloc&) {
        app::say(
            {"", "", "the machine has not enough memory for this", "Cut the recording with a smaller file"});
        return app::unusable_input;
    }
}

struct Command {
    std::string_view name;
    void (*add)(CLI::App& parser, app::Context& context);
};

constexpr std::array<Command, 7> commands_in_order = {{{"inspect", app::add_inspect_command},
                                                       {"identify", app::add_identify_command},
                                                       {"verify", app::add_verify_command},
                                                       {"compare", app::add_compare_command},
                                                       {"sheet", app::add_sheet_command},
                                                       {"ledger", app::add_ledger_command},
                                                       {"report", app::add_report_command}}};

/// The command that the first word names, if it names one.
const Command* named_command(int argc, char** argv) {
    const auto* found = std::ranges::find(commands_in_order, argc > 1 ? argv[1] : "", &Command::name);
    return found == commands_in_order.end() ? nullptr : found;
}

/// All commands, or the one that is wanted alone: the options of all take longer to set up than a small file
/// to read.
void add_commands(CLI::App& parser, app::Context& context, const Command* wanted) {
    for (const Command& command : commands_in_order)
        if (wanted == nullptr || wanted == &command) command.add(parser, context);
}

void set_up(CLI::App& parser, app::Context& context, int argc, char** argv) {
    parser.set_version_flag("--version", "ringwright " + std::string(version()),
                            "Print the version and stop");
    parser.set_help_flag("-h,--help", "Print this help and stop");
    parser.name("ringwright");
    parser.require_subcommand(1);
    parser.get_formatter()->column_width(34);
    parser.footer(
        "Each command explains itself: ringwright identify --help\nExample: ringwright identify pluck.csv "
        "--mass \"12.40(5) kg\"");
    add_commands(parser, context, named_command(argc, argv));
}

/// The word that stands where the name of a command was wanted; empty where there is none.
std::string word_in_place_of_command(const CLI::App& parser, int argc, char** argv) {
    const auto commands = parser.get_subcommands();
    const CLI::App& parent = commands.empty() ? parser : *commands.front();
    if (!parent.get_subcommands().empty()) return {};
    int at = 1;
    if (!commands.empty())
        while (at < argc && argv[at] != commands.front()->get_name()) ++at;
    for (at += commands.empty() ? 0 : 1; at < argc; ++at) {
        const std::string word = argv[at];
        if (word == "--ledger") ++at;
        if (!word.empty() && word.front() != '-') return word;
    }
    return {};
}

std::string names_of_commands(const CLI::App& parent) {
    std::string names;
    for (const CLI::App* command : parent.get_subcommands([](const CLI::App*) { return true; }))
        names += (names.empty() ? "" : ", ") + command->get_name();
    return names;
}

/// Help and version go to standard output through the same path as every answer.
int answer_parser(const CLI::App& parser, const CLI::ParseError& error, int argc, char** argv) {
    if (error.get_exit_code() == 0)
        return guarded([&] {
            if (error.get_name() == "CallForVersion")
                app::write_answer(std::string(error.what()) + "\n", "");
            else
                app::write_answer(parser.help() + "\n", "");
            return static_cast<int>(app::done);
        });
    const auto commands = parser.get_subcommands();
    const std::string command = commands.empty() ? "" : commands.front()->get_name();
    const CLI::App& parent = commands.empty() ? parser : *commands.front();
    const std::string word = word_in_place_of_command(parser, argc, argv);
    if (error.get_name() == "RequiredError" && parent.get_require_subcommand_min() > 0 && !word.empty()) {
        app::say({command, "", fmt::format("\"{}\" is no command", word),
                  "Give one of " + names_of_commands(parent)});
        return app::wrong_usage;
    }
    app::say({command, "", app::without_period(error.what()),
              fmt::format("See ringwright{}{} --help", command.empty() ? "" : " ", command)});
    return app::wrong_usage;
}

/// SHA-256 is all that is asked of OpenSSL: its settings and the tables of its other algorithms and messages
/// would cost every start a millisecond.
void keep_hashing_lean() {
    OPENSSL_init_crypto(OPENSSL_INIT_NO_LOAD_CONFIG | OPENSSL_INIT_NO_ADD_ALL_CIPHERS |
                            OPENSSL_INIT_NO_ADD_ALL_DIGESTS | OPENSSL_INIT_NO_LOAD_CRYPTO_STRINGS |
                            OPENSSL_INIT_NO_ATEXIT,
                        nullptr);
}

}  // namespace

int main(int argc, char** argv) {
    app::keep_freed_memory();
    keep_hashing_lean();
    // A reader that has seen enough closes its end of the pipe; that is no failure to report.
    std::signal(SIGPIPE, SIG_IGN);
    // A file that may grow no further is a failure to report, not to die of.
    std::signal(SIGXFSZ, SIG_IGN);
    try {
        CLI::App parser{
            "Natural frequency, damping ratio and stiffness of springs and dampers from recordings of a free "
            "decay,\n"
            "each with its interval."};
        app::Context context;
        set_up(parser, context, argc, argv);
        try {
            parser.parse(argc, argv);
        } catch (const CLI::ParseError& error) {
            return answer_parser(parser, error, argc, argv);
        }
        return guarded(context.run);
    } catch (const std::exception& error) {
        app::say(
            {"", "", app::without_period(error.what()), "This is a fault of the program; please report it"});
        return app::unusable_input;
    }
}
