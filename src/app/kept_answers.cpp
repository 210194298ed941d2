#include "app/kept_answers.hpp"

#include <fmt/format.h>

#include <nlohmann/json.hpp>

#include "app/command.hpp"
#include "app/filing.hpp"
#include "app/in_order.hpp"
#include "app/messages.hpp"
#include "ringwright/counting.hpp"
#include "ringwright/version.hpp"

namespace ringwright::app {
namespace {

using Json = nlohmann::ordered_json;

constexpr std::string_view line_beginning = R"({"schema":"ringwright.identification.v1")";

/// What one line turned out to be.
struct LineCheck {
    bool damaged = false;    ///< no JSON
    std::string difference;  ///< from the run that is to be continued; empty: none
    int status = done;
    [[nodiscard]] static std::size_t bytes() { return sizeof(LineCheck); }
};

Json part_of(const Json& object, const char* key) {
    const auto found = object.is_object() ? object.find(key) : object.end();
    return object.is_object() && found != object.end() ? *found : Json();
}

std::string text_of(const Json& object, const char* key) {
    const Json part = part_of(object, key);
    return part.is_string() ? part.get<std::string>() : std::string();
}

const Json& first_recording(const Json& document) {
    static const Json none;
    const auto list = document.find("recordings");
    return list != document.end() && list->is_array() && !list->empty() ? list->front() : none;
}

std::string name_difference(const Json& recording, const std::string& file) {
    Json wanted = Json::object();
    put_file_name(wanted, file);
    if (text_of(recording, "file") == text_of(wanted, "file") &&
        text_of(recording, "file_hex") == text_of(wanted, "file_hex"))
        return {};
    return fmt::format("it is about {} where this run has {}", text_of(recording, "file"), file);
}

std::string run_difference(const Json& document, const IdentifyArguments& arguments) {
    if (text_of(document, "schema") != "ringwright.identification.v1") return "it is no answer of identify";
    const std::string software = text_of(part_of(document, "software"), "version");
    if (software != version())
        return fmt::format("it was written by version {}, this is {}", software, version());
    const Json options = given_options(*arguments.command);
    if (part_of(document, "options") != options)
        return fmt::format("its options were {}, now they are {}", to_text(part_of(document, "options"), -1),
                           to_text(options, -1));
    const std::string sheet = text_of(part_of(document, "test_sheet"), "sha256");
    const std::string now = arguments.read_sheet ? sha256_of(arguments.read_sheet->text) : std::string();
    return sheet == now ? "" : "its test sheet was another";
}

std::string recording_difference(const Json& recording, const BatchFile& file) {
    if (std::string text = name_difference(recording, file.loaded.file); !text.empty()) return text;
    const std::string mass = text_of(part_of(recording, "added_mass"), "as_written");
    const bool with_error = recording.contains("error");
    if (!with_error && mass != (file.loaded.added_mass ? file.loaded.added_mass->text : ""))
        return "its added mass was another";
    // What could not be read has no hash; its line stands.
    if (with_error) return {};
    const std::string hash = sha256_of_file(file.loaded.file);
    if (hash.empty()) return fmt::format("{} cannot be read any more", file.loaded.file);
    if (hash == text_of(recording, "sha256")) return {};
    return fmt::format("{} has other content than when it was analysed", file.loaded.file);
}

/// The exit status that the answer had.
int status_of(const Json& document) {
    const Json& recording = first_recording(document);
    if (recording.contains("error")) {
        const Json status = part_of(part_of(recording, "error"), "exit_status");
        return status.is_number_integer() && status.get<int>() == wrong_usage ? wrong_usage : unusable_input;
    }
    return text_of(part_of(document, "result"), "method").empty() ? no_answer : done;
}

LineCheck check_line(const std::string& line, const BatchFile& file, const IdentifyArguments& arguments) {
    const Json document = Json::parse(line, nullptr, false);
    if (document.is_discarded()) return {true, {}, done};
    if (!document.is_object()) return {false, "it is no answer of identify", done};
    std::string difference = run_difference(document, arguments);
    if (difference.empty()) difference = recording_difference(first_recording(document), file);
    return {false, difference, status_of(document)};
}

[[noreturn]] void refuse(const ResumeFile& file, std::size_t line, const std::string& why) {
    throw UsageError(
        {"--resume", "",
         fmt::format("{}, line {}, is not of this run: {}", file.path(), line, without_period(why)),
         "Give the command that began it, or name another file to begin anew"});
}

/// A piece of a line of ours, or zero bytes in its place after a loss of power.
bool could_be_torn(std::string_view text) {
    if (text.find_first_not_of('\0') == std::string_view::npos) return true;
    const std::size_t common = std::min(text.size(), line_beginning.size());
    return text.substr(0, common) == line_beginning.substr(0, common);
}

/// The last whole line but for damaged ones at the end; refuses damage that has sound lines behind it.
std::size_t sound_lines(const ResumeFile& file, const std::vector<LineCheck>& checks) {
    std::size_t sound = checks.size();
    while (sound > 0 && checks[sound - 1].damaged) --sound;
    for (std::size_t i = 0; i < sound; ++i) {
        if (checks[i].damaged)
            refuse(file, i + 1, "it is damaged. Take out this line and all behind it to go on from there");
        if (!checks[i].difference.empty()) refuse(file, i + 1, checks[i].difference);
    }
    return sound;
}

}  // namespace

Json error_document(const std::string& file, const Problem& problem, int status,
                    const IdentifyArguments& arguments) {
    Json recording = Json::object();
    put_file_name(recording, file);
    recording["error"] = {{"place", problem.place},
                          {"cause", problem.found},
                          {"remedy", problem.remedy},
                          {"exit_status", status}};
    recording["findings"] = recording["events"] = Json::array();
    Json document{{"schema", "ringwright.identification.v1"},
                  {"software", software_json()},
                  {"confidence_level", confidence_from(arguments.answer)},
                  {"recordings", {recording}},
                  {"result", {{"event_count", 0}, {"quantities", Json::object()}}}};
    if (arguments.read_sheet)
        document["test_sheet"] =
            Json{{"file", arguments.read_sheet->file}, {"sha256", sha256_of(arguments.read_sheet->text)}};
    document["options"] = given_options(*arguments.command);
    return document;
}

std::vector<int> check_kept_answers(ResumeFile& file, const std::vector<BatchFile>& files,
                                    const IdentifyArguments& arguments, unsigned jobs) {
    if (file.size() > files.size())
        refuse(file, files.size() + 1, fmt::format("this run has only {} recordings", files.size()));
    std::vector<LineCheck> checks;
    in_order<LineCheck>(
        {0, file.size(), jobs}, [&](std::size_t i) { return check_line(file.line(i), files[i], arguments); },
        [&](std::size_t, const LineCheck& check) { checks.push_back(check); }, [] {});
    const std::size_t sound = sound_lines(file, checks);
    std::vector<int> statuses;
    for (std::size_t i = 0; i < sound; ++i) statuses.push_back(checks[i].status);
    const std::string torn = file.torn_line();
    if (sound == checks.size() && torn.empty()) return statuses;
    // The beginning of somebody else's file is not ours to cut.
    const std::string first = sound < checks.size() ? file.line(sound) : torn;
    if (sound == 0 && !could_be_torn(first)) refuse(file, 1, "it is no answer of identify");
    file.cut_from(sound);
    say({file.path(), "", "its last line was not whole and was cut; that recording is analysed again", ""});
    return statuses;
}

}  // namespace ringwright::app
