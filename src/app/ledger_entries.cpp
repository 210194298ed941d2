// ringwright ledger add | list | show | check | export | supersede.

#include <fmt/format.h>

#include <CLI/App.hpp>
#include <CLI/Config.hpp>
#include <CLI/Formatter.hpp>
#include <memory>
#include <nlohmann/json.hpp>

#include "app/filing.hpp"
#include "app/ledger_options.hpp"
#include "app/messages.hpp"
#include "app/result_report.hpp"
#include "app/test_arguments.hpp"
#include "ringwright/error.hpp"
#include "ringwright/ledger_report.hpp"
#include "ringwright/result_json.hpp"
#include "ringwright/safe_file.hpp"

namespace ringwright::app {
namespace {

constexpr const char* result_schema = "ringwright.identification.v1";

struct EntryArguments {
    std::string result, sheet, reason, head, format = "csv";
    std::int64_t number = 0;
    std::vector<std::string> folders;
    FilterArguments filter;
    AnswerArguments answer;
    DrawingArguments drawing;
};
using Shared = std::shared_ptr<EntryArguments>;

NewEntry entry_from(const EntryArguments& arguments) {
    NewEntry entry;
    if (!arguments.result.empty())
        entry.result_json = to_text(read_result_json(arguments.result, result_schema), -1);
    if (!arguments.sheet.empty()) {
        const TestSheet sheet = read_test_sheet(arguments.sheet);
        entry.sheet_name = sheet.file;
        entry.sheet_text = sheet.text;
    }
    entry.reason = arguments.reason;
    return entry;
}

int file_entry(const std::string& path, const NewEntry& entry, const EntryArguments& arguments) {
    const EntrySummary filed = Ledger::open_or_create(path).add(entry);
    write_answer(fmt::format("Filed as entry {} of {}\n", filed.number, path), arguments.answer.output);
    return done;
}

int run_add(const std::string& path, const EntryArguments& arguments) {
    return file_entry(path, entry_from(arguments), arguments);
}

int run_supersede(const std::string& path, const EntryArguments& arguments) {
    NewEntry entry = entry_from(arguments);
    entry.supersedes = arguments.number;
    (void)Ledger::open_to_read(path).get(arguments.number);
    return file_entry(path, entry, arguments);
}

int run_list(const std::string& path, const EntryArguments& arguments) {
    refuse_drawn(arguments.answer.output);
    const Format format = format_from(arguments.answer);
    const auto entries = Ledger::open_to_read(path).list(filter_from(arguments.filter));
    std::string text = list_text(entries);
    if (format == Format::json) text = summaries_as_json(entries) + "\n";
    if (format == Format::csv) text = summaries_as_csv(entries);
    write_answer(text, arguments.answer.output);
    return done;
}

/// The result with what the entry holds beside it, where it was filed without.
nlohmann::ordered_json whole_result(const LedgerEntry& entry, const std::optional<TestSheet>& sheet) {
    auto result = nlohmann::ordered_json::parse(entry.result_json);
    if (sheet && !result.contains("test_sheet"))
        result["test_sheet"] = nlohmann::ordered_json::parse(sheet_facts_json(*sheet));
    if (!entry.arguments.empty() && !result.contains("options")) result["options"] = entry.arguments;
    return result;
}

int draw_entry(const std::string& path, const LedgerEntry& entry, const EntryArguments& arguments) {
    const std::string name = fmt::format("entry {} of {}", arguments.number, path);
    if (entry.result_json.empty())
        throw InputError({path, fmt::format("entry {}", arguments.number),
                          "it withdraws another entry and holds no result", "Show it as text"});
    std::optional<TestSheet> sheet;
    if (!entry.sheet_text.empty()) sheet = read_test_sheet_from_memory(entry.sheet_text, entry.sheet_name);
    draw_result({whole_result(entry, sheet), name, path, arguments.folders, sheet}, arguments.drawing,
                arguments.answer.output);
    return done;
}

int run_show(const std::string& path, const EntryArguments& arguments) {
    const Format format = format_from(arguments.answer);
    const bool drawn = require_drawable(arguments.answer.output, arguments.drawing);
    refuse_overwriting(arguments.answer.output, {path});
    const LedgerEntry entry = Ledger::open_to_read(path).get(arguments.number);
    if (drawn) return draw_entry(path, entry, arguments);
    std::string text = entry_text(entry);
    if (format == Format::json) text = entry_as_json(entry) + "\n";
    if (format == Format::csv) text = figures_csv_header() + entry_as_figures_csv(entry);
    write_answer(text, arguments.answer.output);
    return done;
}

/// A head noted elsewhere shows a ledger that was rewritten as a whole.
void hold_against_head(LedgerCheck& check, const std::string& head, const Ledger& ledger) {
    if (head.empty() || !check.intact) return;
    for (const EntrySummary& entry : ledger.list())
        if (entry.hash == head) return;
    check.intact = false;
    check.fault = "No entry has the hash that was given: the ledger was rewritten.";
}

int run_check(const std::string& path, const EntryArguments& arguments) {
    refuse_drawn(arguments.answer.output);
    const Format format = format_from(arguments.answer);
    const Ledger ledger = Ledger::open_to_read(path);
    LedgerCheck check = ledger.check();
    hold_against_head(check, arguments.head, ledger);
    const std::string where = check.first_bad ? fmt::format("entry {}", *check.first_bad) : "the ledger";
    std::string text = check.intact
                           ? fmt::format("{}: {} entries, the chain holds\n  hash of the last entry {}\n",
                                         path, check.entries, check.head.empty() ? "none" : check.head)
                           : fmt::format("{}: {} does not hold. {}\n", path, where, check.fault);
    if (format != Format::text) {
        nlohmann::ordered_json json{
            {"schema", "ringwright.ledger_check.v1"}, {"intact", check.intact}, {"entries", check.entries}};
        if (!check.head.empty()) json["head"] = check.head;
        if (check.first_bad) json["first_bad"] = *check.first_bad;
        if (!check.fault.empty()) json["fault"] = check.fault;
        text = to_text(json);
    }
    write_answer(text, arguments.answer.output);
    return check.intact ? done : limit_not_met;
}

/// Entry by entry, so that a ledger of any size needs the memory of one.
void export_entries(const Ledger& ledger, const LedgerFilter& filter, bool json, const PieceTaker& take) {
    take(json ? std::string("[") : figures_csv_header());
    bool first = true;
    for (const EntrySummary& summary : ledger.list(filter)) {
        const LedgerEntry entry = ledger.get(summary.number);
        take(json ? fmt::format("{}\n{}", first ? "" : ",", entry_as_json(entry))
                  : entry_as_figures_csv(entry));
        first = false;
    }
    if (json) take("\n]\n");
}

int run_export(const std::string& path, const EntryArguments& arguments) {
    const bool json = arguments.format == "json";
    if (!json && arguments.format != "csv")
        throw UsageError({"--format", "", fmt::format("\"{}\" is no form of an export", arguments.format),
                          "Give csv or json"});
    const std::string& output = arguments.answer.output;
    refuse_drawn(output);
    refuse_overwriting(output, {path});
    const Ledger ledger = Ledger::open_to_read(path);
    const LedgerFilter filter = filter_from(arguments.filter);
    const auto write = [&](const PieceTaker& take) { export_entries(ledger, filter, json, take); };
    if (output.empty() || output == "-")
        write([](std::string_view piece) { write_answer(piece, ""); });
    else
        write_pieces_safely(output, write);
    return done;
}

using Runner = int (*)(const std::string&, const EntryArguments&);

/// A subcommand that opens the ledger when it runs.
CLI::App* add_part(CLI::App& ledger, Context& context, const LedgerLocation& location,
                   const Shared& arguments, const char* name, const char* help, Runner runner) {
    CLI::App* part = ledger.add_subcommand(name, help);
    part->callback([arguments, &context, &location, runner] {
        context.run = [arguments, path = ledger_path_from(location.option), runner] {
            return runner(path, *arguments);
        };
    });
    return part;
}

void add_filing(CLI::App& part, EntryArguments& arguments, bool needed) {
    part.add_option("RESULT", arguments.result,
                    "What identify or verify wrote with --format json; - is standard input")
        ->type_name("RESULT.json")
        ->required(needed);
    part.add_option("--sheet", arguments.sheet, "The test sheet that it goes with")->type_name("SHEET.toml");
    part.add_option("-o,--output", arguments.answer.output, "Write the answer to this file")
        ->type_name("FILE");
}

}  // namespace

void add_ledger_entry_commands(CLI::App& ledger, Context& context, const LedgerLocation& location) {
    const auto add = [&](const char* name, const char* help, Runner runner, auto options) {
        const auto arguments = std::make_shared<EntryArguments>();
        options(*add_part(ledger, context, location, arguments, name, help, runner), *arguments);
    };
    add("add", "File a result", run_add,
        [](CLI::App& part, EntryArguments& arguments) { add_filing(part, arguments, true); });
    add("list", "The entries, a line each", run_list, [](CLI::App& part, EntryArguments& arguments) {
        add_filter_options(part, arguments.filter, "That hold this quantity, e.g. stiffness");
        add_answer_options(part, arguments.answer);
    });
    add("show", "One entry", run_show, [](CLI::App& part, EntryArguments& arguments) {
        part.add_option("ENTRY", arguments.number, "Its number")->type_name("N")->required();
        add_answer_options(part, arguments.answer);
        add_drawing_options(part, arguments.drawing, identification_figures);
        part.add_option("--recordings", arguments.folders,
                        "Folder in which the recordings are looked for as well")
            ->type_name("FOLDER");
    });
    add("check", "Walk the chain; exit status 1 when an entry was altered or removed", run_check,
        [](CLI::App& part, EntryArguments& arguments) {
            part.add_option("--head", arguments.head, "A hash noted earlier that must be among the entries")
                ->type_name("HASH");
            add_answer_options(part, arguments.answer);
        });
    add("export", "Everything, one row a figure, or as JSON", run_export,
        [](CLI::App& part, EntryArguments& arguments) {
            add_filter_options(part, arguments.filter, "That hold this quantity, e.g. stiffness");
            part.add_option("--format", arguments.format, "Form of the answer")
                ->type_name("csv|json")
                ->capture_default_str();
            part.add_option("-o,--output", arguments.answer.output, "Write to this file")->type_name("FILE");
        });
    add("supersede", "Replace a mistaken entry by a later one, or withdraw it", run_supersede,
        [](CLI::App& part, EntryArguments& arguments) {
            part.add_option("ENTRY", arguments.number, "Number of the mistaken entry")
                ->type_name("N")
                ->required();
            add_filing(part, arguments, false);
            part.add_option("--reason", arguments.reason, "Why; it stays in the ledger")
                ->type_name("TEXT")
                ->required();
        });
}

}  // namespace ringwright::app
