#pragma once
// The tables of a ledger, their guards, and how an older ledger is lifted to the present version.

#include <SQLiteCpp/SQLiteCpp.h>

#include <string>
#include <vector>

namespace ringwright::schema {

constexpr int application_id = 0x52574c47;  // "RWLG"
constexpr int current_version = 2;

enum class Kind { empty, ledger, other };

/// What the database file is, and its schema version where it is a ledger.
struct Identity {
    Kind kind = Kind::empty;
    int version = 0;
};
[[nodiscard]] Identity identify(SQLite::Database& database);

/// Runs the steps from `from_version` (0: nothing is there) up to `to_version`. Needs an open transaction.
void lift(SQLite::Database& database, int from_version, int to_version);

/// Names of the guards (triggers) that are missing or not as they were made.
[[nodiscard]] std::vector<std::string> missing_guards(const SQLite::Database& database);

}  // namespace ringwright::schema
