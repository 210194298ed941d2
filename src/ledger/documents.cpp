#include "ledger/documents.hpp"

#include <fmt/format.h>

#include <cmath>
#include <nlohmann/json.hpp>

#include "ringwright/error.hpp"

namespace ringwright {
namespace {

using nlohmann::ordered_json;
constexpr auto replace_bad_bytes = ordered_json::error_handler_t::replace;

std::string dump(const ordered_json& json, int indent = -1) {
    return json.dump(indent, ' ', false, replace_bad_bytes);
}

std::string text_of(const ordered_json& object, const char* key) {
    const auto found = object.find(key);
    return found != object.end() && found->is_string() ? found->get<std::string>() : std::string();
}

std::optional<double> number_of(const ordered_json& object, const char* key) {
    const auto found = object.find(key);
    if (found == object.end() || !found->is_number()) return std::nullopt;
    return found->get<double>();
}

LedgerRecording recording_of(const ordered_json& object) {
    LedgerRecording recording;
    recording.file = text_of(object, "file");
    recording.sha256 = text_of(object, "sha256");
    recording.channel = text_of(object, "channel");
    const auto added = object.find("added_mass");
    recording.added_mass = added != object.end() && added->is_object() ? text_of(*added, "as_written")
                                                                       : text_of(object, "added_mass");
    const auto bytes = object.find("bytes");
    if (bytes != object.end() && bytes->is_number_unsigned()) recording.bytes = bytes->get<std::uint64_t>();
    return recording;
}

std::optional<LedgerFigure> figure_of(const std::string& key, const ordered_json& object) {
    const auto quantity = quantity_from_key(key);
    if (!quantity || !object.is_object()) return std::nullopt;
    const auto value = number_of(object, "value");
    if (!value) return std::nullopt;
    LedgerFigure figure{*quantity, text_of(object, "unit"), *value, 0.0, {}, {}, {}};
    figure.standard_uncertainty = number_of(object, "standard_uncertainty").value_or(0.0);
    figure.degrees_of_freedom = number_of(object, "degrees_of_freedom");
    const auto interval = object.find("interval");
    if (interval != object.end() && interval->is_array() && interval->size() == 2) {
        if ((*interval)[0].is_number()) figure.low = (*interval)[0].get<double>();
        if ((*interval)[1].is_number()) figure.high = (*interval)[1].get<double>();
    }
    return figure;
}

ordered_json parse_result(std::string_view text, const std::string& name) {
    ordered_json json = ordered_json::parse(text, nullptr, false);
    if (json.is_discarded() || !json.is_object())
        throw InputError(
            {name, "", "this is no result in JSON", "Give what `identify --format json` wrote."});
    if (text_of(json, "schema") != "ringwright.identification.v1")
        throw InputError({name, "key schema", "this is no ringwright.identification.v1",
                          "Give what `identify` or `verify` wrote with --format json."});
    return json;
}

ordered_json as_json(const EntrySummary& entry) {
    ordered_json json{
        {"number", entry.number}, {"utc", entry.utc}, {"software_version", entry.software_version}};
    json["article_type"] = entry.article_type;
    json["serial"] = entry.serial;
    json["operator"] = entry.test_operator;
    json["test_date"] = entry.test_date;
    json["decision"] = entry.decision;
    if (entry.supersedes) json["supersedes"] = *entry.supersedes;
    if (entry.superseded_by) json["superseded_by"] = *entry.superseded_by;
    if (!entry.reason.empty()) json["reason"] = entry.reason;
    json["hash"] = entry.hash;
    json["previous_hash"] = entry.previous_hash;
    return json;
}

ordered_json as_json(const LedgerRecording& recording) {
    ordered_json json{{"file", recording.file}, {"sha256", recording.sha256}};
    if (recording.bytes) json["bytes"] = *recording.bytes;
    if (!recording.channel.empty()) json["channel"] = recording.channel;
    if (!recording.added_mass.empty()) json["added_mass"] = recording.added_mass;
    return json;
}

}  // namespace

namespace documents {

std::string arguments_as_json(const std::vector<std::string>& arguments) {
    ordered_json json = ordered_json::array();
    for (const std::string& argument : arguments) json.push_back(argument);
    return dump(json);
}

std::vector<std::string> arguments_from_json(std::string_view text) {
    const ordered_json json = ordered_json::parse(text, nullptr, false);
    std::vector<std::string> arguments;
    if (json.is_array())
        for (const auto& argument : json)
            if (argument.is_string()) arguments.push_back(argument.get<std::string>());
    return arguments;
}

std::string recordings_as_json(const std::vector<LedgerRecording>& recordings) {
    ordered_json json = ordered_json::array();
    for (const LedgerRecording& recording : recordings) json.push_back(as_json(recording));
    return dump(json);
}

std::vector<LedgerRecording> recordings_from_json(std::string_view text) {
    const ordered_json json = ordered_json::parse(text, nullptr, false);
    std::vector<LedgerRecording> recordings;
    if (json.is_array())
        for (const auto& recording : json)
            if (recording.is_object()) recordings.push_back(recording_of(recording));
    return recordings;
}

}  // namespace documents

ResultFacts facts_of_result(std::string_view result_json, const std::string& name) {
    const ordered_json json = parse_result(result_json, name);
    ResultFacts facts;
    if (const auto verdict = json.find("verdict"); verdict != json.end() && verdict->is_object())
        facts.decision = text_of(*verdict, "decision");
    if (const auto recordings = json.find("recordings"); recordings != json.end() && recordings->is_array())
        for (const auto& recording : *recordings)
            if (recording.is_object()) facts.recordings.push_back(recording_of(recording));
    const auto result = json.find("result");
    if (result == json.end() || !result->is_object()) return facts;
    if (const auto quantities = result->find("quantities");
        quantities != result->end() && quantities->is_object())
        for (const auto& [key, object] : quantities->items())
            if (const auto figure = figure_of(key, object)) facts.figures.push_back(*figure);
    return facts;
}

std::string summaries_as_json(const std::vector<EntrySummary>& entries) {
    ordered_json json{{"schema", "ringwright.ledger_list.v1"}, {"entries", ordered_json::array()}};
    for (const EntrySummary& entry : entries) json["entries"].push_back(as_json(entry));
    return dump(json, 2);
}

std::string entry_as_json(const LedgerEntry& entry) {
    ordered_json json = as_json(entry.summary);
    json["arguments"] = ordered_json::parse(documents::arguments_as_json(entry.arguments));
    json["recordings"] = ordered_json::array();
    for (const LedgerRecording& recording : entry.recordings)
        json["recordings"].push_back(as_json(recording));
    json["sheet_name"] = entry.sheet_name;
    json["sheet"] = entry.sheet_text;
    ordered_json result = ordered_json::parse(entry.result_json, nullptr, false);
    json["result"] = result.is_discarded() ? ordered_json() : std::move(result);
    return dump(json, 2);
}

}  // namespace ringwright
