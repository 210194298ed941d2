#include "ringwright/result_csv.hpp"

#include <fmt/format.h>

#include <cmath>

namespace ringwright {
namespace {

std::string number(double value) {
    return std::isfinite(value) ? fmt::format("{}", value) : "";
}

/// RFC 4180 quoting. A cell that a spreadsheet would take for a formula gets a leading apostrophe.
std::string quoted(const std::string& text) {
    std::string cell = text;
    if (!cell.empty() && std::string_view("=+-@\t\r").find(cell.front()) != std::string_view::npos)
        cell.insert(0, 1, '\'');
    if (cell.find_first_of(",\"\r\n") == std::string::npos) return cell;
    std::string escaped = "\"";
    for (const char character : cell)
        escaped += character == '"' ? std::string("\"\"") : std::string(1, character);
    return escaped + "\"";
}

/// What stands before the quantity in each row: where the answer comes from.
struct Source {
    std::string scope, file, release, start, end, method, model;
    bool torsional = false;
    double confidence_level = 0.95;
};

std::string source_cells(const Source& source) {
    return fmt::format("{},{},{},{},{},{},{}", source.scope, quoted(source.file), source.release,
                       source.start, source.end, source.method, quoted(source.model));
}

std::string quantity_rows(const Source& source, const Quantities& quantities) {
    std::string rows;
    for (const auto& [quantity, estimate] : quantities)
        rows += fmt::format("{},{},{},{},{},{},{},{},{},ok,\n", source_cells(source), key_of(quantity),
                            number(estimate.value), unit_of(quantity, source.torsional),
                            number(estimate.standard_uncertainty), number(estimate.interval.low),
                            number(estimate.interval.high), number(estimate.degrees_of_freedom),
                            number(source.confidence_level));
    return rows;
}

std::string method_rows(Source source, const char* method, const MethodResult& answer) {
    source.method = method;
    source.model = answer.model;
    if (answer.status == MethodStatus::ok) return quantity_rows(source, answer.quantities);
    return fmt::format("{},,,,,,,,{},not_applicable,{}\n", source_cells(source),
                       number(source.confidence_level), quoted(answer.reason));
}

}  // namespace

std::string to_csv(const Identification& identification) {
    std::string text =
        "scope,file,release,start_s,end_s,method,model,quantity,value,unit,standard_uncertainty,interval_low,"
        "interval_high,degrees_of_freedom,confidence_level,status,reason\n";
    std::size_t release = 0;
    for (const RecordingIdentification& recording : identification.recordings) {
        Source source{"release",
                      recording.recording.origin.file,
                      "",
                      "",
                      "",
                      "",
                      "",
                      is_torsional(recording.recording.quantity),
                      identification.confidence_level};
        for (const EventIdentification& event : recording.events) {
            source.release = std::to_string(++release);
            source.start = number(event.start_s);
            source.end = number(event.end_s);
            text += method_rows(source, "logarithmic_decrement", event.logarithmic_decrement);
            text += method_rows(source, "half_power_bandwidth", event.half_power_bandwidth);
            text += method_rows(source, "curve_fit", event.curve_fit);
        }
    }
    const PooledResult& result = identification.result;
    const std::string only_file =
        identification.recordings.size() == 1 ? identification.recordings.front().recording.origin.file : "";
    return text + quantity_rows({"result", only_file, "", "", "", result.method, result.model,
                                 result.torsional, identification.confidence_level},
                                result.quantities);
}

}  // namespace ringwright
