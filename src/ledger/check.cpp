#include <fmt/format.h>
#include <fmt/ranges.h>
#include <sqlite3.h>

#include <algorithm>

#include "ledger/connection.hpp"
#include "ledger/documents.hpp"
#include "ledger/rows.hpp"
#include "ledger/schema.hpp"
#include "ringwright/error.hpp"

namespace ringwright {
namespace {

/// Everything read within it is of one moment, however many others add entries.
class ReadTransaction {
  public:
    explicit ReadTransaction(SQLite::Database& database) : database_(database) { database_.exec("BEGIN"); }
    ReadTransaction(const ReadTransaction&) = delete;
    ReadTransaction& operator=(const ReadTransaction&) = delete;
    ~ReadTransaction() { (void)database_.tryExec("ROLLBACK"); }

  private:
    SQLite::Database& database_;
};

bool same(const LedgerFigure& a, const LedgerFigure& b) {
    return a.quantity == b.quantity && a.unit == b.unit && a.value == b.value &&
           a.standard_uncertainty == b.standard_uncertainty && a.low == b.low && a.high == b.high &&
           a.degrees_of_freedom == b.degrees_of_freedom;
}

/// The documents are read into values and written again for the hash; text that does not come back as it was
/// has been altered.
bool documents_come_back(SQLite::Statement& row, const LedgerEntry& entry) {
    return row.getColumn(13).getString() == documents::arguments_as_json(entry.arguments) &&
           row.getColumn(14).getString() == documents::recordings_as_json(entry.recordings);
}

bool figures_follow(const SQLite::Database& database, const LedgerEntry& entry) {
    SQLite::Statement count(database, "SELECT count(*) FROM figures WHERE entry = ?");
    count.bind(1, entry.summary.number);
    count.executeStep();
    std::vector<LedgerFigure> expected;
    if (!entry.result_json.empty()) expected = facts_of_result(entry.result_json, "result").figures;
    std::ranges::sort(expected, {}, &LedgerFigure::quantity);
    return count.getColumn(0).getInt64() == static_cast<std::int64_t>(expected.size()) &&
           std::ranges::equal(rows::figures_of(database, entry.summary.number), expected, same);
}

bool sealed(const SQLite::Database& database, const EntrySummary& summary) {
    SQLite::Statement seal(database, "SELECT hash FROM seals WHERE number = ?");
    seal.bind(1, summary.number);
    return seal.executeStep() && seal.getColumn(0).getString() == summary.hash;
}

/// What is wrong with one entry that ought to have `number` and follow `previous_hash`; empty when it holds.
std::string fault_of(const SQLite::Database& database, SQLite::Statement& row, const LedgerEntry& entry,
                     std::int64_t number, const std::string& previous_hash) {
    if (entry.summary.number != number) return "It was removed.";
    if (sha256_of(canonical_text(entry)) != entry.summary.hash || !documents_come_back(row, entry))
        return "Its contents do not give its hash: it was altered.";
    if (entry.summary.previous_hash != previous_hash) return "It does not follow the entry before it.";
    if (!sealed(database, entry.summary)) return "Its seal is missing or is another one.";
    if (!figures_follow(database, entry))
        return "Its figures are not those of its result: they were altered.";
    return "";
}

void fail(LedgerCheck& check, std::optional<std::int64_t> number, std::string fault) {
    check.intact = false;
    check.first_bad = number;
    check.fault = std::move(fault);
}

/// Walks entry by entry; stops at the first that does not hold.
void walk(const SQLite::Database& database, LedgerCheck& check) {
    SQLite::Statement row(database,
                          "SELECT " + rows::entry_columns() + " FROM entries AS e ORDER BY e.number");
    while (row.executeStep()) {
        const LedgerEntry entry = rows::entry_of(row);
        const std::int64_t number = check.entries + 1;
        const std::string fault = fault_of(database, row, entry, number, check.head);
        if (!fault.empty()) return fail(check, number, fault);
        check.entries = number;
        check.head = entry.summary.hash;
    }
}

std::int64_t count(const SQLite::Database& database, const char* sql) {
    SQLite::Statement row(database, sql);
    return row.executeStep() ? row.getColumn(0).getInt64() : 0;
}

/// What the chain itself cannot show: entries cut off at its end, figures of no entry, guards taken away.
void look_beyond(const SQLite::Database& database, LedgerCheck& check) {
    const std::int64_t sealed_up_to = count(database, "SELECT coalesce(max(number), 0) FROM seals");
    const std::int64_t given_up_to =
        count(database, "SELECT coalesce(max(seq), 0) FROM sqlite_sequence WHERE name = 'entries'");
    if (std::max(sealed_up_to, given_up_to) > check.entries)
        return fail(check, check.entries + 1, "It was removed from the end of the ledger.");
    if (given_up_to < check.entries)
        return fail(check, std::nullopt, "The count of its entries was altered.");
    if (count(database, "SELECT count(*) FROM figures WHERE entry NOT IN (SELECT number FROM entries)") > 0)
        return fail(check, std::nullopt, "It holds figures of no entry.");
    const auto missing = schema::missing_guards(database);
    if (!missing.empty())
        fail(check, std::nullopt,
             fmt::format("Guards against change were taken away or altered: {}.", fmt::join(missing, ", ")));
}

}  // namespace

LedgerCheck Ledger::check() const {
    LedgerCheck check;
    try {
        const ReadTransaction one_moment(*connection_->database);
        walk(*connection_->database, check);
        if (check.intact) look_beyond(*connection_->database, check);
    } catch (const SQLite::Exception& error) {
        if (error.getErrorCode() != SQLITE_CORRUPT) ledger::rethrow(path(), error);
        fail(check, check.entries + 1, "The file is damaged there.");
    } catch (const InputError&) {
        fail(check, check.entries + 1, "Its result can no longer be read.");
    }
    return check;
}

}  // namespace ringwright
