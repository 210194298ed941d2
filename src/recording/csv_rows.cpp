#include "recording/csv_rows.hpp"

#include <fast_float/fast_float.h>

#include <algorithm>
#include <array>
#include <atomic>
#include <cmath>
#include <cstdint>
#include <cstring>
#include <limits>

#include "recording/clock.hpp"
#include "recording/in_pieces.hpp"
#include "recording/input_bytes.hpp"
#include "ringwright/each_index.hpp"

namespace ringwright {
namespace {

constexpr double missing = std::numeric_limits<double>::quiet_NaN();

const char* find_byte(const char* first, const char* last, char byte) {
    const void* found = std::memchr(first, byte, static_cast<std::size_t>(last - first));
    return found == nullptr ? last : static_cast<const char*>(found);
}

// A decimal such as "-12.0345". Up to 2^53 its digits are a double exactly, and so are powers of ten up to
// 10^22: one division then gives the nearest double (Clinger 1990, "How to read floating point numbers
// accurately"). Reads up to the first byte that is none of the number's, so that some other byte has to
// follow. False, with `at` where it was, when it is none of these or too long for that.
bool plain_decimal(const char*& at, char decimal, double& value) {
    static constexpr std::array<double, 19> powers_of_ten = {1e0,  1e1,  1e2,  1e3,  1e4,  1e5,  1e6,
                                                             1e7,  1e8,  1e9,  1e10, 1e11, 1e12, 1e13,
                                                             1e14, 1e15, 1e16, 1e17, 1e18};
    const char* p = at;
    const bool negative = *p == '-';
    p += negative ? 1 : 0;
    const char* const first = p;
    std::uint64_t digits = 0;
    const auto take_digits = [&] {
        for (unsigned digit = 0; (digit = static_cast<unsigned>(*p) - '0') < 10; ++p)
            digits = 10 * digits + digit;
    };
    take_digits();
    std::ptrdiff_t count = p - first, places = 0;
    if (*p == decimal) {
        const char* const point = p++;
        take_digits();
        places = p - point - 1;
        count += places;
    }
    constexpr std::uint64_t exact = std::uint64_t{1} << 53U;
    if (count == 0 || count > 18 || digits > exact || (*p | 0x20) == 'e') return false;
    const double size = static_cast<double>(digits) / powers_of_ten[static_cast<std::size_t>(places)];
    value = negative ? -size : size;
    at = p;
    return true;
}

// Which cell of a row goes where, in the order of the columns.
struct Wanted {
    std::size_t column;
    enum { value, time, date } what;
};

class ChunkReader {
  public:
    ChunkReader(std::string_view text, const RowPlan& plan, Rows& rows)
        : plan_(plan), at_(text.data()), end_(text.data() + text.size()), rows_(rows) {
        wanted_.push_back({plan.value_column, Wanted::value});
        if (plan.time_source != TimeSource::none) wanted_.push_back({plan.time_column, Wanted::time});
        if (plan.time_source == TimeSource::date_and_time)
            wanted_.push_back({plan.date_column, Wanted::date});
        std::sort(wanted_.begin(), wanted_.end(),
                  [](const Wanted& a, const Wanted& b) { return a.column < b.column; });
        options_ = fast_float::parse_options(fast_float::chars_format::general, plan.dialect.decimal);
        blanks_ = plan.dialect.delimiter == ' ';
        const bool numbers = plan.time_source == TimeSource::none || plan.time_source == TimeSource::number;
        // The quick way looks for no end: the last end of line stops it.
        const std::size_t last = text.rfind(plan.end_of_line);
        quick_end_ = numbers && !blanks_ && last != std::string_view::npos ? at_ + last : at_;
    }

    void read() {
        reserve();
        while (at_ < end_) {
            if (at_ >= quick_end_ || !quick_row()) read_row();
            ++rows_.lines;
        }
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

    // A row whose wanted cells are plain decimals and nothing else. False, with nothing moved, for any other
    // row.
    bool quick_row() {
        const char delimiter = plan_.dialect.delimiter, end_of_line = plan_.end_of_line;
        const char* at = at_;
        std::size_t column = 0;
        for (const Wanted& wanted : wanted_) {
            for (; column < wanted.column; ++column, ++at)
                for (; *at != delimiter; ++at)
                    if (*at == end_of_line || *at == '"') return false;
            if (!quick_cell(at, wanted.what == Wanted::value ? value_ : time_)) return false;
        }
        if (*at == '\r' && end_of_line == '\n') ++at;
        if (*at == delimiter) at = find_byte(at, end_, end_of_line);
        if (*at != end_of_line || is_overload(value_)) return false;
        at_ = at + 1;
        rows_.values.push_back(value_);
        if (plan_.time_source != TimeSource::none) rows_.times.push_back(time_);
        return true;
    }

    // Moves to the end of the cell.
    bool quick_cell(const char*& at, double& value) const {
        while (*at == ' ') ++at;
        if (!plain_decimal(at, plan_.dialect.decimal, value)) {
            if (*at != '-' && static_cast<unsigned>(*at) - '0' > 9) return false;
            const auto result = fast_float::from_chars_advanced(at, end_, value, options_);
            if (result.ec != std::errc() || !std::isfinite(value)) return false;
            at = result.ptr;
        }
        return *at == plan_.dialect.delimiter || *at == plan_.end_of_line || *at == '\r';
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
    const char* quick_end_ = nullptr;
    std::vector<Wanted> wanted_;
    fast_float::parse_options options_;
    bool blanks_ = false;
    Rows& rows_;
    double time_ = missing, value_ = missing;
    std::int64_t time_ns_ = 0, date_ns_ = 0;
    bool time_seen_ = false, date_seen_ = false;
    Absence absence_ = Absence::empty;
    bool cell_done_ = false;  // at_ stands at the end of a cell that was read
};

}  // namespace

void merge_counts(Rows& counts, const Rows& later) {
    counts.empty.merge(later.empty, counts.lines);
    counts.not_a_number.merge(later.not_a_number, counts.lines);
    counts.overflow.merge(later.overflow, counts.lines);
    counts.text.merge(later.text, counts.lines);
    counts.unreadable_time.merge(later.unreadable_time, counts.lines);
    counts.unreadable_row.merge(later.unreadable_row, counts.lines);
    if (counts.first_text.empty()) counts.first_text = later.first_text;
    counts.lines += later.lines;
}

namespace {

void append(Rows& rows, const Rows& later) {
    merge_counts(rows, later);
    rows.times.insert(rows.times.end(), later.times.begin(), later.times.end());
    rows.values.insert(rows.values.end(), later.values.begin(), later.values.end());
}

}  // namespace

void Absences::merge(const Absences& later, std::size_t lines_before) {
    if (count == 0 && later.count > 0) first_line = later.first_line + lines_before;
    count += later.count;
}

namespace {

void forget(Rows& rows) {
    Rows fresh;
    fresh.times = std::move(rows.times);
    fresh.values = std::move(rows.values);
    fresh.times.clear();
    fresh.values.clear();
    rows = std::move(fresh);
}

// Room for all rows from what the first piece held: what is not used is never touched.
void reserve_all(Rows& rows, const Rows& first, std::size_t first_bytes, std::size_t bytes) {
    const double share =
        static_cast<double>(bytes) / static_cast<double>(std::max<std::size_t>(first_bytes, 1));
    const auto count = static_cast<std::size_t>(static_cast<double>(first.values.size()) * share * 1.05) + 64;
    rows.values.reserve(count);
    if (!first.times.empty()) rows.times.reserve(count);
}

// Lets the pieces be taken up one behind the other.
class Turns {
  public:
    // False when a piece before has failed, so that its turn never ends.
    [[nodiscard]] bool wait_for(std::size_t turn) {
        for (std::size_t now = turn_; now != turn; now = turn_) {
            if (now == abandoned) return false;
            turn_.wait(now);
        }
        return true;
    }
    void pass() {
        ++turn_;
        turn_.notify_all();
    }
    void abandon() {
        turn_ = abandoned;
        turn_.notify_all();
    }

  private:
    static constexpr std::size_t abandoned = std::numeric_limits<std::size_t>::max();
    std::atomic<std::size_t> turn_{0};
};

// What turns the times of each piece into a course, when it is hoped that they are one steady clock.
struct SteadyHope {
    double seconds_per_unit = 1.0;
    double rounding_s = 0.0;
};

// Reads the pieces of a long text on several threads and puts their rows together in order.
class ParallelReader {
  public:
    ParallelReader(std::string_view text, const RowPlan& plan, unsigned threads,
                   std::optional<SteadyHope> hope = std::nullopt)
        : text_(text), plan_(plan), threads_(threads), hope_(hope), parts_(std::max(threads, 1U)) {}

    // False when it turned out that there is no steady clock; the rows are then not whole.
    [[nodiscard]] bool read(const std::vector<std::string_view>& pieces,
                            const std::function<void(double)>& progress) {
        for_each_index(pieces.size(), threads_, [&](std::size_t i, unsigned thread) {
            if (given_up_) return;
            try {
                read_piece(pieces[i], i, parts_[thread]);
                const double done = static_cast<double>(i + 1) / static_cast<double>(pieces.size());
                if (thread == 0 && progress) progress(done);
            } catch (...) {
                turns_.abandon();
                throw;
            }
        });
        return !given_up_;
    }

    [[nodiscard]] Rows take_rows() { return std::move(rows_); }
    [[nodiscard]] const StampCourse& course() const { return course_; }

  private:
    void read_piece(std::string_view piece, std::size_t i, Rows& part) {
        forget(part);
        will_read(piece);
        ChunkReader(piece, plan_, part).read();
        was_read(piece);
        StampCourse course;
        if (hope_) course = course_without_times(part);
        if (!turns_.wait_for(i)) return;
        if (hope_ && !goes_on(course, i)) return give_up();
        if (i == 0) reserve_all(rows_, part, piece.size(), text_.size());
        append(rows_, part);
        turns_.pass();
    }

    [[nodiscard]] StampCourse course_without_times(Rows& part) const {
        scale_times(part.times, hope_->seconds_per_unit);
        StampCourse course = course_of(part.times);
        part.times.clear();
        return course;
    }

    [[nodiscard]] bool goes_on(const StampCourse& course, std::size_t i) {
        append(course_, course);
        return course_.forward && (i > 0 || steady_clock(course_, hope_->rounding_s));
    }

    void give_up() {
        given_up_ = true;
        turns_.abandon();
    }

    std::string_view text_;
    const RowPlan& plan_;
    unsigned threads_;
    std::optional<SteadyHope> hope_;
    std::vector<Rows> parts_;  // one for each thread, used again and again
    Rows rows_;
    StampCourse course_;
    Turns turns_;
    std::atomic<bool> given_up_{false};
};

// Small enough for the caches, so that the numbers are copied to their place before they have left them.
constexpr std::size_t piece_size = std::size_t{1} << 20;

}  // namespace

void read_piece(std::string_view piece, const RowPlan& plan, Rows& rows) {
    forget(rows);
    will_read(piece);
    ChunkReader(piece, plan, rows).read();
    was_read(piece);
}

Rows read_rows(std::string_view text, const RowPlan& plan, unsigned threads,
               const std::function<void(double)>& progress) {
    const auto pieces = pieces_of(text, piece_size, plan.end_of_line);
    if (pieces.size() <= 1) {
        Rows rows;
        ChunkReader(text, plan, rows).read();
        return rows;
    }
    ParallelReader reader(text, plan, threads);
    static_cast<void>(reader.read(pieces, progress));
    return reader.take_rows();
}

std::optional<SteadyRows> read_steady_rows(std::string_view text, const RowPlan& plan,
                                           double seconds_per_unit, double rounding_s, unsigned threads,
                                           const std::function<void(double)>& progress) {
    if (plan.time_source != TimeSource::number || text.size() <= piece_size) return std::nullopt;
    ParallelReader reader(text, plan, threads, SteadyHope{seconds_per_unit, rounding_s});
    if (!reader.read(pieces_of(text, piece_size, plan.end_of_line), progress)) return std::nullopt;
    auto clock = steady_clock(reader.course(), rounding_s);
    if (!clock) return std::nullopt;
    return SteadyRows{reader.take_rows(), std::move(*clock)};
}

}  // namespace ringwright
