#include "ringwright/result_json.hpp"

#include <fmt/format.h>

#include <cmath>
#include <fstream>
#include <iostream>
#include <iterator>
#include <nlohmann/json.hpp>

#include "ringwright/error.hpp"
#include "ringwright/version.hpp"

namespace ringwright {
namespace {

using Json = nlohmann::ordered_json;

void put_if_said(Json& json, const char* key, const std::string& text) {
    if (!text.empty()) json[key] = text;
}

void put_if_finite(Json& json, const char* key, double value) {
    if (std::isfinite(value)) json[key] = value;
}

Json modes_json(const std::vector<Mode>& modes, bool torsional) {
    Json list = Json::array();
    for (const Mode& mode : modes) {
        Json entry{{"quantities", to_json(mode.quantities, torsional)}};
        put_if_finite(entry, "amplitude", mode.amplitude);
        list.push_back(std::move(entry));
    }
    return list;
}

Json amplitude_json(double amplitude, const Recording& recording) {
    Json json{{"value", amplitude}};
    if (recording.scaled && recording.quantity_known)
        json["unit"] = std::string(si_unit_of(dimension_of(recording.quantity)));
    return json;
}

Json method_json(const MethodResult& method, const Recording& recording) {
    const bool torsional = is_torsional(recording.quantity);
    if (method.status == MethodStatus::not_applicable)
        return {{"status", "not_applicable"}, {"reason", method.reason}};
    Json json{{"status", "ok"}};
    put_if_said(json, "model", method.model);
    if (method.at_amplitude) json["at_amplitude"] = amplitude_json(*method.at_amplitude, recording);
    json["quantities"] = to_json(method.quantities, torsional);
    if (!method.modes.empty()) json["modes"] = modes_json(method.modes, torsional);
    return json;
}

Json agreement_json(const Agreement& agreement) {
    Json json = Json::object();
    if (agreement.tested) {
        json["consistent"] = agreement.consistent;
        put_if_finite(json, "p_value", agreement.p_value);
    }
    put_if_said(json, "reading", agreement.reading);
    return json;
}

Json course_json(const AmplitudeCourse& course, const Recording& recording) {
    Json json{{"depends_on_amplitude", course.depends_on_amplitude}};
    put_if_finite(json, "p_value", course.p_value);
    json["points"] = Json::array();
    for (const AmplitudePoint& point : course.points)
        json["points"].push_back({{"amplitude", amplitude_json(point.amplitude, recording)},
                                  {"damping_ratio", to_json(point.damping_ratio, "1")},
                                  {"natural_frequency", to_json(point.natural_frequency, "Hz")}});
    return json;
}

Json event_json(const EventIdentification& event, const Recording& recording) {
    Json json;
    put_if_finite(json, "start_s", event.start_s);
    put_if_finite(json, "end_s", event.end_s);
    json["test"] = std::string(to_text(event.event.kind));
    json["methods"] = {{"logarithmic_decrement", method_json(event.logarithmic_decrement, recording)},
                       {"half_power_bandwidth", method_json(event.half_power_bandwidth, recording)},
                       {"curve_fit", method_json(event.curve_fit, recording)}};
    json["agreement"] = agreement_json(event.agreement);
    if (event.course.tested) json["amplitude_course"] = course_json(event.course, recording);
    Findings findings = event.event.findings;
    findings.insert(findings.end(), event.findings.begin(), event.findings.end());
    json["findings"] = to_json(findings);
    return json;
}

Json measured_json(const MeasuredValue& measured, std::string_view unit) {
    Json json{{"value", measured.value}, {"unit", std::string(unit)}};
    if (measured.kind != UncertaintyKind::not_stated)
        json["standard_uncertainty"] = measured.standard_uncertainty;
    put_if_said(json, "as_written", measured.text);
    return json;
}

Json recording_json(const RecordingIdentification& identified) {
    const Recording& recording = identified.recording;
    Json json = Json::object();
    put_file_name(json, recording.origin.file);
    put_if_said(json, "sha256", recording.origin.sha256);
    if (recording.origin.bytes > 0) json["bytes"] = recording.origin.bytes;
    put_if_said(json, "channel", recording.origin.channel);
    if (recording.quantity_known) json["quantity"] = std::string(to_text(recording.quantity));
    put_if_said(json, "unit", recording.unit.symbol);
    put_if_finite(json, "sample_rate_hz", recording.clock.sample_rate_hz);
    json["sample_count"] = identified.sample_count;
    put_if_finite(json, "duration_s", identified.duration_s);
    if (identified.added_mass) json["added_mass"] = measured_json(*identified.added_mass, "kg");
    json["findings"] = to_json(identified.findings);
    json["events"] = Json::array();
    for (const EventIdentification& event : identified.events)
        json["events"].push_back(event_json(event, recording));
    if (identified.events.empty()) put_if_said(json, "reason", identified.reason);
    return json;
}

Json budget_json(const std::vector<BudgetLine>& budget) {
    Json list = Json::array();
    for (const BudgetLine& line : budget) {
        Json entry{{"quantity", std::string(key_of(line.quantity))}, {"source", line.source}};
        put_if_finite(entry, "value", line.value);
        entry["unit"] = line.unit;
        put_if_finite(entry, "standard_uncertainty", line.standard_uncertainty);
        put_if_finite(entry, "sensitivity", line.sensitivity);
        put_if_finite(entry, "contribution", line.contribution);
        put_if_finite(entry, "share", line.share);
        put_if_finite(entry, "degrees_of_freedom", line.degrees_of_freedom);
        list.push_back(std::move(entry));
    }
    return list;
}

Json pooled_json(const PooledResult& result) {
    Json json = Json::object();
    put_if_said(json, "method", result.method);
    put_if_said(json, "model", result.model);
    json["event_count"] = result.event_count;
    json["quantities"] = to_json(result.quantities, result.torsional);
    json["budget"] = budget_json(result.budget);
    json["findings"] = to_json(result.findings);
    return json;
}

Json article_json(const Article& article) {
    Json json = Json::object();
    if (article.mass) json["mass"] = measured_json(*article.mass, "kg");
    if (article.inertia) json["inertia"] = measured_json(*article.inertia, "kg·m²");
    if (article.spring_mass) json["spring_mass"] = measured_json(*article.spring_mass, "kg");
    if (article.gravity) json["gravity"] = measured_json(*article.gravity, "m/s²");
    return json;
}

[[noreturn]] void fail_entry(const std::string& name, const std::string& key, const char* found) {
    throw InputError({name, "key " + key, found, "Give a result that ringwright wrote"});
}

double number_at(const Json& object, const char* key, const std::string& name, const std::string& place) {
    const auto found = object.find(key);
    if (found == object.end() || !found->is_number())
        fail_entry(name, place + "." + key, "no number stands here");
    return found->get<double>();
}

Estimate estimate_from_json(const Json& object, const std::string& name, const std::string& place) {
    if (!object.is_object()) fail_entry(name, place, "no object stands here");
    constexpr double infinite = std::numeric_limits<double>::infinity();
    Estimate estimate{number_at(object, "value", name, place), 0.0, {-infinite, infinite}, infinite};
    estimate.standard_uncertainty = number_at(object, "standard_uncertainty", name, place);
    if (const auto interval = object.find("interval"); interval != object.end()) {
        if (!interval->is_array() || interval->size() != 2 || !(*interval)[0].is_number() ||
            !(*interval)[1].is_number())
            fail_entry(name, place + ".interval", "no pair of numbers stands here");
        estimate.interval = {(*interval)[0].get<double>(), (*interval)[1].get<double>()};
    }
    if (object.contains("degrees_of_freedom"))
        estimate.degrees_of_freedom = number_at(object, "degrees_of_freedom", name, place);
    return estimate;
}

std::string bytes_of(const std::string& path) {
    if (path == "-") return {std::istreambuf_iterator<char>(std::cin), {}};
    std::ifstream file(path, std::ios::binary);
    std::string bytes{std::istreambuf_iterator<char>(file), {}};
    if (!file.is_open() || file.bad())
        throw InputError({path, "", "cannot be opened", "Check the name and the permissions"});
    return bytes;
}

}  // namespace

Json software_json() {
    return {{"name", "ringwright"}, {"version", std::string(version())}};
}

Json to_json(const Estimate& estimate, std::string_view unit) {
    if (!std::isfinite(estimate.value) || !std::isfinite(estimate.standard_uncertainty)) return nullptr;
    Json json{{"value", estimate.value},
              {"unit", std::string(unit)},
              {"standard_uncertainty", estimate.standard_uncertainty}};
    if (std::isfinite(estimate.interval.low) && std::isfinite(estimate.interval.high))
        json["interval"] = {estimate.interval.low, estimate.interval.high};
    put_if_finite(json, "degrees_of_freedom", estimate.degrees_of_freedom);
    return json;
}

Json to_json(const Quantities& quantities, bool torsional) {
    Json json = Json::object();
    for (const auto& [quantity, estimate] : quantities) {
        Json entry = to_json(estimate, unit_of(quantity, torsional));
        if (!entry.is_null()) json[std::string(key_of(quantity))] = std::move(entry);
    }
    return json;
}

Json to_json(const Findings& findings) {
    Json list = Json::array();
    for (const Finding& finding : findings)
        list.push_back({{"code", finding.code},
                        {"severity", std::string(to_text(finding.severity))},
                        {"message", finding.message}});
    return list;
}

Json to_json(const Identification& identification) {
    Json json{{"schema", "ringwright.identification.v1"},
              {"software", software_json()},
              {"confidence_level", identification.confidence_level}};
    if (const Json article = article_json(identification.article); !article.empty())
        json["article"] = article;
    json["recordings"] = Json::array();
    for (const RecordingIdentification& recording : identification.recordings)
        json["recordings"].push_back(recording_json(recording));
    json["result"] = pooled_json(identification.result);
    return json;
}

void put_file_name(Json& object, const std::string& file) {
    const std::string shown = Json::parse(to_text(Json(file), -1)).get<std::string>();
    object["file"] = shown;
    if (shown == file) return;
    std::string digits;
    for (const char byte : file) digits += fmt::format("{:02x}", static_cast<unsigned char>(byte));
    object["file_hex"] = digits;
}

std::string to_text(const Json& json, int indent) {
    return json.dump(indent, ' ', false, Json::error_handler_t::replace) + "\n";
}

Quantities quantities_from_json(const Json& object, const std::string& name) {
    if (!object.is_object()) fail_entry(name, "quantities", "no object stands here");
    Quantities quantities;
    for (const auto& [key, entry] : object.items())
        if (const auto quantity = quantity_from_key(key))
            quantities[*quantity] = estimate_from_json(entry, name, "quantities." + key);
    return quantities;
}

Json read_result_json(const std::string& path, std::string_view schema) {
    const std::string bytes = bytes_of(path);
    const std::string name = path == "-" ? "standard input" : path;
    Json json = Json::parse(bytes, nullptr, false);
    if (json.is_discarded() || !json.is_object())
        throw InputError({name, "", "is no JSON document of one result",
                          "Give what `ringwright identify --format json` wrote"});
    const auto found = json.find("schema");
    const std::string written = found != json.end() && found->is_string() ? found->get<std::string>() : "";
    if (!schema.empty() && written != schema)
        throw InputError({name, "key schema",
                          written.empty() ? "is absent" : "is " + written + ", not " + std::string(schema),
                          "Give what `ringwright identify --format json` wrote"});
    return json;
}

}  // namespace ringwright
