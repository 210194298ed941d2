#include "ledger/connection.hpp"

#include <fmt/format.h>
#include <sqlite3.h>

#include <chrono>
#include <filesystem>
#include <thread>

#include "ledger/schema.hpp"
#include "ringwright/error.hpp"

namespace ringwright::ledger {
namespace {

constexpr int patience_ms = 30000;

[[noreturn]] void refuse_other(const std::string& path) {
    throw InputError(
        {path, "", "this file is no ledger", "Name another file with --ledger; it was not changed."});
}

[[noreturn]] void refuse_newer(const std::string& path, int version) {
    throw InputError({path, "",
                      fmt::format("this ledger was written by a newer version (schema {}, known here: {})",
                                  version, schema::current_version),
                      "Use the newer program; the ledger was not changed."});
}

void require_usable(const std::string& path, const schema::Identity& identity) {
    if (identity.kind == schema::Kind::other) refuse_other(path);
    if (identity.version > schema::current_version) refuse_newer(path, identity.version);
}

/// Makes or lifts the tables, unless another process was faster.
void make_current(SQLite::Database& database, const std::string& path) {
    WriteTransaction transaction(database);
    const schema::Identity identity = schema::identify(database);
    require_usable(path, identity);
    if (identity.version < schema::current_version)
        schema::lift(database, identity.version, schema::current_version);
    transaction.commit();
}

/// The change of journal needs the file for itself for a moment and does not wait for it by its own.
void use_write_ahead_log(SQLite::Database& database) {
    const auto deadline = std::chrono::steady_clock::now() + std::chrono::milliseconds(patience_ms);
    for (;;) {
        try {
            if (database.execAndGet("PRAGMA journal_mode = WAL").getString() == "wal") return;
        } catch (const SQLite::Exception& error) {
            if (error.getErrorCode() != SQLITE_BUSY && error.getErrorCode() != SQLITE_LOCKED) throw;
        }
        if (std::chrono::steady_clock::now() > deadline)
            throw SQLite::Exception("another program keeps the ledger locked", SQLITE_BUSY);
        std::this_thread::sleep_for(std::chrono::milliseconds(20));
    }
}

/// A path as part of a URI: SQLite takes ? # % apart.
std::string uri_path(const std::string& path) {
    std::string escaped;
    for (const char letter : path) {
        if (letter == '?' || letter == '#' || letter == '%')
            escaped += fmt::format("%{:02X}", static_cast<unsigned char>(letter));
        else
            escaped += letter;
    }
    return escaped;
}

bool has_unmerged_log(const std::string& path) {
    std::error_code error;
    const auto size = std::filesystem::file_size(path + "-wal", error);
    return !error && size > 0;
}

std::unique_ptr<SQLite::Database> connect_to_read(const std::string& path) {
    auto database = std::make_unique<SQLite::Database>(path, SQLite::OPEN_READWRITE, patience_ms);
    database->exec("PRAGMA query_only = ON");
    database->execAndGet("PRAGMA user_version").getInt();
    return database;
}

/// In a folder that cannot be written no log can be opened beside the file; without one, none is needed.
std::unique_ptr<SQLite::Database> connect_read_only(const std::string& path) {
    try {
        return connect_to_read(path);
    } catch (const SQLite::Exception& error) {
        const int code = error.getErrorCode();
        if ((code != SQLITE_CANTOPEN && code != SQLITE_READONLY) || has_unmerged_log(path)) throw;
    }
    return std::make_unique<SQLite::Database>("file:" + uri_path(path) + "?immutable=1",
                                              SQLite::OPEN_READONLY | SQLite::OPEN_URI, patience_ms);
}

void require_file(const std::string& path) {
    std::error_code error;
    if (std::filesystem::is_regular_file(path, error)) return;
    throw InputError({path, "", "there is no ledger here",
                      "`identify` or `verify` with --ledger, or `ledger add`, starts one."});
}

}  // namespace

void rethrow(const std::string& path, const SQLite::Exception& error) {
    const std::string said = error.what();
    switch (error.getErrorCode()) {
        case SQLITE_NOTADB:
            refuse_other(path);
        case SQLITE_CORRUPT:
            throw InputError({path, "", fmt::format("the ledger file is damaged ({})", said),
                              "Restore it from a copy; `ledger check` tells the first entry that is lost."});
        case SQLITE_FULL:
            throw OutputError({path, "", fmt::format("there is no room left for the ledger ({})", said),
                               "Make room and file the result again; the entries in it are as they were."});
        case SQLITE_BUSY:
        case SQLITE_LOCKED:
            throw OutputError({path, "", fmt::format("another program keeps the ledger locked ({})", said),
                               "Close it and file the result again."});
        case SQLITE_READONLY:
        case SQLITE_CANTOPEN:
        case SQLITE_PERM:
            throw OutputError({path, "", fmt::format("the ledger cannot be opened for writing ({})", said),
                               "Check that file and folder exist and may be written."});
        default:
            throw OutputError(
                {path, "", fmt::format("the ledger cannot be written ({})", said),
                 "Check the disk and file the result again; the entries in it are as they were."});
    }
}

std::unique_ptr<SQLite::Database> open_for_adding(const std::string& path) {
    auto database =
        std::make_unique<SQLite::Database>(path, SQLite::OPEN_READWRITE | SQLite::OPEN_CREATE, patience_ms);
    database->exec("PRAGMA synchronous = FULL");
    database->exec("PRAGMA foreign_keys = ON");
    const schema::Identity identity = schema::identify(*database);
    require_usable(path, identity);
    if (identity.version < schema::current_version) make_current(*database, path);
    use_write_ahead_log(*database);
    return database;
}

std::unique_ptr<SQLite::Database> open_for_reading(const std::string& path) {
    require_file(path);
    auto database = connect_read_only(path);
    const schema::Identity identity = schema::identify(*database);
    if (identity.kind == schema::Kind::empty) refuse_other(path);
    require_usable(path, identity);
    return database;
}

WriteTransaction::WriteTransaction(SQLite::Database& database) : database_(database) {
    database_.exec("BEGIN IMMEDIATE");
}

WriteTransaction::~WriteTransaction() {
    if (open_) (void)database_.tryExec("ROLLBACK");
}

void WriteTransaction::commit() {
    database_.exec("COMMIT");
    open_ = false;
}

}  // namespace ringwright::ledger
