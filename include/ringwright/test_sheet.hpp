#pragma once
// The test sheet: what is known of a test before it is run, and the limits that its result is held to.

#include <chrono>
#include <optional>
#include <string>
#include <string_view>
#include <vector>

#include "ringwright/conformity.hpp"
#include "ringwright/finding.hpp"
#include "ringwright/measured_value.hpp"

namespace ringwright {

using Date = std::chrono::year_month_day;
/// "2031-04-02".
[[nodiscard]] std::string to_text(Date date);
/// Reads "2031-04-02"; nothing when the text is no such date of the calendar.
[[nodiscard]] std::optional<Date> date_from_text(std::string_view text);

/// A limit as it stands in the sheet.
struct SheetLimit {
    Limit limit;
    std::optional<bool> torsional;  ///< told by its unit (N/m or N·m/rad); absent where both share it
    std::string text;               ///< as people read it, e.g. "3.1 N/mm ± 8 %"
    int line = 0;
};

/// A recording named in the sheet.
struct SheetRecording {
    std::string file;  ///< relative to the folder of the sheet, as written
    std::string path;  ///< the same, ready to open
    std::optional<MeasuredValue> added_mass;
    int line = 0;
};

/// A whole test sheet; whatever it does not say is absent. Texts are as written; `[recording]` values keep
/// the meaning of the command-line option of the same name.
struct TestSheet {
    std::string file;  ///< as the user named it
    std::string text;  ///< every byte of it, for the ledger

    // [article]
    std::optional<std::string> article_type, serial, article_note;
    std::optional<MeasuredValue> mass, inertia, spring_mass;
    std::optional<MeasuredValue> gravity;  ///< of the place, for drops

    // [test]
    std::optional<std::string> kind;  ///< "pluck", "tap" or "drop"
    std::optional<std::string> test_operator, test_note;
    std::optional<Date> date;

    // [recording]
    std::optional<std::string> quantity, unit, channel, time_column, sensitivity, full_scale;
    std::optional<double> rate_hz;
    std::optional<std::string> sensor;
    std::optional<Date> sensor_calibrated, sensor_due;

    // [limits]
    bool rule_given = false;
    DecisionOptions decision;
    std::vector<SheetLimit> limits;

    // [[recordings]]
    std::vector<SheetRecording> recordings;
};

/// The limits alone, in the order of the sheet.
[[nodiscard]] std::vector<Limit> limits_of(const TestSheet& sheet);

/// Reads a test sheet (TOML 1.0, UTF-8, at most 1 MiB). Throws InputError naming file, line and key when it
/// cannot be opened, is not TOML, holds an unknown key or table (with the nearest known one), a value of the
/// wrong type, unit or sign, or contradictory entries: min above max, nominal beside min or max, tolerance
/// without nominal, mass beside inertia, a sensor that is due before it was calibrated.
[[nodiscard]] TestSheet read_test_sheet(const std::string& path);
/// The same from text in memory; `name` stands for the file in messages, and recordings are relative to its
/// folder.
[[nodiscard]] TestSheet read_test_sheet_from_memory(std::string_view text, const std::string& name);

/// What is to be said of a sheet that can be used: a sensor past its due date on the day of the test (`today`
/// where the sheet has no date) or calibrated after it, a sheet with no limit, a rule that was not stated.
[[nodiscard]] Findings sheet_findings(const TestSheet& sheet, Date today);

/// Throws InputError naming the line of the first limit whose unit is for the other kind of motion: N/m on a
/// torsional recording or N·m/rad on a linear one.
void require_same_motion(const TestSheet& sheet, bool torsional);

/// A sheet with every key, each with a comment that says what it means; it reads without error.
[[nodiscard]] std::string_view test_sheet_template();

}  // namespace ringwright
