#include "ringwright/ledger.hpp"

#include <fmt/chrono.h>
#include <fmt/format.h>

#include <chrono>

#include "ledger/connection.hpp"
#include "ledger/rows.hpp"
#include "ringwright/error.hpp"
#include "ringwright/test_sheet.hpp"
#include "ringwright/version.hpp"

namespace ringwright {
namespace {

std::string utc_now() {
    const auto now = std::chrono::floor<std::chrono::milliseconds>(std::chrono::system_clock::now());
    const auto seconds = std::chrono::floor<std::chrono::seconds>(now);
    return fmt::format("{:%Y-%m-%dT%H:%M:%S}.{:03}Z",
                       fmt::gmtime(std::chrono::system_clock::to_time_t(seconds)), (now - seconds).count());
}

[[noreturn]] void no_such_entry(const std::string& path, std::int64_t number) {
    throw InputError({path, fmt::format("entry {}", number), "there is no such entry",
                      "`ledger list` shows what there is."});
}

void take_sheet_facts(const NewEntry& filed, EntrySummary& summary) {
    if (filed.sheet_text.empty()) return;
    const TestSheet sheet = read_test_sheet_from_memory(filed.sheet_text, filed.sheet_name);
    summary.article_type = sheet.article_type.value_or("");
    summary.serial = sheet.serial.value_or("");
    summary.test_operator = sheet.test_operator.value_or("");
    if (sheet.date) summary.test_date = to_text(*sheet.date);
}

/// Everything of the entry that does not depend on its place in the chain.
LedgerEntry prepare(const NewEntry& filed) {
    LedgerEntry entry;
    entry.summary.software_version = version();
    entry.summary.supersedes = filed.supersedes;
    entry.summary.reason = filed.reason;
    entry.arguments = filed.arguments;
    entry.sheet_name = filed.sheet_name;
    entry.sheet_text = filed.sheet_text;
    entry.result_json = filed.result_json;
    take_sheet_facts(filed, entry.summary);
    if (filed.result_json.empty()) return entry;
    ResultFacts facts = facts_of_result(filed.result_json, "result");
    entry.summary.decision = facts.decision;
    entry.figures = std::move(facts.figures);
    entry.recordings = filed.recordings.empty() ? std::move(facts.recordings) : filed.recordings;
    return entry;
}

void require_supersedable(const SQLite::Database& database, const std::string& path, const NewEntry& filed) {
    if (!filed.supersedes) {
        if (filed.result_json.empty())
            throw InputError(
                {path, "", "an entry without a result", "Only a withdrawal of an entry has none."});
        return;
    }
    const std::int64_t number = *filed.supersedes;
    if (filed.reason.empty())
        throw InputError({path, fmt::format("entry {}", number), "superseded without a reason",
                          "Say why with --reason: it stays in the ledger."});
    SQLite::Statement query(
        database,
        "SELECT (SELECT later.number FROM entries AS later WHERE later.supersedes = e.number) "
        "FROM entries AS e WHERE e.number = ?");
    query.bind(1, number);
    if (!query.executeStep()) no_such_entry(path, number);
    if (!query.getColumn(0).isNull())
        throw InputError({path, fmt::format("entry {}", number),
                          fmt::format("superseded already by entry {}", query.getColumn(0).getInt64()),
                          "Supersede that one."});
}

/// A withdrawal keeps the article of the entry that it withdraws, so that the filters find both.
void take_over_article(const SQLite::Database& database, LedgerEntry& entry) {
    if (!entry.result_json.empty() || !entry.summary.supersedes) return;
    SQLite::Statement query(database,
                            "SELECT article_type, serial, operator, test_date FROM entries WHERE number = ?");
    query.bind(1, *entry.summary.supersedes);
    if (!query.executeStep()) return;
    entry.summary.article_type = query.getColumn(0).getString();
    entry.summary.serial = query.getColumn(1).getString();
    entry.summary.test_operator = query.getColumn(2).getString();
    entry.summary.test_date = query.getColumn(3).getString();
}

/// Number, hash of the entry before, time and hash.
void take_place_in_chain(const SQLite::Database& database, const std::string& utc, LedgerEntry& entry) {
    SQLite::Statement last(database, "SELECT number, hash FROM entries ORDER BY number DESC LIMIT 1");
    const bool first = !last.executeStep();
    entry.summary.number = first ? 1 : last.getColumn(0).getInt64() + 1;
    entry.summary.previous_hash = first ? "" : last.getColumn(1).getString();
    entry.summary.utc = utc.empty() ? utc_now() : utc;
    entry.summary.hash = sha256_of(canonical_text(entry));
}

void bind_all(SQLite::Statement& statement, const std::vector<std::string>& texts, int place = 1) {
    for (const std::string& text : texts) statement.bind(place++, text);
}

LedgerValue value_of(SQLite::Statement& row) {
    LedgerValue value;
    value.number = row.getColumn(0).getInt64();
    value.day = row.getColumn(1).getString();
    value.article_type = row.getColumn(2).getString();
    value.serial = row.getColumn(3).getString();
    value.test_operator = row.getColumn(4).getString();
    value.unit = row.getColumn(5).getString();
    value.value = row.getColumn(6).getDouble();
    value.standard_uncertainty = row.getColumn(7).getDouble();
    return value;
}

}  // namespace

Ledger::Ledger(std::unique_ptr<Connection> connection) : connection_(std::move(connection)) {}
Ledger::Ledger(Ledger&&) noexcept = default;
Ledger& Ledger::operator=(Ledger&&) noexcept = default;
Ledger::~Ledger() = default;

const std::string& Ledger::path() const {
    return connection_->path;
}

Ledger Ledger::open_or_create(const std::string& path) {
    return ledger::guarded(path, [&] {
        return Ledger(std::make_unique<Connection>(Connection{path, ledger::open_for_adding(path)}));
    });
}

Ledger Ledger::open_to_read(const std::string& path) {
    return ledger::guarded(path, [&] {
        return Ledger(std::make_unique<Connection>(Connection{path, ledger::open_for_reading(path)}));
    });
}

EntrySummary Ledger::add(const NewEntry& filed) {
    LedgerEntry entry = prepare(filed);
    return ledger::guarded(path(), [&] {
        SQLite::Database& database = *connection_->database;
        ledger::WriteTransaction transaction(database);
        require_supersedable(database, path(), filed);
        take_over_article(database, entry);
        take_place_in_chain(database, filed.utc, entry);
        rows::insert(database, entry);
        transaction.commit();
        return entry.summary;
    });
}

std::vector<EntrySummary> Ledger::list(const LedgerFilter& filter) const {
    return ledger::guarded(path(), [&] {
        const rows::Condition condition = rows::condition_of(filter);
        SQLite::Statement row(*connection_->database, "SELECT " + rows::summary_columns() +
                                                          " FROM entries AS e" + condition.sql +
                                                          " ORDER BY e.number");
        bind_all(row, condition.bound);
        std::vector<EntrySummary> entries;
        while (row.executeStep()) entries.push_back(rows::summary_of(row));
        return entries;
    });
}

LedgerEntry Ledger::get(std::int64_t number) const {
    return ledger::guarded(path(), [&] {
        SQLite::Statement row(*connection_->database,
                              "SELECT " + rows::entry_columns() + " FROM entries AS e WHERE e.number = ?");
        row.bind(1, number);
        if (!row.executeStep()) no_such_entry(path(), number);
        LedgerEntry entry = rows::entry_of(row);
        entry.figures = rows::figures_of(*connection_->database, number);
        return entry;
    });
}

std::vector<LedgerValue> Ledger::values(Quantity quantity, const LedgerFilter& filter) const {
    return ledger::guarded(path(), [&] {
        LedgerFilter present = filter;
        present.with_superseded = false;
        present.quantity.reset();
        const rows::Condition condition = rows::condition_of(present);
        SQLite::Statement row(
            *connection_->database,
            fmt::format(
                "SELECT e.number, {} AS day, e.article_type, e.serial, e.operator, f.unit, f.value, "
                "f.standard_uncertainty FROM figures AS f JOIN entries AS e ON e.number = f.entry{} AND "
                "f.quantity = ? ORDER BY day, e.number",
                rows::day_sql, condition.sql));
        bind_all(row, condition.bound);
        row.bind(static_cast<int>(condition.bound.size()) + 1, std::string(key_of(quantity)));
        std::vector<LedgerValue> values;
        while (row.executeStep()) values.push_back(value_of(row));
        return values;
    });
}

}  // namespace ringwright
