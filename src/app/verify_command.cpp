// ringwright verify: identify, judged against the limits in a test sheet.

#include <fmt/format.h>

#include <CLI/App.hpp>
#include <CLI/Config.hpp>
#include <CLI/Formatter.hpp>
#include <memory>
#include <nlohmann/json.hpp>

#include "app/command.hpp"
#include "app/drawing.hpp"
#include "app/filing.hpp"
#include "app/judging.hpp"
#include "app/messages.hpp"
#include "app/no_answer.hpp"
#include "app/test_arguments.hpp"
#include "ringwright/error.hpp"
#include "ringwright/result_csv.hpp"
#include "ringwright/result_json.hpp"
#include "ringwright/result_text.hpp"
#include "ringwright/verdict_report.hpp"

namespace ringwright::app {
namespace {

struct VerifyArguments {
    TestArguments test;
    DrawingArguments drawing;
    std::string sheet, rule, ledger;
};

DecisionOptions decision_from(const TestSheet& sheet, const std::string& rule) {
    DecisionOptions options = sheet.decision;
    if (rule.empty()) return options;
    const auto named = decision_rule_from_text(rule);
    if (!named)
        throw UsageError({"--rule", "", fmt::format("\"{}\" is no decision rule", rule),
                          "Give \"simple acceptance\", \"guarded acceptance\" or \"guarded rejection\""});
    options.rule = *named;
    return options;
}

Verdict judge_result(const PooledResult& result, const TestSheet& sheet, const std::string& rule) {
    require_same_motion(sheet, result.torsional);
    Verdict verdict =
        judge(result.quantities, limits_of(sheet), decision_from(sheet, rule), uncertainty_parts(result));
    for (const Finding& finding : sheet_findings(sheet, today())) {
        const bool said = finding.code == "no_limits" || (finding.code == "rule_not_stated" && !rule.empty());
        if (!said) verdict.findings.push_back(finding);
    }
    return verdict;
}

nlohmann::ordered_json verdict_document(const Identification& identification, const Verdict& verdict,
                                        const TestSheet& sheet, const CLI::App& command) {
    nlohmann::ordered_json json = to_json(identification);
    json["test_sheet"] = nlohmann::ordered_json::parse(sheet_facts_json(sheet));
    json["verdict"] = to_json(verdict, identification.result.torsional);
    json["options"] = given_options(command);
    return json;
}

std::string answer_text(const Identification& identification, const Verdict& verdict,
                        const nlohmann::ordered_json& document, Format format) {
    if (format == Format::json) return to_text(document);
    if (format == Format::csv)
        return to_csv(verdict, identification.result.torsional) + "\r\n" + to_csv(identification);
    return fmt::format("{}\n{}", to_text(identification), to_text(verdict, identification.result.torsional));
}

/// A limit that fails outweighs one that cannot be judged, and that one a limit that is merely undecided.
int status_of(const Verdict& verdict, const std::string& sheet) {
    if (verdict.decision == Decision::conforms) return done;
    if (verdict.decision == Decision::does_not_conform) return limit_not_met;
    int status = undecided;
    for (const LimitDecision& decided : verdict.limits) {
        if (decided.estimate) continue;
        say({sheet, "", without_period(decided.reading), ""});
        status = no_answer;
    }
    return status;
}

void require_limits(const TestSheet& sheet) {
    if (!limits_of(sheet).empty()) return;
    throw InputError({sheet.file, "[limits]", "the sheet holds no limit, so there is nothing to judge",
                      "Add one, such as damping_ratio = { min = 0.2 }, or use ringwright identify"});
}

std::vector<std::string> input_names(const PreparedTest& test, const VerifyArguments& arguments) {
    std::vector<std::string> names{arguments.sheet};
    if (!arguments.ledger.empty()) names.push_back(arguments.ledger);
    for (const LoadedFile& file : test.files) names.push_back(file.file);
    return names;
}

int run_verify(const VerifyArguments& arguments) {
    const Format format = format_from(arguments.test.answer);
    const TestSheet sheet = read_test_sheet(arguments.sheet);
    require_limits(sheet);
    (void)decision_from(sheet, arguments.rule);
    const bool drawn = require_drawable(arguments.test.answer.output, arguments.drawing);
    PreparedTest test = prepare(arguments.test, sheet);
    test.options.identify.pictures = test.options.keep_samples = drawn;
    refuse_overwriting(arguments.test.answer.output, input_names(test, arguments));
    const Identification identification = run(test);
    const Verdict verdict = judge_result(identification.result, sheet, arguments.rule);
    const auto document = verdict_document(identification, verdict, sheet, *arguments.test.command);
    const std::string& output = arguments.test.answer.output;
    write_answer(drawn ? drawn_answer({to_text(document, -1), "", sample_figures(identification), {}},
                                      arguments.drawing, *drawn_form_of(output))
                       : answer_text(identification, verdict, document, format),
                 output);
    if (identification.answered() && !arguments.ledger.empty())
        file_result(arguments.ledger, to_text(document, -1), sheet, given_options(*arguments.test.command),
                    recordings_of(identification));
    if (identification.answered()) return status_of(verdict, arguments.sheet);
    say(why_no_answer_after(identification, drawn ? Format::json : format, output));
    return no_answer;
}

}  // namespace

void add_verify_command(CLI::App& app, Context& context) {
    CLI::App* command = app.add_subcommand("verify", "The same, judged against the limits in a test sheet");
    auto arguments = std::make_shared<VerifyArguments>();
    add_test_options(*command, arguments->test);
    add_drawing_options(*command, arguments->drawing, identification_figures);
    command->add_option("--sheet", arguments->sheet, "Test sheet with the limits; options win over it")
        ->type_name("SHEET.toml")
        ->required();
    command->add_option("--rule", arguments->rule, "Decision rule, in place of the sheet's")
        ->type_name("RULE");
    command->add_option("--ledger", arguments->ledger, "File the result in this ledger")->type_name("FILE");
    command->footer(
        "Exit status: 0 every limit is met, 1 a limit is not met, 4 the result lacks what a limit is set on, "
        "5 the uncertainty\nis too large to decide.\n"
        "Example: ringwright verify pluck.csv --sheet sash-0417.toml --ledger shop.ledger\n"
        "A sheet to start from: ringwright sheet --template");
    command->callback(
        [arguments, &context] { context.run = [arguments] { return run_verify(*arguments); }; });
}

}  // namespace ringwright::app
