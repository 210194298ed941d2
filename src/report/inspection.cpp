#include "ringwright/inspection.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <nlohmann/json.hpp>

#include "report/csv_cell.hpp"
#include "report/finding_text.hpp"
#include "report/text_table.hpp"
#include "ringwright/counting.hpp"
#include "ringwright/result_json.hpp"

namespace ringwright {
namespace {

using Json = nlohmann::ordered_json;
using report::Align;
using report::printable;
using report::TextTable;

std::string shown(double value, bool exists) {
    return exists && std::isfinite(value) ? fmt::format("{:.5g}", value) : "";
}

std::string channels_text(const FileSummary& file) {
    TextTable table{{Align::right, Align::left, Align::left, Align::left, Align::right, Align::right,
                     Align::right, Align::right, Align::right},
                    {},
                    true};
    table.rows.push_back({"N", "channel", "unit", "role", "values", "missing", "least", "greatest", "mean"});
    std::size_t number = 0;
    for (const ChannelSummary& channel : file.channels) {
        const bool any = channel.values > 0;
        table.rows.push_back({std::to_string(++number), printable(channel.name), printable(channel.unit),
                              channel.role, std::to_string(channel.values), std::to_string(channel.missing),
                              shown(channel.minimum, any), shown(channel.maximum, any),
                              shown(channel.mean, any)});
    }
    return report::to_text(table, 2);
}

/// A recording, held or not.
struct Seen {
    const Recording& recording;
    const LongRecording* stretches = nullptr;
    [[nodiscard]] std::size_t size() const {
        return stretches != nullptr ? stretches->size() : recording.size();
    }
    [[nodiscard]] double duration_s() const {
        return stretches != nullptr ? stretches->duration_s() : recording.duration_s();
    }
    [[nodiscard]] bool equal_steps() const {
        return stretches != nullptr ? stretches->equal_steps() : recording.clock.uniform();
    }
    [[nodiscard]] double time_of(std::size_t sample) const {
        return stretches != nullptr ? stretches->time_of(sample) : recording.clock.time_of(sample);
    }
    [[nodiscard]] double start_of(const Event& event) const { return time_of(event.begin); }
    [[nodiscard]] double end_of(const Event& event) const { return time_of(std::min(event.end, size() - 1)); }
};

Seen seen(const Inspection& inspection) {
    return {*inspection.recording, inspection.stretches.get()};
}

std::string clock_text(const Seen& seen) {
    const Recording& recording = seen.recording;
    std::string text = fmt::format("{} samples at {:.6g} Hz, {:.4g} s, {}", seen.size(),
                                   recording.clock.sample_rate_hz, seen.duration_s(),
                                   seen.equal_steps() ? "equal steps" : "steps as the time column has them");
    if (recording.resolution > 0.0) {
        const double factor =
            recording.scaled && recording.unit.si_factor != 0.0 ? recording.unit.si_factor : 1.0;
        text +=
            fmt::format(", smallest step {:.3g} {}", recording.resolution / factor, recording.unit.symbol);
    }
    return text;
}

std::string health_text(const Recording& recording) {
    std::size_t clipped = 0;
    for (const SampleRange& range : recording.clipped) clipped += range.end - range.begin;
    if (clipped == 0 && recording.gaps.empty()) return "no clipped samples, no gaps";
    return fmt::format("{} in {}, {}", counted(clipped, "clipped sample"),
                       counted(recording.clipped.size(), "run"), counted(recording.gaps.size(), "gap"));
}

std::string recording_text(const Seen& seen) {
    const Recording& recording = seen.recording;
    std::string text = "Recording\n";
    text += fmt::format(
        "  channel {}: {}{}\n", printable(recording.origin.channel),
        recording.quantity_known ? std::string(to_text(recording.quantity)) : "quantity not known",
        recording.unit.symbol.empty() ? "" : fmt::format(" in {}", printable(recording.unit.symbol)));
    return text + fmt::format("  {}\n  {}\n", clock_text(seen), health_text(recording));
}

std::string events_text(const Seen& seen, const EventSearch& search) {
    if (search.events.empty()) return report::wrapped("Events: none. ", search.reason);
    TextTable table{
        {Align::right, Align::left, Align::right, Align::right, Align::right, Align::right}, {}, true};
    table.rows.push_back({"N", "test", "start / s", "end / s", "length / s", "frequency about / Hz"});
    std::size_t number = 0;
    for (const Event& event : search.events) {
        const double start = seen.start_of(event), end = seen.end_of(event);
        table.rows.push_back(
            {std::to_string(++number), std::string(to_text(event.kind)) + (event.kind_known ? "" : "?"),
             fmt::format("{:.4f}", start), fmt::format("{:.4f}", end), fmt::format("{:.4f}", end - start),
             event.frequency_guess_hz > 0.0 ? fmt::format("{:.4g}", event.frequency_guess_hz)
                                            : "does not ring"});
    }
    return "Events\n" + report::to_text(table, 2);
}

/// Of a recording that is not held, its overview with the events in their places there.
std::string drawing(const Inspection& inspection, std::size_t columns) {
    constexpr std::size_t rows = 10;
    std::vector<Event> events = inspection.events.events;
    if (!inspection.stretches) return draw(*inspection.recording, events, columns, rows);
    const Recording& overview = inspection.stretches->overview();
    const std::vector<double>& times = overview.clock.times_s;
    const auto place = [&](double time_s) {
        return static_cast<std::size_t>(std::ranges::lower_bound(times, time_s) - times.begin());
    };
    for (Event& event : events) {
        const double start = seen(inspection).start_of(event), end = seen(inspection).end_of(event);
        event.begin = place(start);
        event.end = place(end);
    }
    return draw(overview, events, columns, rows);
}

std::string all_findings(const Inspection& inspection) {
    report::GatheredFindings gathered("event");
    gathered.add(inspection.file.findings, "");
    if (inspection.recording) gathered.add(inspection.recording->findings, "");
    gathered.add(inspection.events.findings, "");
    std::size_t number = 0;
    for (const Event& event : inspection.events.events) gathered.add(event.findings, ++number);
    return gathered.text();
}

Json channel_json(const ChannelSummary& channel) {
    Json json{{"name", channel.name},
              {"unit", channel.unit},
              {"role", channel.role},
              {"values", channel.values},
              {"missing", channel.missing}};
    if (channel.values == 0) return json;
    for (const auto& [key, value] :
         {std::pair{"minimum", channel.minimum}, {"maximum", channel.maximum}, {"mean", channel.mean}})
        if (std::isfinite(value)) json[key] = value;
    return json;
}

Json event_json(const Seen& seen, const Event& event) {
    Json json{{"start_s", seen.start_of(event)},
              {"end_s", seen.end_of(event)},
              {"test", std::string(to_text(event.kind))},
              {"test_certain", event.kind_known}};
    if (event.frequency_guess_hz > 0.0) json["frequency_about_hz"] = event.frequency_guess_hz;
    json["findings"] = to_json(event.findings);
    return json;
}

Json ranges_json(const std::vector<SampleRange>& ranges) {
    Json list = Json::array();
    for (const SampleRange& range : ranges) list.push_back({{"begin", range.begin}, {"end", range.end}});
    return list;
}

void put_recording(Json& json, const Inspection& inspection) {
    const Recording& recording = *inspection.recording;
    const Seen whole = seen(inspection);
    Json entry{{"channel", recording.origin.channel}};
    if (recording.quantity_known) entry["quantity"] = std::string(to_text(recording.quantity));
    if (!recording.unit.symbol.empty()) entry["unit"] = recording.unit.symbol;
    entry["sample_rate_hz"] = recording.clock.sample_rate_hz;
    entry["uniform"] = whole.equal_steps();
    entry["sample_count"] = whole.size();
    entry["duration_s"] = whole.duration_s();
    entry["clipped"] = ranges_json(recording.clipped);
    entry["gaps"] = ranges_json(recording.gaps);
    entry["findings"] = to_json(recording.findings);
    json["recording"] = std::move(entry);
    json["events"] = Json::array();
    for (const Event& event : inspection.events.events) json["events"].push_back(event_json(whole, event));
    if (inspection.events.events.empty()) json["reason"] = inspection.events.reason;
    json["events_findings"] = to_json(inspection.events.findings);
}

}  // namespace

std::string to_text(const Inspection& inspection, std::size_t width) {
    const FileSummary& file = inspection.file;
    std::string text =
        fmt::format("{}\n  {}{}, {} bytes\n", printable(file.file), printable(file.format),
                    file.dialect.empty() ? "" : fmt::format(": {}", printable(file.dialect)), file.bytes);
    if (!file.sha256.empty()) text += fmt::format("  SHA-256 {}\n", file.sha256);
    text += '\n';
    text += channels_text(file);
    if (inspection.problem)
        text += fmt::format("\n{}", report::wrapped("Not read: ", printable(to_text(*inspection.problem))));
    if (inspection.recording) {
        const std::size_t columns = std::clamp<std::size_t>(width, 40, 400);
        text += fmt::format("\n{}\n{}\n", recording_text(seen(inspection)), drawing(inspection, columns));
        text += events_text(seen(inspection), inspection.events);
    }
    const std::string findings = all_findings(inspection);
    return findings.empty() ? text : fmt::format("{}\n{}", text, findings);
}

Json to_json(const Inspection& inspection) {
    const FileSummary& file = inspection.file;
    Json json{{"schema", "ringwright.inspection.v1"}, {"software", software_json()}};
    put_file_name(json, file.file);
    json["sha256"] = file.sha256;
    json["bytes"] = file.bytes;
    json["format"] = file.format;
    json["dialect"] = file.dialect;
    json["channels"] = Json::array();
    for (const ChannelSummary& channel : file.channels) json["channels"].push_back(channel_json(channel));
    json["findings"] = to_json(file.findings);
    if (inspection.recording) put_recording(json, inspection);
    if (inspection.problem)
        json["error"] = {{"place", inspection.problem->place},
                         {"cause", inspection.problem->found},
                         {"remedy", inspection.problem->remedy}};
    return json;
}

std::string to_csv(const Inspection& inspection) {
    std::string text = "file,channel,name,unit,role,values,missing,minimum,maximum,mean\n";
    std::size_t number = 0;
    for (const ChannelSummary& channel : inspection.file.channels) {
        const bool any = channel.values > 0;
        const auto cell = [any](double value) { return any ? report::csv_number(value) : std::string(); };
        text += fmt::format("{},{},{},{},{},{},{},{},{},{}\n", report::csv_cell(inspection.file.file),
                            ++number, report::csv_cell(channel.name), report::csv_cell(channel.unit),
                            channel.role, channel.values, channel.missing, cell(channel.minimum),
                            cell(channel.maximum), cell(channel.mean));
    }
    return text;
}

}  // namespace ringwright
