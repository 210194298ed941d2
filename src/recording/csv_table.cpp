#include "recording/csv_table.hpp"

#include <algorithm>
#include <array>
#include <deque>
#include <unordered_set>

#include "recording/csv_header.hpp"
#include "recording/text_encoding.hpp"

namespace ringwright {
namespace {

constexpr std::size_t window_rows = 24;
constexpr std::size_t longest_row = std::size_t{1} << 20;
constexpr std::size_t header_reach = 6;
constexpr double good_share = 0.85;  // of the rows of a window that must have the form of the first

constexpr std::array<Dialect, 18> dialects = {{{'\t', '.', '\0'},
                                               {'\t', ',', '\0'},
                                               {';', '.', '\0'},
                                               {';', ',', '\0'},
                                               {',', '.', '\0'},
                                               {'|', '.', '\0'},
                                               {'|', ',', '\0'},
                                               {' ', '.', '\0'},
                                               {' ', ',', '\0'},
                                               {';', ',', '.'},
                                               {';', '.', ','},
                                               {';', ',', ' '},
                                               {'\t', ',', '.'},
                                               {'\t', '.', ','},
                                               {'\t', ',', ' '},
                                               {',', ',', '\0'},
                                               {',', '.', ','},
                                               {',', ',', '.'}}};

struct ColumnCount {
    std::size_t number = 0, stamp = 0, missing = 0, text = 0;

    void add(CellKind kind) {
        switch (kind) {
            case CellKind::number:
                ++number;
                break;
            case CellKind::stamp:
                ++stamp;
                break;
            case CellKind::missing:
                ++missing;
                break;
            case CellKind::text:
                ++text;
                break;
        }
    }
    [[nodiscard]] ColumnContent content() const {
        if (number > 0 && number >= 9 * (text + stamp)) return ColumnContent::number;
        if (stamp > 0 && stamp >= 9 * (text + number)) return ColumnContent::stamp;
        return number + stamp + text == 0 ? ColumnContent::empty : ColumnContent::text;
    }
};

// How well one dialect explains the rows of a window.
struct Trial {
    std::vector<ColumnContent> columns;
    double score = 0.0;  // share of the cells that are numbers, stamps or missing; 0 when it does not fit
    std::size_t number_columns = 0;
};

using Lines = std::vector<std::string_view>;

bool row_has_columns(const std::vector<std::string_view>& cells, std::size_t wanted) {
    if (cells.size() == wanted) return true;
    if (cells.size() == wanted + 1) return cells.back().empty();
    return cells.size() + 1 == wanted && wanted > 2;
}

// Labels of a list of settings ("Gain;1.0") all differ; words in a column of data repeat.
bool first_column_is_labels(const Lines& lines, char delimiter) {
    std::unordered_set<std::string_view> seen;
    std::vector<std::string_view> cells;
    for (const std::string_view line : lines) {
        split_cells(line, delimiter, cells);
        if (!cells.empty()) seen.insert(cells.front());
    }
    return lines.size() < 3 || seen.size() * 2 > lines.size();
}

class TrialRun {
  public:
    TrialRun(const Lines& lines, const Dialect& dialect) : lines_(lines), dialect_(dialect) {}

    Trial run() {
        split_cells(lines_.front(), dialect_.delimiter, cells_);
        width_ = cells_.size();
        if (width_ > 2 && cells_.back().empty() && dialect_.delimiter != ' ') --width_;
        if (width_ > most_columns) return {};
        counts_.resize(width_);
        std::size_t strays = 0;
        for (const std::string_view line : lines_) {
            if (!count_row(line)) ++strays;
            if (strays > allowed_strays()) return {};
        }
        return result();
    }

  private:
    [[nodiscard]] std::size_t allowed_strays() const {
        return static_cast<std::size_t>((1.0 - good_share) * static_cast<double>(lines_.size()));
    }

    bool count_row(std::string_view line) {
        split_cells(line, dialect_.delimiter, cells_);
        if (!row_has_columns(cells_, width_)) return false;
        std::size_t useful = 0;
        for (std::size_t i = 0; i < std::min(width_, cells_.size()); ++i) {
            const CellKind kind = kind_of_cell(cells_[i], dialect_);
            counts_[i].add(kind);
            if (kind == CellKind::number || kind == CellKind::stamp) ++useful;
        }
        // Rows of missing values alone are rows still, but words alone are none.
        return useful > 0 || std::all_of(cells_.begin(), cells_.end(), [](std::string_view cell) {
                   return absence_of(cell) != Absence::text;
               });
    }

    Trial result() {
        Trial trial;
        std::size_t usable = 0, all = 0;
        for (const ColumnCount& count : counts_) {
            trial.columns.push_back(count.content());
            if (trial.columns.back() == ColumnContent::number) ++trial.number_columns;
            all += count.number + count.stamp + count.missing + count.text;
            usable += count.number + count.stamp + count.missing;
        }
        if (trial.number_columns == 0) return {};
        if (!first_row_is_good(trial)) return {};
        if (trial.columns.front() == ColumnContent::text &&
            first_column_is_labels(lines_, dialect_.delimiter))
            return {};
        trial.score = static_cast<double>(usable) / static_cast<double>(all);
        return trial;
    }

    bool first_row_is_good(const Trial& trial) {
        split_cells(lines_.front(), dialect_.delimiter, cells_);
        for (std::size_t i = 0; i < width_; ++i) {
            const bool numeric =
                trial.columns[i] == ColumnContent::number || trial.columns[i] == ColumnContent::stamp;
            if (numeric && kind_of_cell(cells_[i], dialect_) == CellKind::text) return false;
        }
        return true;
    }

    const Lines& lines_;
    Dialect dialect_;
    std::vector<std::string_view> cells_;
    std::vector<ColumnCount> counts_;
    std::size_t width_ = 0;
};

struct Choice {
    Dialect dialect;
    Trial trial;
};

// A quick look at a list of settings: the first words of four rows all differ.
bool starts_with_labels(const Lines& lines, const Dialect& dialect) {
    std::vector<std::string_view> cells, seen;
    for (std::size_t i = 0; i < std::min<std::size_t>(lines.size(), 4); ++i) {
        split_cells(lines[i], dialect.delimiter, cells);
        if (cells.empty() || kind_of_cell(cells.front(), dialect) != CellKind::text) return false;
        if (std::find(seen.begin(), seen.end(), cells.front()) != seen.end()) return false;
        seen.push_back(cells.front());
    }
    return true;
}

// The dialect that explains most cells; at a tie more columns, then the one that stands first in the list.
std::optional<Choice> choose_dialect(const Lines& lines) {
    std::optional<Choice> best;
    for (const Dialect& dialect : dialects) {
        if (dialect.delimiter != ' ' && lines.front().find(dialect.delimiter) == std::string_view::npos &&
            (dialect.delimiter != ';' || dialect.grouping != '\0'))
            continue;
        if (starts_with_labels(lines, dialect)) continue;
        Trial trial = TrialRun(lines, dialect).run();
        if (trial.score <= 0.0) continue;
        const bool grouped = dialect.grouping != '\0';
        const double margin = grouped ? 1e-9 : 0.0;
        const bool better = !best || trial.score > best->trial.score + 1e-9 + margin ||
                            (trial.score > best->trial.score - 1e-9 && !grouped &&
                             trial.number_columns > best->trial.number_columns);
        if (better) best = Choice{dialect, std::move(trial)};
    }
    return best;
}

// With decimal commas: could each of them also group thousands ("1,234")?
bool could_be_thousands(const Lines& lines, const Choice& choice) {
    if (choice.dialect.decimal != ',' || choice.dialect.grouping != '\0') return false;
    const bool any_comma = std::any_of(lines.begin(), lines.end(), [](std::string_view line) {
        return line.find(',') != std::string_view::npos;
    });
    if (!any_comma || choice.dialect.delimiter == ',') return false;
    const Trial trial = TrialRun(lines, Dialect{choice.dialect.delimiter, '.', ','}).run();
    return trial.score > choice.trial.score - 1e-9 && trial.number_columns >= choice.trial.number_columns;
}

bool all_digits(std::string_view text) {
    if (!text.empty() && text.front() == '-') text.remove_prefix(1);
    return !text.empty() && text.find_first_not_of("0123456789") == std::string_view::npos;
}

// "0,0512": two whole numbers with a comma between them, or one number with a decimal comma?
struct CommaEvidence {
    bool whole_numbers = true;  // no cell holds anything but digits
    bool same_width = true;     // the second cells have one number of digits
    bool leading_zero = false;  // a second cell begins with 0 and goes on
    bool first_rises = true;    // the first cells rise from row to row
};

CommaEvidence comma_evidence(const Lines& lines) {
    CommaEvidence evidence;
    std::vector<std::string_view> cells;
    std::size_t width = 0;
    double last = -1e300;
    for (const std::string_view line : lines) {
        split_cells(line, ',', cells);
        if (cells.size() != 2 || !all_digits(cells[0]) || !all_digits(cells[1])) {
            evidence.whole_numbers = false;
            return evidence;
        }
        if (width != 0 && cells[1].size() != width) evidence.same_width = false;
        width = cells[1].size();
        if (cells[1].size() > 1 && cells[1].front() == '0') evidence.leading_zero = true;
        const double first = number_in_cell(cells[0], Dialect{}).value_or(0.0);
        if (first <= last) evidence.first_rises = false;
        last = first;
    }
    return evidence;
}

// True when the table is one column with decimal commas after all.
bool is_one_decimal_comma_column(const Lines& lines, const Choice& choice, bool& uncertain) {
    if (choice.dialect.delimiter != ',' || choice.trial.columns.size() != 2 || lines.size() < 4) return false;
    const CommaEvidence evidence = comma_evidence(lines);
    if (!evidence.whole_numbers) return false;
    const bool one_column = evidence.leading_zero || (evidence.same_width && !evidence.first_rises);
    uncertain = one_column && !evidence.leading_zero;
    return one_column;
}

bool has_digit(std::string_view line) {
    return line.find_first_of("0123456789") != std::string_view::npos;
}
bool is_blank_line(std::string_view line) {
    return line.find_first_not_of(" \t\r\f\x1A") == std::string_view::npos;
}

class TableFinder {
  public:
    TableFinder(std::string_view text, bool latin1, const TableHints& hints)
        : text_(text), latin1_(latin1), hints_(hints), reader_(text) {}

    std::optional<Table> find() {
        std::string_view line;
        for (std::size_t begin = 0; begin = reader_.offset(), reader_.next(line);) {
            ++line_number_;
            if (is_blank_line(line)) continue;
            if (has_digit(line) && line.size() <= longest_row) {
                if (auto table = table_at(begin)) return table;
            }
            remember(line);
        }
        return std::nullopt;
    }

  private:
    void remember(std::string_view line) {
        ++preamble_lines_;
        if (line.size() > longest_row) return;
        above_.push_front(line);
        if (above_.size() > header_reach) above_.pop_back();
    }

    std::optional<Table> table_at(std::size_t begin) {
        const Lines lines = window(begin);
        auto choice = choose_dialect(lines);
        if (!choice) return std::nullopt;
        Table table;
        if (hints_.least_columns < 2 &&
            is_one_decimal_comma_column(lines, *choice, table.comma_could_be_decimal))
            choice = Choice{Dialect{';', ',', '\0'}, TrialRun(lines, Dialect{';', ',', '\0'}).run()};
        table.dialect = choice->dialect;
        table.thousands_or_decimal = could_be_thousands(lines, *choice);
        table.end_of_line = reader_.end_of_line();
        table.begin = begin;
        table.first_line = line_number_;
        table.preamble_lines = preamble_lines_;
        table.preamble = text_.substr(0, begin);
        for (const ColumnContent content : choice->trial.columns)
            table.columns.push_back(Column{"", "", {}, content});
        table.header_lines =
            read_header({above_.begin(), above_.end()}, latin1_, table.dialect, table.columns);
        table.preamble_lines -= std::min(table.preamble_lines, table.header_lines);
        return table;
    }

    [[nodiscard]] Lines window(std::size_t begin) const {
        Lines lines;
        LineReader ahead(text_.substr(begin), reader_.end_of_line());
        std::string_view line;
        while (lines.size() < window_rows && ahead.next(line))
            if (!is_blank_line(line) && line.size() <= longest_row) lines.push_back(line);
        return lines;
    }

    std::string_view text_;
    bool latin1_;
    TableHints hints_;
    LineReader reader_;
    std::deque<std::string_view> above_;  // the nearest first
    std::size_t line_number_ = 0;
    std::size_t preamble_lines_ = 0;
};

char end_of_line_in(std::string_view text) {
    if (text.find('\n') != std::string_view::npos) return '\n';
    return text.find('\r') != std::string_view::npos ? '\r' : '\n';
}

}  // namespace

LineReader::LineReader(std::string_view text) : LineReader(text, end_of_line_in(text)) {}

bool LineReader::next(std::string_view& line) {
    if (rest_.empty()) return false;
    const std::size_t end = rest_.find(end_of_line_);
    line = rest_.substr(0, end);
    const std::size_t used = end == std::string_view::npos ? rest_.size() : end + 1;
    rest_.remove_prefix(used);
    offset_ += used;
    while (!line.empty() && line.back() == '\r') line.remove_suffix(1);
    return true;
}

CellKind kind_of_cell(std::string_view cell, const Dialect& dialect) {
    if (number_in_cell(cell, dialect)) return CellKind::number;
    if (absence_of(cell) != Absence::text) return CellKind::missing;
    return stamp_in_cell(cell) ? CellKind::stamp : CellKind::text;
}

std::optional<Table> find_table(std::string_view text, bool latin1, const TableHints& hints) {
    return TableFinder(text, latin1, hints).find();
}

}  // namespace ringwright
