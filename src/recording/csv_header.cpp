#include "recording/csv_header.hpp"

#include <algorithm>
#include <cctype>

#include "recording/quantity_words.hpp"
#include "recording/text_encoding.hpp"

namespace ringwright {
namespace {

using Cells = std::vector<std::string>;

std::string trimmed(std::string_view text) {
    const auto first = text.find_first_not_of(" \t\r");
    if (first == std::string_view::npos) return {};
    return std::string(text.substr(first, text.find_last_not_of(" \t\r") - first + 1));
}

std::string without_quotes(std::string_view text) {
    std::string out = trimmed(text);
    if (out.size() >= 2 && (out.front() == '"' || out.front() == '\'') && out.back() == out.front())
        out = trimmed(std::string_view(out).substr(1, out.size() - 2));
    return out;
}

struct Bracket {
    std::size_t open = std::string::npos;
    std::size_t close = std::string::npos;
    [[nodiscard]] bool found() const { return open != std::string::npos; }
};

// The last pair of brackets, inner brackets included: "a (m/(s s))".
Bracket last_bracket(std::string_view text) {
    const std::size_t close = text.find_last_of(")]}>");
    if (close == std::string_view::npos) return {};
    const char shut = text[close];
    const char start = shut == ')' ? '(' : shut == ']' ? '[' : shut == '}' ? '{' : '<';
    int depth = 0;
    for (std::size_t i = close + 1; i-- > 0;) {
        if (text[i] == shut) ++depth;
        if (text[i] == start && --depth == 0) return {i, close};
    }
    return {};
}

bool measures_motion_or_time(const Unit& unit) {
    return unit.dimension == Dimension::time || quantity_from_dimension(unit.dimension).has_value() ||
           unit.dimension == Dimension::voltage || unit.dimension == Dimension::force ||
           unit.dimension == Dimension::mass;
}

// A unit that stands behind a name without brackets is believed only where it agrees with the name.
bool unit_suits_name(const Unit& unit, std::string_view name, std::string_view written) {
    if (unit.dimension == Dimension::time) return label_names_time(name);
    if (!measures_motion_or_time(unit) || unit.dimension == Dimension::mass) return false;
    if (const auto quantity = quantity_from_label(name))
        return dimension_of(*quantity) == unit.dimension || unit.dimension == Dimension::voltage;
    if (label_names_time(name) || written == "in") return false;
    return written.size() > 1 || written == "g" || written == "V" || written == "N";
}

std::optional<Label> bracketed(std::string_view text) {
    const Bracket bracket = last_bracket(text);
    if (!bracket.found()) return std::nullopt;
    Label label;
    label.unit_text = trimmed(text.substr(bracket.open + 1, bracket.close - bracket.open - 1));
    label.unit = find_unit(label.unit_text);
    label.name =
        trimmed(std::string(text.substr(0, bracket.open)) + std::string(text.substr(bracket.close + 1)));
    while (!label.name.empty() && (label.name.back() == '/' || label.name.back() == ',' ||
                                   label.name.back() == ':' || label.name.back() == '_'))
        label.name = trimmed(std::string_view(label.name).substr(0, label.name.size() - 1));
    const bool square = text[bracket.open] == '[';
    if (!label.unit && !square) {
        // "Voltage (ChA)": a remark, unless it is all that stands there.
        label.unit_text.clear();
        label.name = trimmed(text);
    }
    return label;
}

// "acc_x/g", "a / (m/s²)"
std::optional<Label> after_slash(std::string_view text) {
    const std::size_t slash = text.find('/');
    if (slash == std::string_view::npos || slash == 0) return std::nullopt;
    std::string unit_text = trimmed(text.substr(slash + 1));
    const auto unit = find_unit(unit_text);
    if (!unit || !measures_motion_or_time(*unit)) return std::nullopt;
    return Label{trimmed(text.substr(0, slash)), std::move(unit_text), unit};
}

// "Weg in mm", "disp_mm", "Time ms", "x, mm", "x: mm"
std::optional<Label> after_separator(std::string_view text) {
    for (std::size_t i = text.size(); i-- > 1;) {
        const char c = text[i];
        if (c != ' ' && c != '_' && c != ',' && c != ':') continue;
        std::string unit_text = trimmed(text.substr(i + 1));
        if (unit_text.empty()) continue;
        std::string name = trimmed(text.substr(0, i));
        const auto unit = find_unit(unit_text);
        if (unit && unit_suits_name(*unit, name, unit_text)) {
            if (name.size() > 3 && name.ends_with(" in"))
                name = trimmed(std::string_view(name).substr(0, name.size() - 3));
            while (!name.empty() && (name.back() == ',' || name.back() == ':')) name.pop_back();
            return Label{std::move(name), std::move(unit_text), unit};
        }
        if (text.size() - i > 12) break;
    }
    return std::nullopt;
}

bool is_bare_unit(std::string_view text) {
    const auto unit = find_unit(text);
    if (!unit || !measures_motion_or_time(*unit) || unit->dimension == Dimension::mass) return false;
    // "a", "v", "x" and "t" are names; a spelling that is a unit only in other case is none here either.
    return folded(text) == text || text.find_first_of("VN") != std::string_view::npos || text == "G";
}

std::string strip_comment_sign(std::string_view line) {
    std::string out = trimmed(line);
    for (const std::string_view sign : {"#", "%", "//", ";"})
        if (out.starts_with(sign)) {
            out = trimmed(std::string_view(out).substr(sign.size()));
            break;
        }
    return out;
}

Cells split_text(const std::string& line, char delimiter) {
    std::vector<std::string_view> views;
    split_cells(line, delimiter, views);
    Cells cells;
    for (const std::string_view view : views) cells.push_back(without_quotes(view));
    return cells;
}

Cells without_empty(Cells cells) {
    std::erase_if(cells, [](const std::string& cell) { return cell.empty(); });
    return cells;
}

// Words of a blank-separated header with their brackets: "Time (s) Acc (m/s²)" gives two.
Cells words_with_brackets(const std::string& line) {
    Cells out;
    int depth = 0;
    for (const std::string& word : split_text(line, ' ')) {
        const bool joins = depth > 0 || (!out.empty() && (word.front() == '(' || word.front() == '['));
        if (joins && !out.empty())
            out.back() += " " + word;
        else
            out.push_back(word);
        depth += static_cast<int>(std::count(word.begin(), word.end(), '(') +
                                  std::count(word.begin(), word.end(), '['));
        depth -= static_cast<int>(std::count(word.begin(), word.end(), ')') +
                                  std::count(word.begin(), word.end(), ']'));
        depth = std::max(depth, 0);
    }
    return out;
}

Cells split_on_wide_blanks(const std::string& line) {
    Cells out;
    for (std::size_t at = 0; at < line.size();) {
        const std::size_t end = std::min(line.find("  ", at), line.size());
        std::string cell = trimmed(std::string_view(line).substr(at, end - at));
        if (!cell.empty()) out.push_back(std::move(cell));
        at = end == line.size() ? end : end + 2;
    }
    return out;
}

// The cells of a header line when they can be laid over `count` columns; empty otherwise.
Cells cells_for(std::string_view raw, bool latin1, const Dialect& dialect, std::size_t count) {
    const std::string plain = label_text(raw, latin1);
    const std::string line =
        dialect.delimiter == ';' && trimmed(plain).starts_with(';') ? plain : strip_comment_sign(plain);
    for (const char delimiter : {dialect.delimiter, '\t', ';', ',', '|'}) {
        if (delimiter == ' ') continue;
        Cells cells = split_text(line, delimiter);
        // One name more than columns: the rows end in a separator with nothing behind it.
        if (cells.size() == count + 1 && (cells.back().empty() || delimiter == dialect.delimiter))
            cells.pop_back();
        if (cells.size() == count) return cells;
        if (count > 1 && cells.size() > 1 && cells.size() + 1 == count && delimiter == dialect.delimiter) {
            cells.emplace_back();
            return cells;
        }
    }
    for (const char delimiter : {'\t', ';', ',', '|'}) {
        Cells cells = without_empty(split_text(line, delimiter));
        if (count > 1 && cells.size() == count) return cells;
    }
    for (Cells cells : {words_with_brackets(line), split_on_wide_blanks(line), split_text(line, ' ')})
        if (cells.size() == count && (count > 1 || dialect.delimiter == ' ')) return cells;
    return {};
}

std::string without_brackets(const std::string& cell) {
    if (cell.size() < 2) return cell;
    const Bracket bracket = last_bracket(cell);
    if (bracket.open == 0 && bracket.close == cell.size() - 1)
        return trimmed(std::string_view(cell).substr(1, cell.size() - 2));
    return cell;
}

// "Unit;s;mm": the first cell says what the row holds.
bool says_units(const std::string& cell) {
    const std::string word = folded(cell);
    for (const std::string_view known :
         {"unit", "units", "einheit", "einheiten", "unité", "unités", "unidad", "unidades", "unità"})
        if (word == known ||
            (word.size() == known.size() + 1 && word.starts_with(known) && word.back() == ':'))
            return true;
    return false;
}

// A row of units: every cell a unit or empty, or in brackets.
bool is_unit_row(const Cells& cells) {
    std::size_t units = 0;
    for (const std::string& cell : cells) {
        if (&cell == &cells.front() && says_units(cell)) continue;
        if (cell.empty() || cell == "-" || cell == "--") continue;
        const std::string text = without_brackets(cell);
        const bool known = find_unit(text).has_value();
        if (!known && text == cell) return false;
        if (known) ++units;
    }
    return units > 0;
}

bool is_name_row(const Cells& cells) {
    std::size_t words = 0;
    for (std::size_t i = 0; i < cells.size(); ++i) {
        // "Gain;1.0" is a setting.
        if (cells.size() == 2 && kind_of_cell(cells[i], Dialect{}) != CellKind::text) return false;
        const bool letters = std::any_of(cells[i].begin(), cells[i].end(), [](char c) {
            return std::isalpha(static_cast<unsigned char>(c)) != 0 || (c & 0x80) != 0;
        });
        if (letters) ++words;
    }
    return words > 0 && (words * 2 >= cells.size() || (!cells.empty() && label_names_time(cells.front())));
}

// How much a row of names tells: units in brackets, words for time and motion.
int eloquence(const Cells& cells) {
    int score = 0;
    for (const std::string& cell : cells) {
        const Label label = read_label(cell);
        if (label.unit) score += 2;
        if (label_names_time(label.name)) score += 2;
        if (quantity_from_label(label.name)) score += 1;
    }
    return score;
}

void take_units(const Cells& cells, std::vector<Column>& columns) {
    for (std::size_t i = 0; i < columns.size() && i < cells.size(); ++i) {
        const std::string text = without_brackets(cells[i]);
        if (text.empty() || text == "-" || text == "--" || (i == 0 && says_units(text))) continue;
        columns[i].unit_text = text;
        columns[i].unit = find_unit(text);
    }
}

void take_names(const Cells& cells, std::vector<Column>& columns) {
    for (std::size_t i = 0; i < columns.size() && i < cells.size(); ++i) {
        const Label label = read_label(cells[i]);
        columns[i].name = columns[i].unit_text.empty() ? label.name : cells[i];
        if (!columns[i].unit_text.empty()) continue;
        columns[i].unit_text = label.unit_text;
        columns[i].unit = label.unit;
    }
}

}  // namespace

Label read_label(std::string_view raw) {
    const std::string text = without_quotes(raw);
    if (text.empty()) return {};
    if (is_bare_unit(text)) return Label{"", text, find_unit(text)};
    if (auto label = bracketed(text))
        if (label->unit || !label->unit_text.empty()) return std::move(*label);
    if (auto label = after_slash(text)) return std::move(*label);
    if (auto label = after_separator(text)) return std::move(*label);
    return Label{text, "", std::nullopt};
}

std::size_t read_header(const std::vector<std::string_view>& lines_above, bool latin1, const Dialect& dialect,
                        std::vector<Column>& columns) {
    Cells units, names;
    std::size_t used = 0;
    int best = -100;
    for (std::size_t i = 0; i < lines_above.size(); ++i) {
        Cells cells = cells_for(lines_above[i], latin1, dialect, columns.size());
        if (cells.empty()) continue;
        if (is_unit_row(cells)) {
            if (units.empty() && names.empty()) units = std::move(cells), used = std::max(used, i + 1);
        } else if (is_name_row(cells) && eloquence(cells) - static_cast<int>(i) > best) {
            best = eloquence(cells) - static_cast<int>(i);  // the nearer the likelier
            names = std::move(cells);
            used = std::max(used, i + 1);
        }
    }
    take_units(units, columns);
    take_names(names, columns);
    return used;
}

}  // namespace ringwright
