#include "conformity/sheet_reading.hpp"

#include <fmt/format.h>
#include <fmt/ranges.h>

#include <algorithm>
#include <cmath>
#include <numeric>

#include "ringwright/error.hpp"

namespace ringwright::sheet {
namespace {

const toml::node* find(const Table& table, std::string_view key) {
    return table.entries.get(key);
}

std::string type_found(const toml::node& node) {
    switch (node.type()) {
        case toml::node_type::table:
            return "a table";
        case toml::node_type::array:
            return "a list";
        case toml::node_type::string:
            return "a text";
        case toml::node_type::integer:
        case toml::node_type::floating_point:
            return "a bare number";
        case toml::node_type::boolean:
            return "true or false";
        case toml::node_type::date:
        case toml::node_type::time:
        case toml::node_type::date_time:
            return "a date or time";
        default:
            return "something else";
    }
}

std::size_t edit_distance(std::string_view a, std::string_view b) {
    std::vector<std::size_t> row(b.size() + 1);
    std::iota(row.begin(), row.end(), std::size_t{0});
    for (std::size_t i = 0; i < a.size(); ++i) {
        std::size_t diagonal = row[0];
        row[0] = i + 1;
        for (std::size_t j = 0; j < b.size(); ++j) {
            const std::size_t replaced = diagonal + (a[i] == b[j] ? 0 : 1);
            diagonal = row[j + 1];
            row[j + 1] = std::min({row[j] + 1, row[j + 1] + 1, replaced});
        }
    }
    return row.back();
}

std::string known_keys_remedy(std::string_view key, const std::vector<std::string_view>& known) {
    const std::string_view nearest = nearest_spelling(key, known);
    if (!nearest.empty()) return fmt::format("Did you mean {}?", nearest);
    return fmt::format("Known here: {}.", fmt::join(known, ", "));
}

std::optional<Date> valid(const toml::date& date) {
    const Date read{std::chrono::year{date.year}, std::chrono::month{date.month}, std::chrono::day{date.day}};
    return read.ok() ? std::optional(read) : std::nullopt;
}

}  // namespace

std::string path_of(const Table& table, std::string_view key) {
    return table.name.empty() ? std::string(key) : fmt::format("{}.{}", table.name, key);
}

void refuse(const Table& table, std::string_view key, std::string found, std::string remedy) {
    throw InputError({table.file, fmt::format("line {}, key {}", line_of(table, key), path_of(table, key)),
                      std::move(found), std::move(remedy)});
}

int line_of(const Table& table, std::string_view key) {
    for (const auto& [name, node] : table.entries)
        if (name.str() == key) {
            const auto line = name.source().begin.line;
            return static_cast<int>(line ? line : node.source().begin.line);
        }
    return static_cast<int>(table.entries.source().begin.line);
}

std::string_view nearest_spelling(std::string_view text, const std::vector<std::string_view>& spellings) {
    std::string_view best;
    std::size_t best_distance = std::max<std::size_t>(2, text.size() / 3) + 1;
    for (const std::string_view spelling : spellings) {
        const std::size_t distance = edit_distance(text, spelling);
        if (distance < best_distance) {
            best_distance = distance;
            best = spelling;
        }
    }
    return best;
}

void require_known_keys(const Table& table, const std::vector<std::string_view>& known) {
    std::string first;
    int first_line = 0;
    for (const auto& [key, node] : table.entries) {
        if (std::ranges::find(known, key.str()) != known.end()) continue;
        const int line = line_of(table, key.str());
        if (!first.empty() && line >= first_line) continue;
        first = key.str();
        first_line = line;
    }
    if (!first.empty()) refuse(table, first, "unknown key", known_keys_remedy(first, known));
}

std::optional<Table> table_at(const Table& table, std::string_view key) {
    const toml::node* node = find(table, key);
    if (!node) return std::nullopt;
    if (!node->is_table())
        refuse(table, key, fmt::format("is {}", type_found(*node)), "It is a table with entries of its own.");
    return Table{table.file, *node->as_table(), path_of(table, key)};
}

std::optional<std::string> text_at(const Table& table, std::string_view key) {
    const toml::node* node = find(table, key);
    if (!node) return std::nullopt;
    if (!node->is_string())
        refuse(table, key, fmt::format("is {}", type_found(*node)), "Write it as text, in quotes.");
    return node->as_string()->get();
}

std::optional<std::string> name_or_number_at(const Table& table, std::string_view key) {
    const toml::node* node = find(table, key);
    if (node && node->is_integer()) return fmt::format("{}", node->as_integer()->get());
    return text_at(table, key);
}

std::optional<std::string> choice_at(const Table& table, std::string_view key,
                                     const std::vector<std::string_view>& choices) {
    auto text = text_at(table, key);
    if (text && std::ranges::find(choices, *text) == choices.end())
        refuse(table, key, fmt::format("\"{}\" is none of its values", *text),
               fmt::format("Choose from: {}.", fmt::join(choices, ", ")));
    return text;
}

std::optional<Date> date_at(const Table& table, std::string_view key) {
    const toml::node* node = find(table, key);
    if (!node) return std::nullopt;
    std::optional<Date> date;
    if (node->is_date()) date = valid(node->as_date()->get());
    if (node->is_date_time()) date = valid(node->as_date_time()->get().date);
    if (node->is_string()) date = date_from_text(node->as_string()->get());
    if (!date)
        refuse(table, key, fmt::format("is {}, not a date of the calendar", type_found(*node)),
               "Write it as year, month, day: 2031-04-02.");
    return date;
}

std::optional<double> number_at(const Table& table, std::string_view key) {
    const toml::node* node = find(table, key);
    if (!node) return std::nullopt;
    const auto number = node->value<double>();
    if (!number || !node->is_number())
        refuse(table, key, fmt::format("is {}", type_found(*node)), "Write it as a number, without quotes.");
    if (!std::isfinite(*number))
        refuse(table, key, "is not a finite number", "Leave it out or give a number.");
    return number;
}

std::optional<MeasuredValue> measured_at(const Table& table, std::string_view key, Dimension wanted) {
    const toml::node* node = find(table, key);
    if (!node) return std::nullopt;
    if (!node->is_string())
        refuse(table, key, fmt::format("is {}", type_found(*node)),
               fmt::format("Write value and unit in quotes, as in \"12.4 {}\".", si_unit_of(wanted)));
    try {
        return parse_measured_value(node->as_string()->get(), path_of(table, key), wanted);
    } catch (const UsageError& error) {
        refuse(table, key, error.problem().found, error.problem().remedy);
    }
}

std::optional<MeasuredValue> positive_at(const Table& table, std::string_view key, Dimension wanted) {
    auto measured = measured_at(table, key, wanted);
    if (measured && !(measured->value > 0.0))
        refuse(table, key, fmt::format("\"{}\" is not above zero", measured->text),
               "Give what was measured.");
    return measured;
}

}  // namespace ringwright::sheet
