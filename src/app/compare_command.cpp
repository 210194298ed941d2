// ringwright compare: did service change the article, and by how much.

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
#include "ringwright/result_json.hpp"
#include "ringwright/result_text.hpp"
#include "ringwright/verdict_report.hpp"

namespace ringwright::app {
namespace {

struct CompareArguments {
    const CLI::App* command = nullptr;
    CLI::Option *before_option = nullptr, *after_option = nullptr, *added_mass_option = nullptr;
    std::vector<std::string> before, after, added_masses, within;
    RecordingArguments recording;
    ArticleArguments article;
    AnswerArguments answer;
    AnalysisArguments analysis;
    DrawingArguments drawing;
    std::string sheet;
    std::optional<TestSheet> read_sheet;
};

/// "5 %" or "damping_ratio=5 %" or "natural_frequency=0.1": a number without % is in SI units.
void take_margin(const std::string& text, ComparisonOptions& options) {
    const auto equals = text.find('=');
    const std::string size = equals == std::string::npos ? text : text.substr(equals + 1);
    const bool relative = size.find('%') != std::string::npos;
    EquivalenceMargin margin{0.0, relative};
    margin.size = relative ? parse_measured_value(size, "--within", Dimension::none).value
                           : parse_number(size, "--within");
    if (!(margin.size > 0.0))
        throw UsageError(
            {"--within", "", fmt::format("{} is not above zero", size), "Example: --within \"5 %\""});
    if (equals == std::string::npos) {
        if (!relative)
            throw UsageError({"--within", "", fmt::format("{} names no quantity", text),
                              "Example: --within \"5 %\" or --within natural_frequency=0.1"});
        options.margin = margin;
        return;
    }
    const auto quantity = quantity_from_key(text.substr(0, equals));
    if (!quantity)
        throw UsageError({"--within", "",
                          fmt::format("\"{}\" is no quantity that is known", text.substr(0, equals)),
                          "Example: --within \"damping_ratio=5 %\""});
    options.margins[*quantity] = margin;
}

Identification identify_side(const CompareArguments& arguments, const std::vector<LoadedFile>& files) {
    RecordingArguments recording = arguments.recording;
    ArticleArguments article = arguments.article;
    if (arguments.read_sheet) fill_from_sheet(*arguments.read_sheet, recording, article);
    PreparedTest test;
    test.files = files;
    test.read = read_options(recording);
    test.options = analysis_options(recording, article, arguments.answer, arguments.analysis);
    return run(test);
}

nlohmann::ordered_json side_json(const Identification& identification) {
    nlohmann::ordered_json recordings = nlohmann::ordered_json::array();
    for (const LedgerRecording& recording : recordings_of(identification)) {
        nlohmann::ordered_json json{{"file", recording.file}, {"sha256", recording.sha256}};
        if (recording.bytes) json["bytes"] = *recording.bytes;
        json["channel"] = recording.channel;
        if (!recording.added_mass.empty()) json["added_mass"] = recording.added_mass;
        recordings.push_back(std::move(json));
    }
    return {{"recordings", recordings},
            {"method", identification.result.method},
            {"event_count", identification.result.event_count}};
}

nlohmann::ordered_json document_of(const CompareArguments& arguments, const Comparison& comparison,
                                   const Identification& before, const Identification& after) {
    nlohmann::ordered_json json{{"schema", "ringwright.comparison.v1"},
                                {"software", software_json()},
                                {"confidence_level", comparison.options.confidence_level},
                                {"before", side_json(before)},
                                {"after", side_json(after)},
                                {"quantities", to_json(comparison, before.result.torsional)},
                                {"findings", to_json(comparison.findings)}};
    if (arguments.read_sheet)
        json["test_sheet"] = nlohmann::ordered_json::parse(sheet_facts_json(*arguments.read_sheet));
    json["options"] = given_options(*arguments.command);
    return json;
}

void note_single_releases(const PooledResult& result, const char* side, Findings& findings) {
    if (result.event_count > 1) return;
    findings.push_back(
        {"one_release", Severity::caution,
         fmt::format("There is one release {} service, so its repeatability is not known and a change "
                     "may be called too easily. Record three or more.",
                     side)});
}

Comparison compare_sides(const CompareArguments& arguments, const Identification& before,
                         const Identification& after) {
    ComparisonOptions options;
    options.confidence_level = confidence_from(arguments.answer);
    for (const std::string& text : arguments.within) take_margin(text, options);
    options.common = common_contributions(before.result, after.result);
    Comparison comparison = compare(before.result.quantities, after.result.quantities, options);
    note_single_releases(before.result, "before", comparison.findings);
    note_single_releases(after.result, "after", comparison.findings);
    if (before.result.torsional != after.result.torsional)
        throw InputError({"", "", "one side is of linear motion, the other of torsion",
                          "Compare recordings of one kind of test"});
    return comparison;
}

std::string sides_text(const Identification& before, const Identification& after) {
    return fmt::format("Before\n{}\nAfter\n{}\n", result_lines(before), result_lines(after));
}

std::string answer_text(const CompareArguments& arguments, const Comparison& comparison,
                        const Identification& before, const Identification& after) {
    const Format format = format_from(arguments.answer);
    const auto document = [&] { return document_of(arguments, comparison, before, after); };
    if (const auto form = drawn_form_of(arguments.answer.output))
        return drawn_answer({to_text(document(), -1), "", {}, {}}, arguments.drawing, *form);
    if (format == Format::json) return to_text(document());
    if (format == Format::csv) return to_csv(comparison, before.result.torsional);
    return sides_text(before, after) + to_text(comparison, before.result.torsional);
}

int run_compare(CompareArguments arguments) {
    (void)format_from(arguments.answer);
    (void)require_drawable(arguments.answer.output, arguments.drawing);
    ComparisonOptions checked;
    for (const std::string& text : arguments.within) take_margin(text, checked);
    std::vector<std::string> inputs = arguments.before;
    inputs.insert(inputs.end(), arguments.after.begin(), arguments.after.end());
    if (!arguments.sheet.empty()) {
        inputs.push_back(arguments.sheet);
        arguments.read_sheet = read_test_sheet(arguments.sheet);
    }
    refuse_overwriting(arguments.answer.output, inputs);
    std::vector<FileSide> sides{{arguments.before_option, arguments.before},
                                {arguments.after_option, arguments.after}};
    load_sides(*arguments.command, arguments.added_mass_option, arguments.added_masses, sides);
    const Identification before = identify_side(arguments, sides[0].loaded);
    const Identification after = identify_side(arguments, sides[1].loaded);
    for (const Identification* side : {&before, &after})
        if (!side->answered()) {
            say(why_no_answer(*side));
            return no_answer;
        }
    const Comparison comparison = compare_sides(arguments, before, after);
    write_answer(answer_text(arguments, comparison, before, after), arguments.answer.output);
    return done;
}

}  // namespace

void add_compare_command(CLI::App& app, Context& context) {
    CLI::App* command = app.add_subcommand("compare", "Did service change the article, and by how much");
    auto arguments = std::make_shared<CompareArguments>();
    arguments->command = command;
    arguments->before_option = command->add_option("--before", arguments->before, "Recordings before, pooled")
                                   ->type_name("FILE…")
                                   ->required();
    arguments->after_option = command->add_option("--after", arguments->after, "Recordings after, pooled")
                                  ->type_name("FILE…")
                                  ->required();
    arguments->added_mass_option = add_added_mass_option(*command, arguments->added_masses);
    command
        ->add_option("--within", arguments->within,
                     "Also ask whether they are the same within \"5 %\", or of one quantity: "
                     "\"damping_ratio=5 %\", \"natural_frequency=0.1\" (SI unit)")
        ->type_name("MARGIN")
        ->allow_extra_args(false);
    command->add_option("--sheet", arguments->sheet, "Test sheet with article and recording")
        ->type_name("SHEET.toml");
    add_recording_options(*command, arguments->recording);
    add_article_options(*command, arguments->article);
    add_answer_options(*command, arguments->answer);
    add_analysis_options(*command, arguments->analysis);
    add_drawing_options(*command, arguments->drawing, "comparison");
    command->footer(
        "A quantity that did not change is called changed in one minus the confidence level of comparisons.\n"
        "Example: ringwright compare --before old-1.csv old-2.csv --after new-1.csv new-2.csv --within \"5 "
        "%\"\n"
        "With added masses: --before a.csv --added-mass \"0 kg\" --before b.csv --added-mass \"1 kg\" "
        "--after …");
    command->callback(
        [arguments, &context] { context.run = [arguments] { return run_compare(*arguments); }; });
}

}  // namespace ringwright::app
