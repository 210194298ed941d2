// ringwright ledger: results that are kept, and what they say together.

#include <fmt/format.h>

#include <CLI/App.hpp>
#include <CLI/Config.hpp>
#include <CLI/Formatter.hpp>
#include <memory>

#include "app/command.hpp"
#include "app/ledger_options.hpp"
#include "ringwright/error.hpp"
#include "ringwright/test_sheet.hpp"

namespace ringwright::app {
namespace {

constexpr const char* group = "Which entries";

std::optional<std::string> if_given(const std::string& text) {
    return text.empty() ? std::nullopt : std::optional(text);
}

std::optional<std::string> date_if_given(const std::string& text, const char* option) {
    if (!text.empty() && !date_from_text(text))
        throw UsageError({option, "", fmt::format("\"{}\" is no date of the calendar", text),
                          fmt::format("Example: {} 2031-04-02", option)});
    return if_given(text);
}

std::optional<std::string> decision_if_given(const std::string& text) {
    if (!text.empty() && !decision_from_text(text))
        throw UsageError({"--decision", "", fmt::format("\"{}\" is no decision", text),
                          "Give conforms, does_not_conform or undecided"});
    return if_given(text);
}

}  // namespace

void add_filter_options(CLI::App& command, FilterArguments& arguments, const char* quantity_help) {
    const auto add = [&](const char* name, std::string& text, const char* value, const char* help) {
        command.add_option(name, text, help)->type_name(value)->group(group);
    };
    add("--type", arguments.article_type, "TEXT", "Of this article type");
    add("--serial", arguments.serial, "TEXT", "Of this serial number");
    add("--operator", arguments.test_operator, "TEXT", "By this operator");
    add("--decision", arguments.decision, "DECISION", "conforms, does_not_conform or undecided");
    add("--since", arguments.since, "DATE", "Tested on this day or later, e.g. 2031-04-02");
    add("--until", arguments.until, "DATE", "Tested on this day or earlier");
    add("--quantity", arguments.quantity, "QUANTITY", quantity_help);
}

Quantity quantity_from(const FilterArguments& arguments) {
    if (arguments.quantity.empty()) return Quantity::damping_ratio;
    if (const auto quantity = quantity_from_key(arguments.quantity)) return *quantity;
    throw UsageError({"--quantity", "",
                      fmt::format("\"{}\" is no quantity that is known", arguments.quantity),
                      "Example: --quantity damping_ratio"});
}

LedgerFilter filter_from(const FilterArguments& arguments) {
    LedgerFilter filter;
    filter.article_type = if_given(arguments.article_type);
    filter.serial = if_given(arguments.serial);
    filter.test_operator = if_given(arguments.test_operator);
    filter.decision = decision_if_given(arguments.decision);
    filter.since = date_if_given(arguments.since, "--since");
    filter.until = date_if_given(arguments.until, "--until");
    if (!arguments.quantity.empty()) filter.quantity = quantity_from(arguments);
    return filter;
}

void add_ledger_command(CLI::App& app, Context& context) {
    CLI::App* command = app.add_subcommand("ledger", "Results that are kept, and what they say together");
    auto location = std::make_shared<LedgerLocation>();
    command
        ->add_option("--ledger", location->option,
                     "The ledger; else RINGWRIGHT_LEDGER names it, else ringwright.ledger in this folder")
        ->type_name("FILE");
    command->require_subcommand(1);
    command->fallthrough();
    add_ledger_entry_commands(*command, context, *location);
    add_ledger_statistics_commands(*command, context, *location);
    add_ledger_replay_command(*command, context, *location);
    // The location lives as long as the command that reads it.
    command->callback([location] {});
    // The footer of the whole program, which every command begins with, speaks of other commands.
    const std::string inherited = command->get_footer();
    for (CLI::App* part : command->get_subcommands([](const CLI::App*) { return true; })) {
        part->fallthrough();
        if (part->get_footer() == inherited) part->footer("");
    }
    command->footer(
        "Each part explains itself: ringwright ledger add --help\nExample: ringwright ledger add "
        "result.json --ledger shop.ledger");
}

}  // namespace ringwright::app
