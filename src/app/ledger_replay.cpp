// ringwright ledger replay: runs an entry again on its recordings and says whether the figures come out the
// same.

#include <fmt/format.h>

#include <CLI/App.hpp>
#include <CLI/Config.hpp>
#include <CLI/Formatter.hpp>
#include <algorithm>
#include <filesystem>
#include <memory>
#include <nlohmann/json.hpp>

#include "app/filing.hpp"
#include "app/ledger_options.hpp"
#include "app/messages.hpp"
#include "app/same_figures.hpp"
#include "app/test_arguments.hpp"
#include "ringwright/error.hpp"
#include "ringwright/result_json.hpp"
#include "ringwright/version.hpp"

namespace ringwright::app {
namespace {

namespace fs = std::filesystem;

struct ReplayArguments {
    std::int64_t number = 0;
    std::vector<std::string> folders;
    AnswerArguments answer;
};

bool is_recording(const fs::path& path, const LedgerRecording& wanted) {
    std::error_code error;
    if (!fs::is_regular_file(path, error)) return false;
    if (wanted.bytes && fs::file_size(path, error) != *wanted.bytes) return false;
    return sha256_of_file(path.string()) == wanted.sha256;
}

/// The path it had, else a file in the folders that has its hash.
std::string find_recording(const LedgerRecording& wanted, const std::vector<std::string>& folders) {
    if (is_recording(wanted.file, wanted)) return wanted.file;
    for (const std::string& folder : folders) {
        std::error_code error;
        fs::recursive_directory_iterator walk(folder, fs::directory_options::skip_permission_denied, error);
        if (error)
            throw InputError({folder, "", "this folder cannot be read", "Name a folder with the recordings"});
        for (const fs::directory_entry& file : walk)
            if (is_recording(file.path(), wanted)) return file.path().string();
    }
    throw InputError({wanted.file, "", fmt::format("no file with the hash {} was found", wanted.sha256),
                      "Name the folders to search: ringwright ledger replay N FOLDER…"});
}

/// A result that was added later came without its options: what it says of article and confidence stands for
/// them.
void fill_from_result(const LedgerEntry& entry, TestArguments& arguments) {
    if (!entry.arguments.empty()) return;
    const auto result = nlohmann::ordered_json::parse(entry.result_json, nullptr, false);
    if (!result.is_object()) return;
    const std::pair<const char*, std::string*> stated[] = {
        {"/article/mass/as_written", &arguments.article.mass},
        {"/article/inertia/as_written", &arguments.article.inertia},
        {"/article/spring_mass/as_written", &arguments.article.spring_mass},
        {"/article/gravity/as_written", &arguments.article.gravity}};
    for (const auto& [place, text] : stated) {
        const nlohmann::ordered_json::json_pointer pointer(place);
        if (result.contains(pointer) && result[pointer].is_string())
            *text = result[pointer].get<std::string>();
    }
    if (result.contains("confidence_level") && result["confidence_level"].is_number())
        arguments.answer.confidence = fmt::format("{}", result["confidence_level"].get<double>());
}

/// The analysis as it was asked for: its options, its sheet, its recordings.
PreparedTest prepare_replay(const LedgerEntry& entry, const std::vector<std::string>& folders) {
    CLI::App parser;
    TestArguments arguments;
    add_test_options(parser, arguments);
    std::string unused;
    parser.add_option("--rule", unused);
    std::vector<std::string> given(entry.arguments.rbegin(), entry.arguments.rend());
    try {
        parser.parse(given);
    } catch (const CLI::ParseError& error) {
        throw InputError({"", fmt::format("entry {}", entry.summary.number),
                          fmt::format("its options cannot be used here ({})", without_period(error.what())),
                          "Use the version that filed it"});
    }
    fill_from_result(entry, arguments);
    if (!entry.sheet_text.empty())
        fill_from_sheet(read_test_sheet_from_memory(entry.sheet_text, entry.sheet_name), arguments.recording,
                        arguments.article);
    PreparedTest test;
    for (const LedgerRecording& recording : entry.recordings) {
        std::optional<MeasuredValue> added;
        if (!recording.added_mass.empty())
            added = parse_measured_value(recording.added_mass, "added mass", Dimension::mass);
        test.files.push_back({find_recording(recording, folders), added});
    }
    test.read = read_options(arguments.recording);
    if (!entry.recordings.empty() && !entry.recordings.front().channel.empty() && !test.read.channel)
        test.read.channel = entry.recordings.front().channel;
    test.options =
        analysis_options(arguments.recording, arguments.article, arguments.answer, arguments.analysis);
    return test;
}

struct ReplayedFigure {
    LedgerFigure filed;
    std::optional<Estimate> replayed;
    Match match = Match::different;
};

std::vector<ReplayedFigure> match_figures(const LedgerEntry& entry, const Quantities& quantities) {
    std::vector<ReplayedFigure> figures;
    for (const LedgerFigure& filed : entry.figures) {
        ReplayedFigure figure{filed, std::nullopt, Match::different};
        if (const auto found = quantities.find(filed.quantity); found != quantities.end()) {
            figure.replayed = found->second;
            figure.match = std::max(match_of(filed.value, found->second.value),
                                    match_of(filed.standard_uncertainty, found->second.standard_uncertainty));
        }
        figures.push_back(figure);
    }
    return figures;
}

Match worst_of(const std::vector<ReplayedFigure>& figures) {
    Match worst = Match::exact;
    for (const ReplayedFigure& figure : figures) worst = std::max(worst, figure.match);
    return worst;
}

std::string_view spoken(Match match) {
    switch (match) {
        case Match::exact:
            return "the same to the last digit";
        case Match::but_for_rounding:
            return "the same but for rounding";
        case Match::different:
            return "different";
    }
    return "";
}

std::string replay_text(const LedgerEntry& entry, const std::vector<ReplayedFigure>& figures) {
    std::string text =
        fmt::format("Entry {}, filed {} by version {}, run again by version {}: {}\n", entry.summary.number,
                    entry.summary.utc, entry.summary.software_version, version(), spoken(worst_of(figures)));
    for (const ReplayedFigure& figure : figures)
        text += fmt::format("  {}: filed {:.9g} (u {:.3g}), now {}: {}\n", name_of(figure.filed.quantity),
                            figure.filed.value, figure.filed.standard_uncertainty,
                            figure.replayed ? fmt::format("{:.9g} (u {:.3g})", figure.replayed->value,
                                                          figure.replayed->standard_uncertainty)
                                            : std::string("absent"),
                            spoken(figure.match));
    return text;
}

std::string replay_json(const LedgerEntry& entry, const std::vector<ReplayedFigure>& figures) {
    nlohmann::ordered_json json{{"schema", "ringwright.replay.v1"},
                                {"entry", entry.summary.number},
                                {"filed_by_version", entry.summary.software_version},
                                {"version", std::string(version())},
                                {"same", worst_of(figures) != Match::different},
                                {"figures", nlohmann::ordered_json::array()}};
    for (const ReplayedFigure& figure : figures) {
        nlohmann::ordered_json line{{"quantity", key_of(figure.filed.quantity)},
                                    {"filed", figure.filed.value},
                                    {"same", figure.match != Match::different}};
        if (figure.replayed) line["replayed"] = figure.replayed->value;
        json["figures"].push_back(std::move(line));
    }
    return to_text(json);
}

int run_replay(const std::string& path, const ReplayArguments& arguments) {
    const Format format = format_from(arguments.answer);
    const LedgerEntry entry = Ledger::open_to_read(path).get(arguments.number);
    if (entry.recordings.empty())
        throw InputError({path, fmt::format("entry {}", arguments.number), "it names no recordings",
                          "Only a result of identify or verify can be run again"});
    const auto figures =
        match_figures(entry, run(prepare_replay(entry, arguments.folders)).result.quantities);
    write_answer(format == Format::text ? replay_text(entry, figures) : replay_json(entry, figures),
                 arguments.answer.output);
    return worst_of(figures) == Match::different ? limit_not_met : done;
}

}  // namespace

void add_ledger_replay_command(CLI::App& ledger, Context& context, const LedgerLocation& location) {
    CLI::App* part = ledger.add_subcommand(
        "replay", "Run an entry again on its recordings; exit status 1 when the figures come out different");
    const auto arguments = std::make_shared<ReplayArguments>();
    part->add_option("ENTRY", arguments->number, "Its number")->type_name("N")->required();
    part->add_option("FOLDER", arguments->folders, "Folders to search for the recordings, by hash")
        ->type_name("FOLDER");
    add_answer_options(*part, arguments->answer);
    part->callback([arguments, &context, &location] {
        context.run = [arguments, path = ledger_path_from(location.option)] {
            return run_replay(path, *arguments);
        };
    });
}

}  // namespace ringwright::app
