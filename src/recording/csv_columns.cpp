#include "recording/csv_columns.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <numeric>

#include "recording/quantity_words.hpp"
#include "recording/signal_clarity.hpp"
#include "ringwright/error.hpp"

namespace ringwright {
namespace {

constexpr std::size_t sampled_rows = 96;
using Cells = std::vector<std::string_view>;

void add(Findings& findings, const char* code, Severity severity, std::string message) {
    findings.push_back(Finding{code, severity, std::move(message)});
}

std::vector<Cells> rows_from(std::string_view text, const Table& table) {
    std::vector<Cells> rows;
    LineReader reader(text, table.end_of_line);
    std::string_view line;
    while (rows.size() < sampled_rows && reader.next(line)) {
        if (line.find_first_not_of(" \t") == std::string_view::npos || line.size() > (std::size_t{1} << 20))
            continue;
        rows.emplace_back();
        split_cells(line, table.dialect.delimiter, rows.back());
    }
    return rows;
}

std::size_t next_line_start(std::string_view text, std::size_t at, char end_of_line) {
    const std::size_t end = text.find(end_of_line, at);
    return end == std::string_view::npos ? text.size() : end + 1;
}

// The column with this name or 1-based number.
std::optional<std::size_t> column_named(const Table& table, const std::string& wanted) {
    const std::string name = folded(wanted);
    for (std::size_t i = 0; i < table.columns.size(); ++i)
        if (!table.columns[i].name.empty() && table.columns[i].name == wanted) return i;
    for (std::size_t i = 0; i < table.columns.size(); ++i)
        if (!table.columns[i].name.empty() && folded(table.columns[i].name) == name) return i;
    if (wanted.empty() || wanted.size() > 6 || wanted.find_first_not_of("0123456789") != std::string::npos)
        return std::nullopt;
    const std::size_t number = std::stoul(wanted);
    if (number < 1 || number > table.columns.size()) return std::nullopt;
    return number - 1;
}

std::string list_of_columns(const Table& table) {
    std::string list;
    for (std::size_t i = 0; i < std::min<std::size_t>(table.columns.size(), 12); ++i) {
        if (i > 0) list += ", ";
        list += fmt::format("{}", i + 1);
        if (!table.columns[i].name.empty()) list += " \"" + table.columns[i].name + "\"";
    }
    if (table.columns.size() > 12) list += fmt::format(" … {}", table.columns.size());
    return list;
}

std::size_t required_column(const Table& table, const std::string& wanted, const char* option) {
    if (const auto column = column_named(table, wanted)) return *column;
    throw UsageError(Problem{option, "", "\"" + wanted.substr(0, 80) + "\" is no column of the recording",
                             "The columns are: " + list_of_columns(table) + "."});
}

// The numbers in a column of some rows.
std::vector<double> numbers_in(const std::vector<Cells>& rows, std::size_t column, const Dialect& dialect) {
    std::vector<double> numbers;
    for (const Cells& cells : rows)
        if (column < cells.size())
            if (const auto number = number_in_cell(cells[column], dialect)) numbers.push_back(*number);
    return numbers;
}

struct Course {
    bool rises = false;   // never falls, and mostly goes forward
    bool even = false;    // in steps of about one size
    bool counts = false;  // in whole steps of one
    double step = 0.0;    // median
    double first = 0.0;
};

Course course_of(const std::vector<double>& values) {
    Course course;
    if (values.size() < 3) return course;
    std::vector<double> steps;
    std::size_t falls = 0, stands = 0;
    for (std::size_t i = 1; i < values.size(); ++i) {
        const double step = values[i] - values[i - 1];
        if (step < 0.0) ++falls;
        if (step == 0.0) ++stands;
        if (step > 0.0) steps.push_back(step);
    }
    if (steps.empty()) return course;
    course.first = values.front();
    course.rises = falls * 50 <= values.size() && values.back() > values.front();
    std::nth_element(steps.begin(), steps.begin() + static_cast<std::ptrdiff_t>(steps.size() / 2),
                     steps.end());
    course.step = steps[steps.size() / 2];
    const auto usual = std::count_if(
        steps.begin(), steps.end(), [&](double s) { return s < 3.0 * course.step && s > course.step / 3.0; });
    course.even = static_cast<std::size_t>(usual) * 10 >= steps.size() * 8 && stands * 2 <= values.size();
    course.counts = course.step == 1.0 && usual == static_cast<std::ptrdiff_t>(steps.size()) && stands == 0 &&
                    std::floor(course.first) == course.first;
    return course;
}

bool runs_like_a_clock(const Table& table, const RowSample& sample, std::size_t column) {
    for (const auto* rows : {&sample.first, &sample.middle, &sample.last}) {
        if (rows->size() < 3) continue;
        const Course course = course_of(numbers_in(*rows, column, table.dialect));
        if (!course.rises || !course.even) return false;
    }
    const auto start = numbers_in(sample.first, column, table.dialect);
    const auto end = numbers_in(sample.last, column, table.dialect);
    return start.size() >= 3 && (end.empty() || end.back() > start.front());
}

bool varies(const Table& table, const RowSample& sample, std::size_t column) {
    const auto values = numbers_in(sample.first, column, table.dialect);
    return values.size() >= 2 &&
           std::any_of(values.begin(), values.end(), [&](double v) { return v != values.front(); });
}

class TimeChooser {
  public:
    TimeChooser(const Table& table, const RowSample& sample, const ReadOptions& options)
        : table_(table), sample_(sample), options_(options) {}

    TimeChoice choose() {
        mark_other_times();
        if (options_.time_column)
            choose_named();
        else
            choose_alone();
        mark_counters();
        if (choice_.source == TimeSource::number) number_unit();
        if (choice_.source == TimeSource::stamp || choice_.source == TimeSource::date_and_time) stamp_base();
        return std::move(choice_);
    }

  private:
    [[nodiscard]] const Column& column(std::size_t i) const { return table_.columns[i]; }
    [[nodiscard]] std::size_t count() const { return table_.columns.size(); }
    [[nodiscard]] bool is_number(std::size_t i) const { return column(i).content == ColumnContent::number; }
    [[nodiscard]] std::size_t number_columns() const {
        std::size_t numbers = 0;
        for (std::size_t i = 0; i < count(); ++i) numbers += is_number(i) ? 1 : 0;
        return numbers;
    }

    // Times and running numbers are no signals, whichever of them becomes the clock.
    void mark_other_times() {
        for (std::size_t i = 0; i < count(); ++i) {
            const bool time_unit = column(i).unit && column(i).unit->dimension == Dimension::time;
            const bool motion = (column(i).unit && !time_unit) || quantity_from_label(column(i).name);
            const bool counter = label_names_counter(column(i).name) && runs_like_a_clock(table_, sample_, i);
            if (time_unit || (!motion && (label_names_time(column(i).name) || counter)))
                choice_.not_signal.push_back(i);
        }
    }

    [[nodiscard]] bool is_not_signal(std::size_t i) const {
        return std::find(choice_.not_signal.begin(), choice_.not_signal.end(), i) != choice_.not_signal.end();
    }

    // A nameless column that goes up by one from row to row, where others are left to be the signal.
    void mark_counters() {
        std::vector<std::size_t> counters;
        std::size_t left = 0;
        for (std::size_t i = 0; i < count(); ++i) {
            if (!is_number(i) || is_not_signal(i)) continue;
            ++left;
            if (column(i).unit || quantity_from_label(column(i).name)) continue;
            const bool counts = course_of(numbers_in(sample_.first, i, table_.dialect)).counts &&
                                course_of(numbers_in(sample_.last, i, table_.dialect)).counts;
            if (counts && runs_like_a_clock(table_, sample_, i)) counters.push_back(i);
        }
        if (counters.size() < left)
            choice_.not_signal.insert(choice_.not_signal.end(), counters.begin(), counters.end());
    }

    void take_number(std::size_t i) {
        choice_.source = TimeSource::number;
        choice_.column = i;
        choice_.not_signal.push_back(i);
    }

    void choose_named() {
        if (folded(*options_.time_column) == "none") return;
        const std::size_t i = required_column(table_, *options_.time_column, "--time-column");
        choice_.not_signal.push_back(i);
        if (column(i).content == ColumnContent::stamp)
            take_stamp(i);
        else
            take_number(i);
    }

    void choose_alone() {
        for (std::size_t i = 0; i < count(); ++i)
            if (is_number(i) && column(i).unit && column(i).unit->dimension == Dimension::time &&
                varies(table_, sample_, i))
                return take_number(i);
        for (std::size_t i = 0; i < count(); ++i)
            if (is_number(i) && !column(i).unit && label_names_time(column(i).name) && number_columns() > 1 &&
                varies(table_, sample_, i) && !quantity_from_label(column(i).name))
                return take_number(i);
        for (std::size_t i = 0; i < count(); ++i)
            if (column(i).content == ColumnContent::stamp && stamp_of(i) && stamp_of(i)->has_time)
                return take_stamp(i);
        choose_by_course();
    }

    // No header says it: the first column that runs like a clock.
    void choose_by_course() {
        if (number_columns() < 2) return;
        std::vector<std::size_t> clocks;
        for (std::size_t i = 0; i < count(); ++i) {
            const bool named =
                quantity_from_label(column(i).name) || column(i).unit || label_names_counter(column(i).name);
            if (is_number(i) && !named && runs_like_a_clock(table_, sample_, i)) clocks.push_back(i);
        }
        if (clocks.empty() || (clocks.front() != 0 && !column(clocks.front()).name.empty())) return;
        std::size_t chosen = clocks.front();
        const Course course = course_of(numbers_in(sample_.first, chosen, table_.dialect));
        if (course.counts && clocks.size() > 1 && clocks[1] == chosen + 1) {
            choice_.not_signal.push_back(chosen);  // a running number, then the time
            chosen = clocks[1];
        }
        take_number(chosen);
        add(choice_.findings, "time_column_assumed", Severity::note,
            fmt::format(
                "No header says which column is the time; column {} rises in even steps and was taken. Say "
                "otherwise with --time-column.",
                chosen + 1));
    }

    [[nodiscard]] std::optional<ClockStamp> stamp_of(std::size_t i) const {
        for (const Cells& cells : sample_.first)
            if (i < cells.size())
                if (const auto stamp = stamp_in_cell(cells[i])) return stamp;
        return std::nullopt;
    }

    void take_stamp(std::size_t i) {
        choice_.source = TimeSource::stamp;
        choice_.column = i;
        const auto stamp = stamp_of(i);
        choice_.without_date = stamp && !stamp->has_date;
        choice_.from_zero = true;
        if (!choice_.without_date) return;
        for (std::size_t j = 0; j < count(); ++j) {
            const auto date = j == i ? std::nullopt : stamp_of(j);
            if (column(j).content != ColumnContent::stamp || !date || !date->has_date || date->has_time)
                continue;
            choice_.source = TimeSource::date_and_time;
            choice_.date_column = j;
            choice_.without_date = false;
            return;
        }
    }

    void stamp_base() {
        int decimals = 0;
        for (const auto* rows : {&sample_.first, &sample_.last})
            for (const Cells& cells : *rows)
                if (choice_.column < cells.size())
                    if (const auto stamp = stamp_in_cell(cells[choice_.column]))
                        decimals = std::max(decimals, stamp->decimals);
        choice_.rounding_s = std::pow(10.0, -decimals);
        if (const auto stamp = stamp_of(choice_.column); stamp && !choice_.without_date)
            choice_.stamp_base_ns = stamp->nanoseconds;
        if (choice_.source == TimeSource::date_and_time)
            choice_.stamp_base_ns += stamp_of(choice_.date_column)->nanoseconds;
    }

    void number_unit() {
        const auto& unit = column(choice_.column).unit;
        const auto values = numbers_in(sample_.first, choice_.column, table_.dialect);
        const int decimals = decimals_of_times();
        if (unit && unit->dimension == Dimension::time)
            choice_.seconds_per_unit = unit->si_factor;
        else if (!options_.rate_hz)
            guess_unit(course_of(values));
        choice_.rounding_s = decimals <= -18 ? 0.0 : std::pow(10.0, -decimals) * choice_.seconds_per_unit;
    }

    // Fixed notation: the most decimals seen, since trailing zeros may be cut. With exponents the digits are
    // counted from the front, so that the largest times have the fewest decimals. -18 when there is no time.
    [[nodiscard]] int decimals_of_times() const {
        int fixed = -18, scientific = 30;
        bool exponents = false;
        for (const auto* rows : {&sample_.first, &sample_.middle, &sample_.last})
            for (const Cells& cells : *rows) {
                if (choice_.column >= cells.size()) continue;
                const std::string_view cell = cells[choice_.column];
                if (!number_in_cell(cell, table_.dialect)) continue;
                const int decimals = decimals_in_cell(cell, table_.dialect.decimal);
                fixed = std::max(fixed, decimals);
                if (cell.find_first_of("eE") == std::string_view::npos) continue;
                exponents = true;
                scientific = std::min(scientific, decimals);
            }
        return exponents ? scientific : fixed;
    }

    void assume(double seconds, const char* name, Severity severity, double step) {
        choice_.seconds_per_unit = seconds;
        add(choice_.findings, "time_unit_assumed", severity,
            fmt::format(
                "The time column names no unit; {} are assumed, which makes the sampling rate {:.6g} Hz. Say "
                "otherwise with --rate.",
                name, 1.0 / (step * seconds)));
    }

    // Without a unit: counts since 1970 are told by their size. Otherwise seconds, unless that makes the
    // sampling slower than bench recorders sample (20 Hz; 10 Hz where a header calls the column a time), then
    // the next smaller unit that does not. Common practice, no source.
    void guess_unit(const Course& course) {
        if (!(course.step > 0.0)) return;
        const double since_1970[] = {1e9, 1e12, 1e15, 1e18};
        const char* names[] = {"seconds", "milliseconds", "microseconds", "nanoseconds"};
        for (int i = 0; i < 4; ++i) {
            const double scale = std::pow(1000.0, -i);
            if (course.first < since_1970[i] || course.first >= 4.2 * since_1970[i]) continue;
            choice_.from_zero = true;
            return assume(scale, names[i], Severity::note, course.step);
        }
        const double slowest = label_names_time(column(choice_.column).name) ? 0.1 : 0.05;
        if (course.step <= slowest * (1.0 + 1e-6)) return assume(1.0, "seconds", Severity::note, course.step);
        if (course.step <= 50.0) return assume(1e-3, "milliseconds", Severity::caution, course.step);
        if (course.step <= 5e4) return assume(1e-6, "microseconds", Severity::caution, course.step);
        assume(1e-9, "nanoseconds", Severity::caution, course.step);
    }

    const Table& table_;
    const RowSample& sample_;
    const ReadOptions& options_;
    TimeChoice choice_;
};

bool measures_motion(const Column& column) {
    if (column.unit && quantity_from_dimension(column.unit->dimension)) return true;
    return quantity_from_label(column.name).has_value();
}

// Samples of a column from places all over the rows, whole where that is not too much to read.
ChannelMerit merit_of_column(const Table& table, std::string_view rows, std::size_t column,
                             std::size_t budget) {
    RowPlan plan;
    plan.dialect = table.dialect;
    plan.end_of_line = table.end_of_line;
    plan.value_column = column;
    if (rows.size() <= budget) return merit_of(read_rows(rows, plan, 1).values);
    constexpr std::size_t places = 32;
    std::vector<double> values;
    for (std::size_t i = 0; i < places; ++i) {
        const std::size_t begin = next_line_start(rows, rows.size() / places * i, table.end_of_line);
        const std::size_t end =
            next_line_start(rows, std::min(begin + budget / places, rows.size()), table.end_of_line);
        const Rows part = read_rows(rows.substr(begin, end - begin), plan, 1);
        values.insert(values.end(), part.values.begin(), part.values.end());
    }
    return merit_of(values);
}

class SignalChooser {
  public:
    SignalChooser(const Table& table, std::string_view rows, const TimeChoice& time)
        : table_(table), rows_(rows) {
        for (std::size_t i = 0; i < table.columns.size(); ++i) {
            const bool excluded =
                std::find(time.not_signal.begin(), time.not_signal.end(), i) != time.not_signal.end();
            if (!excluded && table.columns[i].content == ColumnContent::number) candidates_.push_back(i);
        }
    }

    [[nodiscard]] const std::vector<std::size_t>& candidates() const { return candidates_; }

    SignalChoice choose() {
        std::vector<std::size_t> moving;
        for (const std::size_t i : candidates_)
            if (measures_motion(table_.columns[i])) moving.push_back(i);
        SignalChoice choice;
        if (candidates_.size() == 1) {
            choice.column = candidates_.front();
            return choice;
        }
        const bool by_motion = moving.size() == 1;
        choice.column = by_motion ? moving.front() : clearest(moving.empty() ? candidates_ : moving);
        report(choice, by_motion ? "it is the only one that measures motion" : "its signal is the clearest",
               by_motion);
        return choice;
    }

  private:
    [[nodiscard]] std::size_t clearest(const std::vector<std::size_t>& among) const {
        constexpr std::size_t whole_budget = std::size_t{48} << 20;
        const std::size_t budget = std::max<std::size_t>(whole_budget / among.size(), std::size_t{64} << 10);
        std::vector<ChannelMerit> merits;
        for (const std::size_t i : among) merits.push_back(merit_of_column(table_, rows_, i, budget));
        const std::string& unit = table_.columns[among.front()].unit_text;
        const bool one_unit = std::all_of(among.begin(), among.end(),
                                          [&](std::size_t i) { return table_.columns[i].unit_text == unit; });
        return among[best_channel(merits, one_unit)];
    }

    void report(SignalChoice& choice, const char* reason, bool certain) const {
        std::string others;
        std::size_t named = 0;
        for (const std::size_t i : candidates_) {
            if (i == choice.column || named++ >= 6) continue;
            others += (others.empty() ? "" : ", ") + column_name(table_, i);
        }
        if (named > 6) others += fmt::format(" and {} more", named - 6);
        add(choice.findings, "channel_chosen", certain ? Severity::note : Severity::caution,
            fmt::format(
                "Of {} channels {} was taken because {}; the others are {}. Say otherwise with --channel.",
                candidates_.size(), column_name(table_, choice.column), reason, others));
    }

    const Table& table_;
    std::string_view rows_;
    std::vector<std::size_t> candidates_;
};

}  // namespace

RowSample sample_rows(std::string_view rows, const Table& table) {
    RowSample sample;
    sample.first = rows_from(rows, table);
    sample.middle = rows_from(rows.substr(next_line_start(rows, rows.size() / 2, table.end_of_line)), table);
    std::size_t row_bytes = 64;
    if (!sample.first.empty() && !sample.first.front().empty()) {
        const auto& cells = sample.first.front();
        row_bytes =
            static_cast<std::size_t>(cells.back().data() + cells.back().size() - cells.front().data()) + 4;
    }
    const std::size_t back = std::min(rows.size(), row_bytes * 64);
    sample.last = rows_from(rows.substr(next_line_start(rows, rows.size() - back, table.end_of_line)), table);
    return sample;
}

TimeChoice choose_time(const Table& table, const RowSample& sample, const ReadOptions& options) {
    return TimeChooser(table, sample, options).choose();
}

SignalChoice choose_signal(const Table& table, std::string_view rows, const TimeChoice& time,
                           const ReadOptions& options, const std::string& file) {
    if (options.channel) {
        SignalChoice choice;
        choice.column = required_column(table, *options.channel, "--channel");
        if (table.columns[choice.column].content == ColumnContent::text)
            throw InputError(Problem{file, "column " + column_name(table, choice.column),
                                     "the column holds text, no numbers",
                                     "Choose another with --channel: " + list_of_columns(table) + "."});
        return choice;
    }
    SignalChooser chooser(table, rows, time);
    if (chooser.candidates().empty())
        throw InputError(
            Problem{file, "", "there is no column with a signal beside the time",
                    "Export the measured values too, or name the columns with --channel and --time-column."});
    return chooser.choose();
}

std::string column_name(const Table& table, std::size_t column) {
    if (column < table.columns.size() && !table.columns[column].name.empty())
        return table.columns[column].name;
    return std::to_string(column + 1);
}

}  // namespace ringwright
