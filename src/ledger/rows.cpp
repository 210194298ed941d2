#include "ledger/rows.hpp"

#include <algorithm>

#include "ledger/documents.hpp"

namespace ringwright::rows {
namespace {

std::optional<std::int64_t> whole(const SQLite::Column& column) {
    return column.isNull() ? std::nullopt : std::optional(column.getInt64());
}

std::optional<double> real(const SQLite::Column& column) {
    return column.isNull() ? std::nullopt : std::optional(column.getDouble());
}

template <class Number>
void bind_or_null(SQLite::Statement& statement, int place, const std::optional<Number>& number) {
    if (number)
        statement.bind(place, *number);
    else
        statement.bind(place);
}

void insert_row(SQLite::Database& database, const LedgerEntry& entry) {
    SQLite::Statement statement(
        database,
        "INSERT INTO entries(number, utc, software_version, previous_hash, hash, supersedes, reason, "
        "article_type, "
        "serial, operator, test_date, decision, arguments, recordings, sheet_name, sheet, result) "
        "VALUES(?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?)");
    const EntrySummary& summary = entry.summary;
    statement.bind(1, summary.number);
    bind_or_null(statement, 6, summary.supersedes);
    const std::pair<int, std::string> texts[] = {{2, summary.utc},
                                                 {3, summary.software_version},
                                                 {4, summary.previous_hash},
                                                 {5, summary.hash},
                                                 {7, summary.reason},
                                                 {8, summary.article_type},
                                                 {9, summary.serial},
                                                 {10, summary.test_operator},
                                                 {11, summary.test_date},
                                                 {12, summary.decision},
                                                 {13, documents::arguments_as_json(entry.arguments)},
                                                 {14, documents::recordings_as_json(entry.recordings)},
                                                 {15, entry.sheet_name},
                                                 {16, entry.sheet_text},
                                                 {17, entry.result_json}};
    for (const auto& [place, text] : texts) statement.bind(place, text);
    statement.exec();
}

void insert_figure(SQLite::Statement& statement, std::int64_t entry, const LedgerFigure& figure) {
    statement.reset();
    statement.bind(1, entry);
    statement.bind(2, std::string(key_of(figure.quantity)));
    statement.bind(3, figure.unit);
    statement.bind(4, figure.value);
    statement.bind(5, figure.standard_uncertainty);
    bind_or_null(statement, 6, figure.low);
    bind_or_null(statement, 7, figure.high);
    bind_or_null(statement, 8, figure.degrees_of_freedom);
    statement.exec();
}

}  // namespace

const char* const day_sql = "coalesce(nullif(e.test_date, ''), substr(e.utc, 1, 10))";

const std::string& summary_columns() {
    static const std::string columns =
        "e.number, e.utc, e.software_version, e.article_type, e.serial, e.operator, e.test_date, e.decision, "
        "e.supersedes, (SELECT later.number FROM entries AS later WHERE later.supersedes = e.number), "
        "e.reason, "
        "e.hash, e.previous_hash";
    return columns;
}

EntrySummary summary_of(SQLite::Statement& row) {
    EntrySummary summary;
    summary.number = row.getColumn(0).getInt64();
    std::string* const texts[] = {&summary.utc,     &summary.software_version, &summary.article_type,
                                  &summary.serial,  &summary.test_operator,    &summary.test_date,
                                  &summary.decision};
    int column = 1;
    for (std::string* text : texts) *text = row.getColumn(column++).getString();
    summary.supersedes = whole(row.getColumn(8));
    summary.superseded_by = whole(row.getColumn(9));
    summary.reason = row.getColumn(10).getString();
    summary.hash = row.getColumn(11).getString();
    summary.previous_hash = row.getColumn(12).getString();
    return summary;
}

const std::string& entry_columns() {
    static const std::string columns =
        summary_columns() + ", e.arguments, e.recordings, e.sheet_name, e.sheet, e.result";
    return columns;
}

LedgerEntry entry_of(SQLite::Statement& row) {
    LedgerEntry entry;
    entry.summary = summary_of(row);
    entry.arguments = documents::arguments_from_json(row.getColumn(13).getString());
    entry.recordings = documents::recordings_from_json(row.getColumn(14).getString());
    entry.sheet_name = row.getColumn(15).getString();
    entry.sheet_text = row.getColumn(16).getString();
    entry.result_json = row.getColumn(17).getString();
    return entry;
}

std::vector<LedgerFigure> figures_of(const SQLite::Database& database, std::int64_t entry) {
    SQLite::Statement row(database,
                          "SELECT quantity, unit, value, standard_uncertainty, low, high, degrees_of_freedom "
                          "FROM figures WHERE entry = ?");
    row.bind(1, entry);
    std::vector<LedgerFigure> figures;
    while (row.executeStep()) {
        const auto quantity = quantity_from_key(row.getColumn(0).getString());
        if (!quantity) continue;
        figures.push_back({*quantity, row.getColumn(1).getString(), row.getColumn(2).getDouble(),
                           row.getColumn(3).getDouble(), real(row.getColumn(4)), real(row.getColumn(5)),
                           real(row.getColumn(6))});
    }
    std::ranges::sort(figures, {}, &LedgerFigure::quantity);
    return figures;
}

void insert(SQLite::Database& database, const LedgerEntry& entry) {
    insert_row(database, entry);
    SQLite::Statement figures(
        database,
        "INSERT INTO figures(entry, quantity, unit, value, standard_uncertainty, low, high, "
        "degrees_of_freedom) VALUES(?, ?, ?, ?, ?, ?, ?, ?)");
    for (const LedgerFigure& figure : entry.figures) insert_figure(figures, entry.summary.number, figure);
    SQLite::Statement seal(database, "INSERT INTO seals(number, hash) VALUES(?, ?)");
    seal.bind(1, entry.summary.number);
    seal.bind(2, entry.summary.hash);
    seal.exec();
}

Condition condition_of(const LedgerFilter& filter) {
    Condition condition;
    const auto require = [&](const std::string& sql, const std::optional<std::string>& text) {
        if (!text) return;
        condition.sql += (condition.sql.empty() ? " WHERE " : " AND ") + sql;
        condition.bound.push_back(*text);
    };
    require("e.article_type = ?", filter.article_type);
    require("e.serial = ?", filter.serial);
    require("e.operator = ?", filter.test_operator);
    require("e.decision = ?", filter.decision);
    require(std::string(day_sql) + " >= ?", filter.since);
    require(std::string(day_sql) + " <= ?", filter.until);
    if (filter.quantity)
        require("EXISTS (SELECT 1 FROM figures AS f WHERE f.entry = e.number AND f.quantity = ?)",
                std::string(key_of(*filter.quantity)));
    if (!filter.with_superseded)
        condition.sql += std::string(condition.sql.empty() ? " WHERE " : " AND ") +
                         "NOT EXISTS (SELECT 1 FROM entries AS later WHERE later.supersedes = e.number)";
    return condition;
}

}  // namespace ringwright::rows
