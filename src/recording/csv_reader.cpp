#include "recording/csv_reader.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <functional>

#include "recording/channel_scale.hpp"
#include "recording/clock.hpp"
#include "recording/csv_columns.hpp"
#include "recording/csv_open.hpp"
#include "recording/csv_rows.hpp"
#include "recording/csv_table.hpp"
#include "recording/csv_thousands.hpp"
#include "recording/in_pieces.hpp"
#include "recording/preamble_rate.hpp"
#include "recording/quantity_words.hpp"
#include "recording/text_encoding.hpp"
#include "ringwright/counting.hpp"
#include "ringwright/each_index.hpp"
#include "ringwright/error.hpp"

namespace ringwright {
namespace {

void add(Findings& findings, const char* code, Severity severity, std::string message) {
    findings.push_back(Finding{code, severity, std::move(message)});
}

void append(Findings& findings, const Findings& more) {
    findings.insert(findings.end(), more.begin(), more.end());
}

std::size_t most_cells_in_a_row(std::string_view text) {
    LineReader reader(text);
    std::string_view line;
    std::size_t most = 0;
    while (reader.next(line)) {
        const auto digits =
            std::count_if(line.begin(), line.end(), [](char c) { return c >= '0' && c <= '9'; });
        for (const char delimiter : {',', ';', '\t', '|', ' '}) {
            const auto cells = 1 + std::count(line.begin(), line.end(), delimiter);
            if (digits >= cells) most = std::max(most, static_cast<std::size_t>(cells));
        }
    }
    return most;
}

[[noreturn]] void refuse_no_table(const std::string& file, const DecodedText& decoded,
                                  std::string_view text) {
    if (decoded.binary)
        throw InputError(Problem{file, "",
                                 "this is neither a sound file nor text, so no recording can be read from it",
                                 "Export the recording as CSV or WAV."});
    if (const std::size_t columns = most_cells_in_a_row(text); columns > most_columns)
        throw InputError(
            Problem{file, "", fmt::format("a row has {} columns; at most {} are read", columns, most_columns),
                    "Export the time and the channels that matter, one row for each sample."});
    throw InputError(
        Problem{file, "", "no table of numbers was found in the text",
                "Export the recording as CSV: one row for each sample, with a time column or --rate."});
}

// Whether most of the sampled rows have the form of the table.
bool rows_have_form(const std::vector<std::vector<std::string_view>>& rows, const Table& table) {
    if (rows.size() < 8) return true;
    std::size_t good = 0;
    for (const auto& cells : rows) {
        const bool width = cells.size() >= table.columns.size() && cells.size() <= table.columns.size() + 1;
        bool numeric = false;
        for (std::size_t i = 0; i < std::min(cells.size(), table.columns.size()); ++i)
            numeric = numeric || (table.columns[i].content == ColumnContent::number &&
                                  kind_of_cell(cells[i], table.dialect) != CellKind::text);
        good += width && numeric ? 1 : 0;
    }
    return good * 2 > rows.size();
}

bool is_text_alone(const std::vector<std::string_view>& cells, const Dialect& dialect) {
    return std::all_of(cells.begin(), cells.end(), [&](std::string_view cell) {
        return cell.empty() || kind_of_cell(cell, dialect) == CellKind::text;
    });
}

// Where another table may begin: behind the first of the early rows that holds words alone, or, when
// `anywhere`, before the first three rows in succession that do not fit. The end of the text when there is no
// such place.
std::size_t next_start(std::string_view rows, const Table& table, bool anywhere) {
    constexpr std::size_t early_rows = 200;
    LineReader reader(rows, table.end_of_line);
    std::string_view line;
    std::vector<std::string_view> cells;
    std::size_t strays = 0, before = 0, stray_begin = 0;
    for (std::size_t row = 0; before = reader.offset(), reader.next(line); ++row) {
        if (!anywhere && row >= early_rows) break;
        split_cells(line, table.dialect.delimiter, cells);
        const bool blank = line.find_first_not_of(" \t") == std::string_view::npos;
        if (!blank && !anywhere && is_text_alone(cells, table.dialect)) return before;
        const bool fits = cells.size() >= table.columns.size() && cells.size() <= table.columns.size() + 1 &&
                          !cells.empty() && kind_of_cell(cells.front(), table.dialect) != CellKind::text;
        if (fits)
            strays = 0;
        else if (++strays == 1)
            stray_begin = before;
        if (anywhere && strays == 3) return stray_begin;
    }
    return rows.size();
}

std::size_t lines_in(std::string_view text, char end_of_line) {
    return static_cast<std::size_t>(std::count(text.begin(), text.end(), end_of_line));
}

// The first rows may hold no thousands: a release from rest that later swings far, or the time itself.
void take_thousands_marks(OpenTable& open) {
    open.thousands = find_thousands_marks(open.rows(), open.table);
    if (!open.thousands.consistent()) return;
    open.table.dialect.grouping = open.thousands.mark;
    open.table.thousands_or_decimal = false;
}

// Numbers that need a mark taken out which cannot be told from a decimal mark.
void refuse_unclear_thousands(const OpenTable& open, const std::string& file) {
    const ThousandsMarks& found = open.thousands;
    if (found.grouped == 0 || found.consistent()) return;
    const std::string place = fmt::format("line {}", open.table.first_line + found.grouped_line);
    if (found.misplaced > 0)
        throw InputError(
            Problem{file, place,
                    fmt::format("\"{}\" could have a mark before the thousands, but \"{}\" in line "
                                "{} has the same mark elsewhere",
                                found.grouped_text, found.misplaced_text,
                                open.table.first_line + found.misplaced_line),
                    "Export without marks before the thousands."});
    throw InputError(Problem{
        file, place,
        fmt::format(
            "\"{}\" could have a decimal mark or a mark before the thousands, and no other number tells",
            found.grouped_text),
        "Export without marks before the thousands, with some decimals in each number."});
}

// A short list of numbers in the preamble can look like the table: where words follow it soon and more rows
// come behind them, or where the middle of the file has another form, the search goes on there.
void find_main_table(OpenTable& open, const TableHints& hints) {
    for (int attempt = 0; attempt < 8; ++attempt) {
        take_thousands_marks(open);
        open.sample = sample_rows(open.rows(), open.table);
        const bool other_form = !rows_have_form(open.sample.middle, open.table);
        const std::size_t skipped = next_start(open.rows(), open.table, other_form);
        if (skipped == 0 || open.rows().size() - skipped <= skipped) return;
        auto later = find_table(open.rows().substr(skipped), open.decoded.latin1, hints);
        if (!later) return;
        const std::size_t offset = open.table.begin + skipped;
        const std::size_t lines_before = lines_in(open.text.substr(0, offset), open.table.end_of_line);
        later->begin += offset;
        later->first_line += lines_before;
        later->preamble_lines += lines_before;
        later->preamble = open.text.substr(0, later->begin);
        open.table = std::move(*later);
    }
}

// The first rows may not show what a column holds: an overload at the start, a channel that begins later.
void refine_contents(OpenTable& open) {
    for (std::size_t i = 0; i < open.table.columns.size(); ++i) {
        Column& column = open.table.columns[i];
        if (column.content != ColumnContent::empty && column.content != ColumnContent::text) continue;
        std::size_t numbers = 0, words = 0;
        for (const auto* rows : {&open.sample.first, &open.sample.middle, &open.sample.last})
            for (const auto& cells : *rows) {
                if (i >= cells.size()) continue;
                const CellKind kind = kind_of_cell(cells[i], open.table.dialect);
                numbers += kind == CellKind::number ? 1 : 0;
                words += kind == CellKind::text || kind == CellKind::stamp ? 1 : 0;
            }
        if (numbers > 9 * words) column.content = ColumnContent::number;
    }
}

bool is_whole(std::string_view cell, bool may_be_negative) {
    if (may_be_negative && !cell.empty() && cell.front() == '-') cell.remove_prefix(1);
    return !cell.empty() && cell.find_first_not_of("0123456789") == std::string_view::npos;
}

// "0,0005,1,2500": commas between the columns and in the numbers. Whole numbers everywhere, and in each
// second column some that begin with a zero.
bool commas_have_two_meanings(const OpenTable& open) {
    const std::size_t width = open.table.columns.size();
    if (open.table.dialect.delimiter != ',' || width < 4 || width % 2 != 0 || open.sample.first.size() < 8)
        return false;
    std::vector<bool> leading_zero(width, false);
    for (const auto& cells : open.sample.first) {
        if (cells.size() != width) return false;
        for (std::size_t i = 0; i < width; ++i) {
            if (!is_whole(cells[i], i % 2 == 0)) return false;
            if (i % 2 == 1 && cells[i].size() != open.sample.first.front()[i].size()) return false;
            if (cells[i].size() > 1 && cells[i].front() == '0') leading_zero[i] = true;
        }
    }
    bool any = false;
    for (std::size_t i = 0; i < width; ++i) {
        if (leading_zero[i] && i % 2 == 0) return false;
        any = any || leading_zero[i];
    }
    return any;
}

void refuse_two_meanings(const OpenTable& open, const std::string& file) {
    if (!commas_have_two_meanings(open)) return;
    throw InputError(Problem{file, fmt::format("line {}", open.table.first_line),
                             "commas stand both between the columns and in the numbers",
                             "Export with semicolons or tabs between the columns, or with decimal points."});
}

OpenTable open_table(std::string_view bytes, const ReadOptions& options, const std::string& file) {
    OpenTable open;
    open.decoded = decode_text(bytes);
    if (open.decoded.binary) refuse_no_table(file, open.decoded, {});
    open.text = open.decoded.encoding.starts_with("UTF-16") ? std::string_view(open.decoded.owned)
                                                            : open.decoded.text;
    TableHints hints;
    if ((options.time_column && *options.time_column != "none") ||
        (options.channel && *options.channel == "2"))
        hints.least_columns = 2;
    auto table = find_table(open.text, open.decoded.latin1, hints);
    if (!table) refuse_no_table(file, open.decoded, open.text);
    open.table = std::move(*table);
    find_main_table(open, hints);
    refine_contents(open);
    refuse_two_meanings(open, file);
    refuse_unclear_thousands(open, file);
    return open;
}

const char* delimiter_name(char delimiter) {
    switch (delimiter) {
        case '\t':
            return "tab";
        case ';':
            return "semicolon";
        case ',':
            return "comma";
        case '|':
            return "bar";
        default:
            return "blank";
    }
}

std::string dialect_text(const OpenTable& open) {
    const Table& table = open.table;
    std::string text = table.columns.size() == 1 && table.dialect.delimiter == ';'
                           ? "one column"
                           : delimiter_name(table.dialect.delimiter);
    text += table.dialect.decimal == ',' ? ", decimal comma" : ", decimal point";
    if (table.dialect.grouping != '\0') text += ", marks before the thousands";
    text += ", " + open.decoded.encoding;
    if (table.preamble_lines > 0)
        text +=
            fmt::format(", {} preamble line{}", table.preamble_lines, table.preamble_lines == 1 ? "" : "s");
    text += table.header_lines == 0
                ? ", no header"
                : fmt::format(", {} header line{}", table.header_lines, table.header_lines == 1 ? "" : "s");
    return text;
}

void report_form(const OpenTable& open, Findings& findings) {
    if (open.table.thousands_or_decimal)
        add(findings, "decimal_comma_assumed", Severity::caution,
            "Numbers such as \"1,234\" could have a decimal comma or a comma before the thousands; a decimal "
            "comma was "
            "assumed. If they are thousands, export with points as decimal marks; frequency and damping do "
            "not change.");
    if (open.table.comma_could_be_decimal)
        add(findings, "decimal_comma_assumed", Severity::caution,
            "Each row is two whole numbers with a comma between them; they were read as one number with a "
            "decimal comma. "
            "If they are two columns, say --channel 2.");
    if (open.decoded.trailing_nuls > 0)
        add(findings, "cut_file", Severity::caution,
            fmt::format("The file ends in {}: the recorder lost power or its card was taken out too soon. "
                        "What stands before them was read.",
                        counted(open.decoded.trailing_nuls, "zero byte")));
}

const char* were(std::size_t count) {
    return count == 1 ? "was" : "were";
}

}  // namespace

void report_absences(const Rows& rows, std::size_t row_count, const Table& table, const std::string& channel,
                     Findings& findings) {
    const auto line = [&](const Absences& absences) { return table.first_line + absences.first_line; };
    const std::size_t missing = rows.empty.count + rows.not_a_number.count;
    if (missing > 0) {
        const bool empty_first =
            rows.not_a_number.count == 0 ||
            (rows.empty.count > 0 && rows.empty.first_line < rows.not_a_number.first_line);
        add(findings, "missing_values", Severity::caution,
            fmt::format("{} of {} {} no value in channel {} (first in line {}) and {} left out.", missing,
                        counted(row_count, "row"), missing == 1 ? "has" : "have", channel,
                        line(empty_first ? rows.empty : rows.not_a_number), were(missing)));
    }
    if (rows.overflow.count > 0)
        add(findings, "overflow_markers", Severity::caution,
            fmt::format("{} of channel {} {} marked as overloaded (first in line {}) and left out. Use a "
                        "larger measuring range.",
                        counted(rows.overflow.count, "row"), channel, were(rows.overflow.count),
                        line(rows.overflow)));
    if (rows.text.count > 0)
        add(findings, "text_in_channel", Severity::caution,
            fmt::format("{} text in place of a number in channel {} (first in line {}: \"{}\") and {} left "
                        "out.",
                        counted(rows.text.count, "row holds", "rows hold"), channel, line(rows.text),
                        label_text(rows.first_text, false), were(rows.text.count)));
    if (rows.unreadable_row.count > 0)
        add(findings, "unreadable_rows", rows.unreadable_row.count > 3 ? Severity::caution : Severity::note,
            fmt::format("{} (first is line {}) and {} left out.",
                        counted(rows.unreadable_row.count, "line is no row of the table",
                                "lines are no rows of the table"),
                        line(rows.unreadable_row), were(rows.unreadable_row.count)));
    if (rows.unreadable_time.count > 0)
        add(findings, "missing_time_stamps", Severity::caution,
            fmt::format("{} no readable time (first in line {}) and {} left out.",
                        counted(rows.unreadable_time.count, "row has", "rows have"),
                        line(rows.unreadable_time), were(rows.unreadable_time.count)));
}

namespace {

RowPlan plan_for(const Table& table, const TimeChoice& time, std::size_t channel,
                 const ReadOptions& options) {
    RowPlan plan;
    plan.dialect = table.dialect;
    plan.end_of_line = table.end_of_line;
    plan.value_column = channel;
    plan.time_source = options.rate_hz ? TimeSource::none : time.source;
    plan.time_column = time.column;
    plan.date_column = time.date_column;
    plan.stamp_base_ns = time.stamp_base_ns;
    return plan;
}

constexpr std::size_t least_rows = 16;

bool named_as_time(const Column& column) {
    if (column.unit) return column.unit->dimension == Dimension::time;
    return label_names_time(column.name) && !quantity_from_label(column.name);
}

// Where a column is named as the time, the cause is another than that there is none.
void refuse_useless_time(const OpenTable& open, const std::string& file) {
    const auto& columns = open.table.columns;
    const auto time = std::find_if(columns.begin(), columns.end(), named_as_time);
    if (time == columns.end() || columns.size() < 2) return;
    if (open.sample.first.size() < least_rows)
        throw InputError(Problem{file, "",
                                 fmt::format("the table has only {} of numbers; at least {} are needed",
                                             counted(open.sample.first.size(), "row"), least_rows),
                                 "Record longer, or check that the export is whole."});
    for (std::size_t i = 0; i < columns.size(); ++i)
        if (columns[i].content == ColumnContent::empty)
            throw InputError(Problem{file, "column " + column_name(open.table, i),
                                     "no row holds a number, only marks for missing values or nothing",
                                     "Check the sensor and the export of this channel."});
    if (time->content == ColumnContent::number)
        throw InputError(
            Problem{file, "column " + time->name, "the time does not go forward: it is the same in every row",
                    "Name the right time column with --time-column, or give the sampling rate with --rate "
                    "HZ."});
}

[[noreturn]] void refuse_no_clock(const OpenTable& open, const std::string& file) {
    refuse_useless_time(open, file);
    throw InputError(
        Problem{file, "", "there is no time column and nothing says how fast the recording was sampled",
                "Give the sampling rate with --rate HZ, or name the time column with --time-column."});
}

}  // namespace

double rate_without_times(const OpenTable& open, const ReadOptions& options, Recording& recording) {
    if (options.rate_hz) return *options.rate_hz;
    const auto stated = rate_in_preamble(open.table.preamble);
    if (!stated) refuse_no_clock(open, recording.origin.file);
    add(recording.findings, "rate_from_preamble", Severity::note,
        fmt::format(
            "There is no time column; the lines above the table state {:.9g} Hz (\"{}\"). Say otherwise with "
            "--rate.",
            stated->rate_hz, label_text(stated->line, open.decoded.latin1)));
    return stated->rate_hz;
}

namespace {

void start_at_zero(std::vector<double>& times) {
    const auto first = std::find_if(times.begin(), times.end(), [](double t) { return !std::isnan(t); });
    if (first == times.end()) return;
    const double zero = *first;
    for (double& t : times) t -= zero;
}

// Single rows out of order are mended later; here most of them are.
void refuse_backward_time(const std::vector<double>& times, const std::string& column,
                          const std::string& file) {
    std::size_t falls = 0, rises = 0;
    for (std::size_t i = 1; i < times.size(); ++i) {
        falls += times[i] < times[i - 1] ? 1 : 0;
        rises += times[i] > times[i - 1] ? 1 : 0;
    }
    if (falls <= rises) return;
    throw InputError(Problem{file, "column " + column, "the time runs backward from row to row",
                             "Sort the rows by time, or name the right time column with --time-column."});
}

Timed place_in_time(const OpenTable& open, const TimeChoice& time, const ReadOptions& options, Rows&& rows,
                    Recording& recording) {
    const bool timed = !options.rate_hz && time.source != TimeSource::none;
    if (!timed)
        return clock_from_rate(rate_without_times(open, options, recording), 0.0, std::move(rows.values));
    if (time.source == TimeSource::stamp && time.without_date) unwrap_midnight(rows.times);
    if (time.from_zero) start_at_zero(rows.times);
    if (time.source == TimeSource::number) scale_times(rows.times, time.seconds_per_unit);
    refuse_backward_time(rows.times, column_name(open.table, time.column), recording.origin.file);
    return clock_from_stamps(std::move(rows.times), std::move(rows.values), time.rounding_s);
}

// Why rows have no usable value, the commonest cause first. Empty where no row lacks one.
struct Loss {
    std::string cause, remedy;
};

Loss commonest_loss(const Rows& rows, std::size_t first_line) {
    const struct {
        const Absences* absences;
        const char* what;
        const char* remedy;
    } kinds[] = {
        {&rows.overflow, "marked as overloaded or beyond 9e37", "Use a larger measuring range"},
        {&rows.text, "text", "Export numbers in this channel"},
        {&rows.not_a_number, "marked as missing", "Check the sensor and the export of this channel"},
        {&rows.empty, "empty", "Check the sensor and the export of this channel"},
        {&rows.unreadable_time, "without a readable time", "Check the time column (--time-column)"},
    };
    const auto* most = std::max_element(std::begin(kinds), std::end(kinds), [](const auto& a, const auto& b) {
        return a.absences->count < b.absences->count;
    });
    if (most->absences->count == 0) return {};
    return {fmt::format("{} are {} (first in line {})", most->absences->count, most->what,
                        first_line + most->absences->first_line),
            most->remedy};
}

void refuse_short(const Recording& recording, std::size_t rows, const Loss& loss) {
    if (recording.samples.size() >= least_rows) return;
    const std::string found = fmt::format("only {} found in {}; at least {} are needed",
                                          counted(recording.samples.size(), "usable value") +
                                              (recording.samples.size() == 1 ? " was" : " were"),
                                          counted(rows, "row"), least_rows);
    const bool few_rows = rows < least_rows || loss.cause.empty();
    throw InputError(Problem{recording.origin.file, fmt::format("channel {}", recording.origin.channel),
                             few_rows ? found : found + ". Of the rows " + loss.cause,
                             (few_rows ? std::string("Record longer") : loss.remedy) +
                                 ", or check that the right channel was chosen (--channel)."});
}

void refuse_stopped_clock(const Recording& recording) {
    const bool stands = recording.samples.size() >= 2 && !(recording.duration_s() > 0.0);
    const bool endless = !std::isfinite(recording.duration_s());
    if (!stands && !endless && std::isfinite(recording.clock.sample_rate_hz)) return;
    throw InputError(Problem{
        recording.origin.file, "time column",
        endless ? "the times lie further apart than a number can say" : "the time does not go forward",
        "Name the right time column with --time-column, or give the sampling rate with --rate HZ."});
}

}  // namespace

ChosenTable choose_columns(std::string_view bytes, const ReadOptions& options, Recording& recording) {
    const std::string& file = recording.origin.file;
    ChosenTable chosen{open_table(bytes, options, file), {}, {}, {}};
    const OpenTable& open = chosen.open;
    report_form(open, recording.findings);
    chosen.time = choose_time(open.table, open.sample, options);
    append(recording.findings, chosen.time.findings);
    if (!options.rate_hz && chosen.time.source == TimeSource::none && !rate_in_preamble(open.table.preamble))
        refuse_no_clock(open, file);
    chosen.signal = choose_signal(open.table, open.rows(), chosen.time, options, file);
    append(recording.findings, chosen.signal.findings);
    recording.origin.channel = column_name(open.table, chosen.signal.column);
    chosen.plan = plan_for(open.table, chosen.time, chosen.signal.column, options);
    return chosen;
}

ChannelScale scale_of(const ChosenTable& chosen, const ReadOptions& options) {
    const Column& column = chosen.open.table.columns[chosen.signal.column];
    return scale_channel({column.name, column.unit_text, column.unit}, options);
}

void take_scale(const ChannelScale& scale, Recording& recording) {
    recording.unit = scale.unit;
    recording.scaled = scale.scaled;
    recording.quantity = scale.quantity;
    recording.quantity_known = scale.quantity_known;
    append(recording.findings, scale.findings);
}

void read_csv(std::string_view bytes, const ReadOptions& options, Recording& recording) {
    const ChosenTable chosen = choose_columns(bytes, options, recording);
    const OpenTable& open = chosen.open;
    const TimeChoice& time = chosen.time;
    const RowPlan& plan = chosen.plan;
    const unsigned threads = threads_for(0);
    std::optional<SteadyRows> steady;
    if (!time.from_zero)
        steady = read_steady_rows(open.rows(), plan, time.seconds_per_unit, time.rounding_s, threads,
                                  options.progress);
    Rows rows = steady ? std::move(steady->rows) : read_rows(open.rows(), plan, threads, options.progress);
    const std::size_t row_count = rows.values.size();
    report_absences(rows, row_count, open.table, recording.origin.channel, recording.findings);
    const Loss loss = commonest_loss(rows, open.table.first_line);
    Timed timed = steady ? on_clock(std::move(steady->clock), std::move(rows.values))
                         : place_in_time(open, time, options, std::move(rows), recording);
    append(recording.findings, timed.findings);
    recording.samples = std::move(timed.values);
    recording.clock = std::move(timed.clock);
    recording.gaps = std::move(timed.gaps);
    refuse_short(recording, row_count, loss);
    refuse_stopped_clock(recording);

    const ChannelScale scale = scale_of(chosen, options);
    if (scale.factor != 1.0)
        for (double& sample : recording.samples) sample *= scale.factor;
    take_scale(scale, recording);
}

namespace {

/// Bytes of a table whose columns are read as a whole.
constexpr std::size_t longest_column_held = std::size_t{1} << 24;

void add_value(double value, ChannelSummary& summary, double& sum) {
    if (std::isnan(value)) {
        ++summary.missing;
        return;
    }
    const bool first = summary.values++ == 0;
    sum += value;
    summary.minimum = first ? value : std::min(summary.minimum, value);
    summary.maximum = first ? value : std::max(summary.maximum, value);
}

/// Hands on the rows of a long table part by part.
void for_each_part(const OpenTable& open, const RowPlan& plan, unsigned threads,
                   const std::function<void(const Rows&)>& take) {
    for (const std::string_view part : pieces_of(open.rows(), longest_column_held, open.table.end_of_line))
        take(read_rows(part, plan, threads));
}

ChannelSummary summarise_column(const OpenTable& open, const TimeChoice& time, std::size_t i) {
    const Column& column = open.table.columns[i];
    ChannelSummary summary;
    summary.name = column_name(open.table, i);
    summary.unit = column.unit_text;
    const bool is_time =
        std::find(time.not_signal.begin(), time.not_signal.end(), i) != time.not_signal.end() ||
        (time.source != TimeSource::none && (i == time.column)) ||
        (time.source == TimeSource::date_and_time && i == time.date_column);
    summary.role = is_time                                   ? "time"
                   : column.content == ColumnContent::number ? "signal"
                   : column.content == ColumnContent::empty  ? "empty"
                                                             : "text";
    if (column.content != ColumnContent::number) return summary;
    const RowPlan plan = plan_for(open.table, TimeChoice{}, i, ReadOptions{});
    double sum = 0.0;
    const auto add_all = [&](const Rows& rows) {
        for (const double value : rows.values) add_value(value, summary, sum);
    };
    const unsigned threads = threads_for(0);
    if (open.rows().size() <= longest_column_held)
        add_all(read_rows(open.rows(), plan, threads));
    else
        for_each_part(open, plan, threads, add_all);
    if (summary.values > 0) summary.mean = sum / static_cast<double>(summary.values);
    return summary;
}

}  // namespace

void summarise_csv(std::string_view bytes, const ReadOptions& options, FileSummary& summary) {
    const OpenTable open = open_table(bytes, options, summary.file);
    summary.format = "CSV";
    summary.dialect = dialect_text(open);
    report_form(open, summary.findings);
    const TimeChoice time = choose_time(open.table, open.sample, options);
    append(summary.findings, time.findings);
    for (std::size_t i = 0; i < open.table.columns.size(); ++i)
        summary.channels.push_back(summarise_column(open, time, i));
}

}  // namespace ringwright
