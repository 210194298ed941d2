#pragma once
// Reading single entries of a test sheet, with errors that name line and key.

#include <optional>
#include <string>
#include <string_view>
#include <vector>

#define TOML_ENABLE_FORMATTERS 0
#include <toml++/toml.h>

#include "ringwright/measured_value.hpp"
#include "ringwright/test_sheet.hpp"

namespace ringwright::sheet {

/// The file a table came from and its name there: "" for the sheet itself, "limits.stiffness" …
struct Table {
    const std::string& file;
    const toml::table& entries;
    std::string name;
};

/// "limits.stiffness" for the key `stiffness` of the table `limits`.
[[nodiscard]] std::string path_of(const Table& table, std::string_view key);

/// Throws InputError: "FILE: line 12, key limits.damping_ratio: FOUND. REMEDY".
[[noreturn]] void refuse(const Table& table, std::string_view key, std::string found, std::string remedy);

/// Throws InputError for the first key (by line) that is not among `known`, with the nearest one that is.
void require_known_keys(const Table& table, const std::vector<std::string_view>& known);

/// Of the spellings, the one that `text` most likely meant; empty when none is near.
[[nodiscard]] std::string_view nearest_spelling(std::string_view text,
                                                const std::vector<std::string_view>& spellings);

[[nodiscard]] int line_of(const Table& table, std::string_view key);
[[nodiscard]] std::optional<Table> table_at(const Table& table, std::string_view key);
[[nodiscard]] std::optional<std::string> text_at(const Table& table, std::string_view key);
/// Text, or a whole number as text: a channel or column.
[[nodiscard]] std::optional<std::string> name_or_number_at(const Table& table, std::string_view key);
[[nodiscard]] std::optional<std::string> choice_at(const Table& table, std::string_view key,
                                                   const std::vector<std::string_view>& choices);
[[nodiscard]] std::optional<Date> date_at(const Table& table, std::string_view key);
[[nodiscard]] std::optional<double> number_at(const Table& table, std::string_view key);
/// A value with a unit of the dimension, e.g. "3.20(1) kg".
[[nodiscard]] std::optional<MeasuredValue> measured_at(const Table& table, std::string_view key,
                                                       Dimension wanted);
/// The same, refused unless above zero.
[[nodiscard]] std::optional<MeasuredValue> positive_at(const Table& table, std::string_view key,
                                                       Dimension wanted);

/// The entries of [limits]: rule, guard band and every limit.
void read_limits(const Table& limits, TestSheet& sheet);

}  // namespace ringwright::sheet
