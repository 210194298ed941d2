#pragma once
// Rows of a ledger to values and back.

#include <SQLiteCpp/SQLiteCpp.h>

#include <string>
#include <vector>

#include "ringwright/ledger.hpp"

namespace ringwright::rows {

/// Columns of a summary, in the order in which `summary_of` reads them.
[[nodiscard]] const std::string& summary_columns();
[[nodiscard]] EntrySummary summary_of(SQLite::Statement& row);
/// Columns of a whole entry: those of a summary, then the documents.
[[nodiscard]] const std::string& entry_columns();
/// Figures left out.
[[nodiscard]] LedgerEntry entry_of(SQLite::Statement& row);
[[nodiscard]] std::vector<LedgerFigure> figures_of(const SQLite::Database& database, std::int64_t entry);

void insert(SQLite::Database& database, const LedgerEntry& entry);

/// " WHERE …" for the filter and the texts to bind to its question marks, in order. Tables: entries AS e.
struct Condition {
    std::string sql;
    std::vector<std::string> bound;
};
[[nodiscard]] Condition condition_of(const LedgerFilter& filter);

/// The day of the test, or of the entry where the sheet has none, as SQL.
extern const char* const day_sql;

}  // namespace ringwright::rows
