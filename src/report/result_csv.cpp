#include "ringwright/result_csv.hpp"

#include <fmt/format.h>

#include "report/csv_cell.hpp"

namespace ringwright {
namespace {

using report::csv_cell;
using report::csv_number;

/// What stands before the quantity in each row: where the answer comes from.
struct Source {
    std::string scope, file, release, start, end, method, model;
    bool torsional = false;
    double confidence_level = 0.95;
};

std::string source_cells(const Source& source) {
    return fmt::format("{},{},{},{},{},{},{}", source.scope, csv_cell(source.file), source.release,
                       source.start, source.end, source.method, csv_cell(source.model));
}

std::string quantity_rows(const Source& source, const Quantities& quantities) {
    std::string rows;
    for (const auto& [quantity, estimate] : quantities)
        rows += fmt::format("{},{},{},{},{},{},{},{},{},ok,\n", source_cells(source), key_of(quantity),
                            csv_number(estimate.value), unit_of(quantity, source.torsional),
                            csv_number(estimate.standard_uncertainty), csv_number(estimate.interval.low),
                            csv_number(estimate.interval.high), csv_number(estimate.degrees_of_freedom),
                            csv_number(source.confidence_level));
    return rows;
}

std::string method_rows(Source source, const char* method, const MethodResult& answer) {
    source.method = method;
    source.model = answer.model;
    if (answer.status == MethodStatus::ok) return quantity_rows(source, answer.quantities);
    return fmt::format("{},,,,,,,,{},not_applicable,{}\n", source_cells(source),
                       csv_number(source.confidence_level), csv_cell(answer.reason));
}

}  // namespace

std::string csv_row_of_unusable(const std::string& file, const std::string& reason, double confidence_level) {
    const Source source{"recording", file, "", "", "", "", "", false, confidence_level};
    return fmt::format("{},,,,,,,,{},unusable,{}\n", source_cells(source), csv_number(confidence_level),
                       csv_cell(reason));
}

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
            source.start = csv_number(event.start_s);
            source.end = csv_number(event.end_s);
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
