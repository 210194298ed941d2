#include "recording/csv_rows.hpp"

#include <fast_float/fast_float.h>

#include <algorithm>
#include <atomic>
#include <cmath>
#include <cstring>
#include <limits>
#include <thread>

namespace ringwright {
namespace {

constexpr double missing = std::numeric_limits<double>::quiet_NaN();

const char* find_byte(const char* first, const char* last, char byte) {
    const void* found = std::memchr(first, byte, static_cast<std::size_t>(last - first));
    return found == nullptr ? last : static_cast<const char*>(found);
}

// Which cell of a row goes where, in the order of the columns.
struct Wanted {
    std::size_t column;
    enum { value, time, date } what;
};

class ChunkReader {
  public:
    ChunkReader(std::string_view text, const RowPlan& plan)
        : plan_(plan), at_(text.data()), end_(text.data() + text.size()) {
        wanted_.push_back({plan.value_column, Wanted::value});
        if (plan.time_source != TimeSource::none) wanted_.push_back({plan.time_column, Wanted::time});
        if (plan.time_source == TimeSource::date_and_time)
            wanted_.push_back({plan.date_column, Wanted::date});
        std::sort(wanted_.begin(), wanted_.end(),
                  [](const Wanted& a, const Wanted& b) { return a.column < b.column; });
        options_ = fast_float::parse_options(fast_float::chars_format::general, plan.dialect.decimal);
        blanks_ = plan.dialect.delimiter == ' ';
    }

    Rows read() {
        reserve();
        while (at_ < end_) {
            read_row();
            ++rows_.lines;
        }
        return std::move(rows_);
    }

  private:
    // From the length of the first row: an estimate bounded by the bytes that are there.
    void reserve() {
        const char* first_end = find_byte(at_, end_, plan_.end_of_line);
        const auto length = static_cast<std::size_t>(first_end - at_) + 1;
        const std::size_t rows = static_cast<std::size_t>(end_ - at_) / std::max<std::size_t>(length, 4) + 16;
        rows_.values.reserve(rows);
        if (plan_.time_source != TimeSource::none) rows_.times.reserve(rows);
    }

    void read_row() {
        skip_blanks();
        if (at_ == end_ || *at_ == plan_.end_of_line || *at_ == '\r') return skip_line();
        time_ = value_ = missing;
        time_ns_ = date_ns_ = 0;
        time_seen_ = date_seen_ = false;
        absence_ = Absence::empty;
        cell_done_ = false;
        std::size_t column = 0;
        for (const Wanted& wanted : wanted_) {
            if (!advance_to(column, wanted.column)) break;
            read_wanted(wanted);
        }
        skip_line();
        store();
    }

    void read_wanted(const Wanted& wanted) {
        cell_done_ = true;
        if (wanted.what == Wanted::value)
            read_value();
        else if (plan_.time_source == TimeSource::number)
            read_number_time();
        else
            read_stamp(wanted.what == Wanted::date);
    }

    void skip_blanks() {
        while (at_ < end_ && (*at_ == ' ' || (*at_ == '\t' && plan_.dialect.delimiter != '\t'))) ++at_;
    }
    void skip_line() {
        at_ = find_byte(at_, end_, plan_.end_of_line);
        if (at_ < end_) ++at_;
    }
    [[nodiscard]] bool at_row_end() const { return at_ == end_ || *at_ == plan_.end_of_line; }
    [[nodiscard]] bool at_cell_end() const {
        return at_row_end() || *at_ == plan_.dialect.delimiter || (blanks_ && *at_ == '\t') || *at_ == '\r';
    }

    // Moves to the start of the cell of column `target`; false when the row ends before.
    bool advance_to(std::size_t& column, std::size_t target) {
        while (column < target) {
            if (!cell_done_) pass_cell();
            cell_done_ = false;
            if (at_row_end()) return false;
            ++at_;
            if (blanks_) skip_blanks();
            ++column;
        }
        return true;
    }

    void pass_cell() {
        skip_blanks();
        if (at_ < end_ && *at_ == '"') {
            const char* row_end = find_byte(at_, end_, plan_.end_of_line);
            const char* close = find_byte(at_ + 1, row_end, '"');
            if (close < row_end) at_ = close + 1;
        }
        if (blanks_)
            while (!at_cell_end()) ++at_;
        else
            while (!at_row_end() && *at_ != plan_.dialect.delimiter) ++at_;
    }

    // The quick way: a plain number that is the whole cell. Leaves at_ at the end of the cell.
    bool quick_number(double& value) {
        skip_blanks();
        if (at_ == end_) return false;
        const char* first = *at_ == '+' ? at_ + 1 : at_;
        const auto result = fast_float::from_chars_advanced(first, end_, value, options_);
        if (result.ec != std::errc() || !std::isfinite(value)) return false;
        const char* start = at_;
        at_ = result.ptr;
        if (!blanks_) skip_blanks();
        if (at_cell_end()) return true;
        at_ = start;
        return false;
    }

    std::string_view slow_cell() {
        const char* first = at_;
        pass_cell();
        std::string_view cell = trimmed_cell({first, static_cast<std::size_t>(at_ - first)});
        if (cell.size() >= 2 && cell.front() == '"' && cell.back() == '"')
            cell = trimmed_cell(cell.substr(1, cell.size() - 2));
        return cell;
    }

    void read_value() {
        if (quick_number(value_)) {
            if (!is_overload(value_)) return;
            value_ = missing;
            absence_ = Absence::overflow;
            return;
        }
        const std::string_view cell = slow_cell();
        if (const auto number = number_in_cell(cell, plan_.dialect)) {
            value_ = *number;
            return;
        }
        value_ = missing;
        absence_ = absence_of(cell);
        if (absence_ == Absence::text && rows_.first_text.empty())
            rows_.first_text = std::string(cell.substr(0, 40));
    }

    void read_number_time() {
        if (quick_number(time_)) return;
        const auto number = number_in_cell(slow_cell(), plan_.dialect);
        time_ = number.value_or(missing);
    }

    void read_stamp(bool date) {
        const auto stamp = stamp_in_cell(slow_cell());
        if (!stamp) return;
        (date ? date_ns_ : time_ns_) = stamp->nanoseconds;
        (date ? date_seen_ : time_seen_) = true;
    }

    void finish_stamp() {
        const bool both = plan_.time_source == TimeSource::date_and_time;
        if (!time_seen_ || (both && !date_seen_)) return;
        const std::int64_t ns = time_ns_ + date_ns_ - plan_.stamp_base_ns;
        time_ = static_cast<double>(ns) * 1e-9;
    }

    void store() {
        const bool timed = plan_.time_source != TimeSource::none;
        if (timed && plan_.time_source != TimeSource::number) finish_stamp();
        const bool no_value = std::isnan(value_);
        const bool stray = timed ? std::isnan(time_) : absence_ == Absence::text;
        if (no_value && stray) {
            rows_.unreadable_row.add(rows_.lines);
            return;
        }
        if (no_value) count_absence();
        if (timed && std::isnan(time_)) rows_.unreadable_time.add(rows_.lines);
        rows_.values.push_back(value_);
        if (timed) rows_.times.push_back(time_);
    }

    void count_absence() {
        Absences& kind = absence_ == Absence::empty          ? rows_.empty
                         : absence_ == Absence::not_a_number ? rows_.not_a_number
                         : absence_ == Absence::overflow     ? rows_.overflow
                                                             : rows_.text;
        kind.add(rows_.lines);
    }

    const RowPlan& plan_;
    const char* at_;
    const char* end_;
    std::vector<Wanted> wanted_;
    fast_float::parse_options options_;
    bool blanks_ = false;
    Rows rows_;
    double time_ = missing, value_ = missing;
    std::int64_t time_ns_ = 0, date_ns_ = 0;
    bool time_seen_ = false, date_seen_ = false;
    Absence absence_ = Absence::empty;
    bool cell_done_ = false;  // at_ stands at the end of a cell that was read
};

// Pieces of about equal size that end at the end of a line.
std::vector<std::string_view> pieces_of(std::string_view text, std::size_t size, char end_of_line) {
    std::vector<std::string_view> pieces;
    while (!text.empty()) {
        std::size_t end = text.size();
        if (size < text.size()) {
            const std::size_t line_end = text.find(end_of_line, size);
            if (line_end != std::string_view::npos) end = line_end + 1;
        }
        pieces.push_back(text.substr(0, end));
        text.remove_prefix(end);
    }
    return pieces;
}

void append(Rows& rows, Rows&& later) {
    rows.empty.merge(later.empty, rows.lines);
    rows.not_a_number.merge(later.not_a_number, rows.lines);
    rows.overflow.merge(later.overflow, rows.lines);
    rows.text.merge(later.text, rows.lines);
    rows.unreadable_time.merge(later.unreadable_time, rows.lines);
    rows.unreadable_row.merge(later.unreadable_row, rows.lines);
    if (rows.first_text.empty()) rows.first_text = std::move(later.first_text);
    rows.lines += later.lines;
    rows.times.insert(rows.times.end(), later.times.begin(), later.times.end());
    rows.values.insert(rows.values.end(), later.values.begin(), later.values.end());
}

}  // namespace

void Absences::merge(const Absences& later, std::size_t lines_before) {
    if (count == 0 && later.count > 0) first_line = later.first_line + lines_before;
    count += later.count;
}

Rows read_rows(std::string_view text, const RowPlan& plan, unsigned threads,
               const std::function<void(double)>& progress) {
    constexpr std::size_t piece_size = std::size_t{8} << 20;
    const auto pieces = pieces_of(text, piece_size, plan.end_of_line);
    if (pieces.size() <= 1) return ChunkReader(text, plan).read();
    std::vector<Rows> parts(pieces.size());
    std::atomic<std::size_t> next{0}, done{0};
    const auto work = [&](bool reports) {
        for (std::size_t i = next++; i < pieces.size(); i = next++) {
            parts[i] = ChunkReader(pieces[i], plan).read();
            const double share = static_cast<double>(++done) / static_cast<double>(pieces.size());
            if (reports && progress) progress(share);
        }
    };
    std::vector<std::jthread> workers;
    for (unsigned i = 1; i < std::min<std::size_t>(threads, pieces.size()); ++i)
        workers.emplace_back(work, false);
    work(true);
    workers.clear();
    std::size_t total = 0;
    for (const Rows& part : parts) total += part.values.size();
    Rows rows = std::move(parts.front());
    rows.values.reserve(total);
    if (plan.time_source != TimeSource::none) rows.times.reserve(total);
    for (std::size_t i = 1; i < parts.size(); ++i) {
        append(rows, std::move(parts[i]));
        parts[i] = Rows{};
    }
    return rows;
}

}  // namespace ringwright
