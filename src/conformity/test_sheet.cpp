#include "ringwright/test_sheet.hpp"

#include <fmt/format.h>

#include <array>
#include <cerrno>
#include <charconv>
#include <cstring>
#include <filesystem>
#include <fstream>
#include <iterator>

#include "conformity/sheet_reading.hpp"
#include "ringwright/error.hpp"

namespace ringwright {
namespace {

using sheet::Table;

constexpr std::size_t largest_sheet = 1 << 20;

struct RecordedQuantity {
    std::string_view name;
    Dimension dimension;
};
constexpr std::array<RecordedQuantity, 6> recorded_quantities{{
    {"displacement", Dimension::length},
    {"velocity", Dimension::velocity},
    {"acceleration", Dimension::acceleration},
    {"angle", Dimension::angle},
    {"angular-velocity", Dimension::angular_velocity},
    {"angular-acceleration", Dimension::angular_acceleration},
}};

std::string read_bytes(const std::string& path) {
    errno = 0;
    std::error_code ignored;
    std::ifstream file(path, std::ios::binary);
    if (!file || std::filesystem::is_directory(path, ignored))
        throw InputError({path, "",
                          fmt::format("the test sheet cannot be opened ({})",
                                      errno ? std::strerror(errno) : "it is a folder"),
                          "Check the name; `ringwright sheet --template` writes a sheet to start from."});
    std::string bytes(largest_sheet + 1, '\0');
    file.read(bytes.data(), static_cast<std::streamsize>(bytes.size()));
    bytes.resize(static_cast<std::size_t>(file.gcount()));
    if (bytes.size() > largest_sheet)
        throw InputError(
            {path, "", "the test sheet is larger than 1 MiB", "Is it a recording? Name the sheet."});
    return bytes;
}

toml::table parse(std::string_view text, const std::string& name) {
    try {
        return toml::parse(text, name);
    } catch (const toml::parse_error& error) {
        throw InputError(
            {name, fmt::format("line {}, column {}", error.source().begin.line, error.source().begin.column),
             std::string(error.description()), "A test sheet is TOML: [tables] and key = \"value\" lines."});
    }
}

void read_article(const Table& table, TestSheet& read) {
    sheet::require_known_keys(table, {"type", "serial", "mass", "inertia", "spring_mass", "note"});
    read.article_type = sheet::text_at(table, "type");
    read.serial = sheet::name_or_number_at(table, "serial");
    read.article_note = sheet::text_at(table, "note");
    read.mass = sheet::positive_at(table, "mass", Dimension::mass);
    read.inertia = sheet::positive_at(table, "inertia", Dimension::inertia);
    read.spring_mass = sheet::positive_at(table, "spring_mass", Dimension::mass);
    if (read.mass && read.inertia)
        sheet::refuse(table, "inertia", "contradicts the mass beside it",
                      "Give a mass for linear motion or an inertia for torsion.");
}

void read_test(const Table& table, TestSheet& read) {
    sheet::require_known_keys(table, {"kind", "operator", "date", "gravity", "note"});
    read.kind = sheet::choice_at(table, "kind", {"pluck", "tap", "drop"});
    read.gravity = sheet::positive_at(table, "gravity", Dimension::acceleration);
    read.test_operator = sheet::text_at(table, "operator");
    read.test_note = sheet::text_at(table, "note");
    read.date = sheet::date_at(table, "date");
}

/// The unit must exist, and fit the quantity unless a sensitivity turns it from volts into that.
void check_unit(const Table& table, const TestSheet& read) {
    if (!read.unit) return;
    const auto unit = find_unit(*read.unit);
    if (!unit)
        sheet::refuse(table, "unit", fmt::format("\"{}\" is no unit that is known", *read.unit),
                      "Write it as in \"mm\", \"m/s^2\" or \"g\".");
    for (const auto& [name, dimension] : recorded_quantities)
        if (read.quantity == name && unit->dimension != dimension && unit->dimension != Dimension::voltage)
            sheet::refuse(
                table, "unit", fmt::format("\"{}\" is no unit of {}", *read.unit, name),
                fmt::format("Correct the unit (as in \"{}\") or the quantity.", si_unit_of(dimension)));
}

std::optional<double> rate_at(const Table& table) {
    const toml::node* node = table.entries.get("rate");
    if (!node) return std::nullopt;
    const double rate = node->is_string() ? sheet::measured_at(table, "rate", Dimension::frequency)->value
                                          : *sheet::number_at(table, "rate");
    if (!(rate > 0.0)) sheet::refuse(table, "rate", "not above zero", "Give samples per second.");
    return rate;
}

void read_recording_table(const Table& table, TestSheet& read) {
    sheet::require_known_keys(table, {"quantity", "unit", "channel", "time_column", "rate", "sensitivity",
                                      "full_scale", "sensor", "sensor_calibrated", "sensor_due"});
    std::vector<std::string_view> names;
    for (const auto& recorded : recorded_quantities) names.push_back(recorded.name);
    read.quantity = sheet::choice_at(table, "quantity", names);
    read.unit = sheet::text_at(table, "unit");
    read.channel = sheet::name_or_number_at(table, "channel");
    read.time_column = sheet::name_or_number_at(table, "time_column");
    read.rate_hz = rate_at(table);
    read.sensitivity = sheet::text_at(table, "sensitivity");
    read.full_scale = sheet::text_at(table, "full_scale");
    read.sensor = sheet::text_at(table, "sensor");
    read.sensor_calibrated = sheet::date_at(table, "sensor_calibrated");
    read.sensor_due = sheet::date_at(table, "sensor_due");
    check_unit(table, read);
    if (read.sensor_calibrated && read.sensor_due && *read.sensor_due < *read.sensor_calibrated)
        sheet::refuse(table, "sensor_due", "lies before the day the sensor was calibrated",
                      "Correct one of them.");
}

SheetRecording read_named_recording(const Table& entry, const std::string& name) {
    sheet::require_known_keys(entry, {"file", "added_mass"});
    const auto file = sheet::text_at(entry, "file");
    const int line = static_cast<int>(entry.entries.source().begin.line);
    if (!file || file->empty())
        throw InputError({name, fmt::format("line {}, key recordings.file", line),
                          "an entry that names no file", "Add file = \"…\"."});
    SheetRecording recording;
    recording.file = *file;
    recording.path = (std::filesystem::path(name).parent_path() / *file).string();
    recording.added_mass = sheet::measured_at(entry, "added_mass", Dimension::mass);
    if (recording.added_mass && recording.added_mass->value < 0.0)
        sheet::refuse(entry, "added_mass", "below zero", "Give the mass that was added.");
    recording.line = line;
    return recording;
}

void read_named_recordings(const Table& root, TestSheet& read) {
    const toml::node* node = root.entries.get("recordings");
    if (!node) return;
    const toml::array* entries = node->as_array();
    const auto not_tables = [&]() {
        sheet::refuse(root, "recordings", "is no list of tables",
                      "Write [[recordings]] above each file = \"…\".");
    };
    if (!entries) not_tables();
    for (const toml::node& entry : *entries) {
        if (!entry.is_table()) not_tables();
        read.recordings.push_back(
            read_named_recording({root.file, *entry.as_table(), "recordings"}, read.file));
    }
}

/// The day of the test, and how it is told.
Date test_day(const TestSheet& sheet, Date today) {
    return sheet.date.value_or(today);
}

std::string sensor_name(const TestSheet& sheet) {
    return sheet.sensor ? fmt::format("The sensor \"{}\"", *sheet.sensor) : "The sensor";
}

}  // namespace

std::string to_text(Date date) {
    return fmt::format("{:04}-{:02}-{:02}", static_cast<int>(date.year()),
                       static_cast<unsigned>(date.month()), static_cast<unsigned>(date.day()));
}

std::optional<Date> date_from_text(std::string_view text) {
    if (text.size() != 10 || text[4] != '-' || text[7] != '-') return std::nullopt;
    int parts[3] = {0, 0, 0};
    const std::string_view pieces[3] = {text.substr(0, 4), text.substr(5, 2), text.substr(8, 2)};
    for (int i = 0; i < 3; ++i) {
        if (pieces[i].find_first_not_of("0123456789") != std::string_view::npos) return std::nullopt;
        std::from_chars(pieces[i].data(), pieces[i].data() + pieces[i].size(), parts[i]);
    }
    const Date date{std::chrono::year{parts[0]}, std::chrono::month{static_cast<unsigned>(parts[1])},
                    std::chrono::day{static_cast<unsigned>(parts[2])}};
    return date.ok() ? std::optional(date) : std::nullopt;
}

std::vector<Limit> limits_of(const TestSheet& sheet) {
    std::vector<Limit> limits;
    for (const SheetLimit& limit : sheet.limits) limits.push_back(limit.limit);
    return limits;
}

TestSheet read_test_sheet_from_memory(std::string_view text, const std::string& name) {
    TestSheet read;
    read.file = name;
    read.text = text;
    const toml::table entries = parse(text, name);
    const Table root{read.file, entries, ""};
    sheet::require_known_keys(root, {"article", "test", "recording", "limits", "recordings"});
    if (const auto table = sheet::table_at(root, "article")) read_article(*table, read);
    if (const auto table = sheet::table_at(root, "test")) read_test(*table, read);
    if (const auto table = sheet::table_at(root, "recording")) read_recording_table(*table, read);
    if (const auto table = sheet::table_at(root, "limits")) sheet::read_limits(*table, read);
    read_named_recordings(root, read);
    return read;
}

TestSheet read_test_sheet(const std::string& path) {
    return read_test_sheet_from_memory(read_bytes(path), path);
}

Findings sheet_findings(const TestSheet& sheet, Date today) {
    Findings findings;
    const Date day = test_day(sheet, today);
    const std::string whose = fmt::format("the test of {}", to_text(day));
    if (sheet.sensor_due && *sheet.sensor_due < day)
        findings.push_back(
            {"sensor_overdue", Severity::caution,
             fmt::format("{} was due for calibration on {} (key recording.sensor_due), before {}. "
                         "Have it calibrated and repeat the test.",
                         sensor_name(sheet), to_text(*sheet.sensor_due), whose)});
    if (sheet.sensor_calibrated && *sheet.sensor_calibrated > day)
        findings.push_back(
            {"sensor_calibrated_later", Severity::caution,
             fmt::format("{} was calibrated on {} (key recording.sensor_calibrated), after {}. "
                         "Check the dates.",
                         sensor_name(sheet), to_text(*sheet.sensor_calibrated), whose)});
    if (!sheet.limits.empty() && !sheet.rule_given)
        findings.push_back(
            {"rule_not_stated", Severity::note,
             fmt::format("The sheet states no decision_rule; {} is used.", to_text(sheet.decision.rule))});
    if (sheet.limits.empty()) findings.push_back({"no_limits", Severity::note, "The sheet holds no limits."});
    return findings;
}

void require_same_motion(const TestSheet& sheet, bool torsional) {
    for (const SheetLimit& limit : sheet.limits)
        if (limit.torsional && *limit.torsional != torsional)
            throw InputError(
                {sheet.file, fmt::format("line {}, key limits.{}", limit.line, key_of(limit.limit.quantity)),
                 fmt::format("the limit {} is for {}, the recording is of {}", limit.text,
                             torsional ? "linear motion" : "torsion",
                             torsional ? "torsion" : "linear motion"),
                 fmt::format("Give the limit in {}.", unit_of(limit.limit.quantity, torsional))});
}

}  // namespace ringwright
