#pragma once
// Options that the ledger's commands share.

#include <string>

#include "app/answer_options.hpp"
#include "app/command.hpp"
#include "ringwright/ledger.hpp"

namespace ringwright::app {

/// Which entries; as on the command line.
struct FilterArguments {
    std::string article_type, serial, test_operator, decision, since, until, quantity;
};
/// `with_quantity`: also --quantity, as a filter or as the quantity that is meant.
void add_filter_options(CLI::App& command, FilterArguments& arguments, const char* quantity_help);
/// Throws UsageError naming the option.
[[nodiscard]] LedgerFilter filter_from(const FilterArguments& arguments);
/// The quantity named; damping ratio when none is.
[[nodiscard]] Quantity quantity_from(const FilterArguments& arguments);

/// Where the ledger is: the text of --ledger of the command above.
struct LedgerLocation {
    std::string option;
};

void add_ledger_entry_commands(CLI::App& ledger, Context& context, const LedgerLocation& location);
void add_ledger_statistics_commands(CLI::App& ledger, Context& context, const LedgerLocation& location);
void add_ledger_replay_command(CLI::App& ledger, Context& context, const LedgerLocation& location);

}  // namespace ringwright::app
