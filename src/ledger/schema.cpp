#include "ledger/schema.hpp"

#include <fmt/format.h>

#include <array>
#include <string_view>

namespace ringwright::schema {
namespace {

constexpr const char* tables = R"(
CREATE TABLE entries(
  number INTEGER PRIMARY KEY AUTOINCREMENT,
  utc TEXT NOT NULL,
  software_version TEXT NOT NULL,
  previous_hash TEXT NOT NULL,
  hash TEXT NOT NULL UNIQUE,
  supersedes INTEGER REFERENCES entries(number),
  reason TEXT NOT NULL,
  article_type TEXT NOT NULL,
  serial TEXT NOT NULL,
  operator TEXT NOT NULL,
  test_date TEXT NOT NULL,
  decision TEXT NOT NULL,
  arguments TEXT NOT NULL,
  recordings TEXT NOT NULL,
  sheet_name TEXT NOT NULL,
  sheet TEXT NOT NULL,
  result TEXT NOT NULL
) STRICT;
CREATE TABLE figures(
  entry INTEGER NOT NULL REFERENCES entries(number),
  quantity TEXT NOT NULL,
  unit TEXT NOT NULL,
  value REAL NOT NULL,
  standard_uncertainty REAL NOT NULL,
  low REAL,
  high REAL,
  degrees_of_freedom REAL,
  PRIMARY KEY(entry, quantity)
) STRICT, WITHOUT ROWID;
CREATE TABLE seals(
  number INTEGER PRIMARY KEY,
  hash TEXT NOT NULL
) STRICT;
)";

struct Guard {
    const char* name;
    const char* sql;
};

// REPLACE removes a row without firing its delete trigger, so insertion is guarded as well.
constexpr std::array guards{
    Guard{"entries_are_never_changed",
          "CREATE TRIGGER entries_are_never_changed BEFORE UPDATE ON entries "
          "BEGIN SELECT RAISE(ABORT, 'an entry of a ledger is never changed'); END"},
    Guard{"entries_are_never_removed",
          "CREATE TRIGGER entries_are_never_removed BEFORE DELETE ON entries "
          "BEGIN SELECT RAISE(ABORT, 'an entry of a ledger is never removed'); END"},
    Guard{"entries_follow_each_other",
          "CREATE TRIGGER entries_follow_each_other BEFORE INSERT ON entries "
          "WHEN NEW.number IS NOT (SELECT coalesce(max(number), 0) + 1 FROM entries) "
          "BEGIN SELECT RAISE(ABORT, 'entries of a ledger follow each other without a gap'); END"},
    Guard{"figures_are_never_changed",
          "CREATE TRIGGER figures_are_never_changed BEFORE UPDATE ON figures "
          "BEGIN SELECT RAISE(ABORT, 'a figure of a ledger is never changed'); END"},
    Guard{"figures_are_never_removed",
          "CREATE TRIGGER figures_are_never_removed BEFORE DELETE ON figures "
          "BEGIN SELECT RAISE(ABORT, 'a figure of a ledger is never removed'); END"},
    Guard{"figures_are_never_replaced",
          "CREATE TRIGGER figures_are_never_replaced BEFORE INSERT ON figures "
          "WHEN EXISTS (SELECT 1 FROM figures WHERE entry = NEW.entry AND quantity = NEW.quantity) "
          "BEGIN SELECT RAISE(ABORT, 'a figure of a ledger is never replaced'); END"},
    Guard{"seals_are_never_changed",
          "CREATE TRIGGER seals_are_never_changed BEFORE UPDATE ON seals "
          "BEGIN SELECT RAISE(ABORT, 'a seal of a ledger is never changed'); END"},
    Guard{"seals_are_never_removed",
          "CREATE TRIGGER seals_are_never_removed BEFORE DELETE ON seals "
          "BEGIN SELECT RAISE(ABORT, 'a seal of a ledger is never removed'); END"},
    Guard{"seals_are_never_replaced",
          "CREATE TRIGGER seals_are_never_replaced BEFORE INSERT ON seals "
          "WHEN EXISTS (SELECT 1 FROM seals WHERE number = NEW.number) "
          "BEGIN SELECT RAISE(ABORT, 'a seal of a ledger is never replaced'); END"},
};

/// Version 1: tables and guards.
void make_tables(SQLite::Database& database) {
    database.exec(tables);
    for (const Guard& guard : guards) database.exec(guard.sql);
    database.exec(fmt::format("PRAGMA application_id = {}", application_id));
}

/// Version 2: indexes, so that charts over one quantity and the history of one article do not read the whole
/// file.
void make_indexes(SQLite::Database& database) {
    database.exec(
        "CREATE INDEX figures_by_quantity ON figures(quantity, entry, value, standard_uncertainty, unit)");
    database.exec("CREATE INDEX entries_by_article ON entries(article_type, serial)");
    database.exec("CREATE INDEX entries_by_superseded ON entries(supersedes) WHERE supersedes IS NOT NULL");
}

int pragma(SQLite::Database& database, const char* name) {
    return database.execAndGet(std::string("PRAGMA ") + name).getInt();
}

}  // namespace

Identity identify(SQLite::Database& database) {
    const int id = pragma(database, "application_id");
    if (id == application_id) return {Kind::ledger, pragma(database, "user_version")};
    const bool bare = database.execAndGet("SELECT count(*) FROM sqlite_schema").getInt64() == 0 && id == 0;
    return {bare ? Kind::empty : Kind::other, 0};
}

void lift(SQLite::Database& database, int from_version, int to_version) {
    using Step = void (*)(SQLite::Database&);
    constexpr std::array<Step, current_version> steps{make_tables, make_indexes};
    for (int version = from_version; version < to_version; ++version)
        steps[static_cast<std::size_t>(version)](database);
    database.exec(fmt::format("PRAGMA user_version = {}", to_version));
}

std::vector<std::string> missing_guards(const SQLite::Database& database) {
    std::vector<std::string> missing;
    SQLite::Statement query(database, "SELECT sql FROM sqlite_schema WHERE type = 'trigger' AND name = ?");
    for (const Guard& guard : guards) {
        query.reset();
        query.bind(1, guard.name);
        if (!query.executeStep() || query.getColumn(0).getString() != guard.sql)
            missing.emplace_back(guard.name);
    }
    return missing;
}

}  // namespace ringwright::schema
