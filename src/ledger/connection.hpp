#pragma once
// An open ledger file, and the errors of SQLite in the words of a user.

#include <SQLiteCpp/SQLiteCpp.h>

#include <memory>
#include <string>

#include "ringwright/ledger.hpp"

namespace ringwright {

struct Ledger::Connection {
    std::string path;
    std::unique_ptr<SQLite::Database> database;
};

namespace ledger {

/// Rethrows an error of SQLite as InputError (the file is no ledger or is damaged) or OutputError (it cannot
/// be written).
[[noreturn]] void rethrow(const std::string& path, const SQLite::Exception& error);

/// Runs `work` and puts the errors of SQLite into the words of a user.
template <class Work>
auto guarded(const std::string& path, Work work) {
    try {
        return work();
    } catch (const SQLite::Exception& error) {
        rethrow(path, error);
    }
}

[[nodiscard]] std::unique_ptr<SQLite::Database> open_for_adding(const std::string& path);
[[nodiscard]] std::unique_ptr<SQLite::Database> open_for_reading(const std::string& path);

/// BEGIN IMMEDIATE … COMMIT; rolled back when it goes out of scope uncommitted.
class WriteTransaction {
  public:
    explicit WriteTransaction(SQLite::Database& database);
    WriteTransaction(const WriteTransaction&) = delete;
    WriteTransaction& operator=(const WriteTransaction&) = delete;
    ~WriteTransaction();
    void commit();

  private:
    SQLite::Database& database_;
    bool open_ = true;
};

}  // namespace ledger
}  // namespace ringwright
