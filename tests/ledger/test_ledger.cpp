#include <SQLiteCpp/SQLiteCpp.h>
#include <sys/resource.h>
#include <sys/stat.h>
#include <sys/wait.h>
#include <unistd.h>

#include <catch2/catch.hpp>
#include <csignal>
#include <ctime>
#include <filesystem>
#include <fstream>

#include "ledger/ledger_fixture.hpp"
#include "ledger/schema.hpp"
#include "ringwright/error.hpp"

using namespace ringwright;
using namespace ringwright_test;

namespace {

/// Another SQLite client: takes the guards away, makes its change, and puts them back.
void tamper(const std::string& path, const std::string& change) {
    SQLite::Database database(path, SQLite::OPEN_READWRITE);
    std::vector<std::pair<std::string, std::string>> guards;
    {
        SQLite::Statement row(database, "SELECT name, sql FROM sqlite_schema WHERE type = 'trigger'");
        while (row.executeStep())
            guards.emplace_back(row.getColumn(0).getString(), row.getColumn(1).getString());
    }
    for (const auto& [name, sql] : guards) database.exec("DROP TRIGGER " + name);
    database.exec(change);
    for (const auto& [name, sql] : guards) database.exec(sql);
}

std::string filled(const Folder& folder, int entries) {
    const std::string path = folder.file("shop.ledger");
    Ledger ledger = Ledger::open_or_create(path);
    for (int i = 0; i < entries; ++i) ledger.add(new_entry(0.27 + 0.001 * i));
    return path;
}

LedgerCheck check(const std::string& path) {
    return Ledger::open_to_read(path).check();
}

}  // namespace

TEST_CASE("an entry comes back as it was filed") {
    const Folder folder;
    Ledger ledger = Ledger::open_or_create(folder.file("shop.ledger"));
    const NewEntry filed = new_entry();
    const EntrySummary summary = ledger.add(filed);
    CHECK(summary.number == 1);
    CHECK(summary.utc.size() == 24);
    const LedgerEntry entry = Ledger::open_to_read(ledger.path()).get(1);
    CHECK(entry.result_json == filed.result_json);
    CHECK(entry.sheet_text == filed.sheet_text);
    CHECK(entry.arguments == filed.arguments);
    CHECK(entry.summary.article_type == "sash damper S2");
    CHECK(entry.summary.serial == "0417");
    CHECK(entry.summary.test_date == "2031-04-02");
    CHECK(entry.summary.decision == "conforms");
    REQUIRE(entry.recordings.size() == 1);
    CHECK(entry.recordings[0].sha256.size() == 64);
    REQUIRE(entry.figures.size() == 2);
    CHECK(entry.figures[0].quantity == Quantity::natural_frequency);
    CHECK_FALSE(entry.figures[0].degrees_of_freedom);
    CHECK(entry.figures[1].value == 0.27);
    CHECK_THROWS_AS(ledger.get(2), InputError);
}

TEST_CASE("entries are chained and the chain checks") {
    const Folder folder;
    const std::string path = filled(folder, 5);
    const auto entries = Ledger::open_to_read(path).list();
    REQUIRE(entries.size() == 5);
    for (std::size_t i = 1; i < entries.size(); ++i) CHECK(entries[i].previous_hash == entries[i - 1].hash);
    const LedgerCheck checked = check(path);
    CHECK(checked.intact);
    CHECK(checked.entries == 5);
    CHECK(checked.head == entries.back().hash);
}

// Expected value: the SHA-256 test vector for "abc", FIPS 180-2, appendix B.1 (from memory).
TEST_CASE("SHA-256") {
    CHECK(sha256_of("abc") == "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad");
}

TEST_CASE("the hash covers every field") {
    LedgerEntry entry;
    const std::string empty = canonical_text(entry);
    LedgerEntry other = entry;
    other.summary.serial = "a";
    CHECK(canonical_text(other) != empty);
    // A byte that moves from one field to the next is seen: the lengths stand before the bytes.
    LedgerEntry first = entry, second = entry;
    first.sheet_name = "ab";
    second.sheet_name = "a";
    second.sheet_text = "b";
    CHECK(canonical_text(first) != canonical_text(second));
}

TEST_CASE("triggers refuse change, removal and replacement") {
    const Folder folder;
    SQLite::Database database(filled(folder, 2), SQLite::OPEN_READWRITE);
    for (const char* sql :
         {"UPDATE entries SET serial = 'x'", "DELETE FROM entries", "UPDATE figures SET value = 1",
          "DELETE FROM figures WHERE entry = 1", "DELETE FROM seals", "UPDATE seals SET hash = ''",
          "INSERT OR REPLACE INTO entries SELECT * FROM entries WHERE number = 1",
          "INSERT OR REPLACE INTO figures SELECT * FROM figures WHERE entry = 1",
          "INSERT OR REPLACE INTO seals SELECT * FROM seals"}) {
        INFO(sql);
        CHECK_THROWS_AS(database.exec(sql), SQLite::Exception);
    }
}

TEST_CASE("whatever another client changes, the check names the first entry that does not hold") {
    const std::pair<const char*, std::optional<std::int64_t>> rows[] = {
        {"UPDATE entries SET result = replace(result, '0.272', '0.372') WHERE number = 3", 3},
        {"UPDATE entries SET result = replace(result, 'laser', 'lazer') WHERE number IN (2, 4)", 2},
        {"UPDATE entries SET serial = '0418' WHERE number = 5", 5},
        {"UPDATE entries SET utc = '2030' || substr(utc, 5) WHERE number = 1", 1},
        {"UPDATE entries SET reason = 'x' WHERE number = 2", 2},
        {"UPDATE entries SET arguments = '[]' WHERE number = 2", 2},
        {"UPDATE entries SET arguments = arguments || ' ' WHERE number = 2", 2},
        {"UPDATE entries SET recordings = replace(recordings, 'a.csv', 'b.csv') WHERE number = 4", 4},
        {"UPDATE entries SET sheet = sheet || ' ' WHERE number = 4", 4},
        {"UPDATE entries SET previous_hash = '' WHERE number = 4", 4},
        {"UPDATE entries SET hash = substr(hash, 2) WHERE number = 4", 4},
        {"UPDATE figures SET value = 0.5 WHERE entry = 3 AND quantity = 'damping_ratio'", 3},
        {"DELETE FROM figures WHERE entry = 3", 3},
        {"UPDATE seals SET hash = '' WHERE number = 2", 2},
        {"DELETE FROM entries WHERE number = 3", 3},
        {"DELETE FROM entries WHERE number = 1", 1},
        {"DELETE FROM entries WHERE number = 5", 5},
        {"DELETE FROM entries WHERE number = 5; DELETE FROM figures WHERE entry = 5; "
         "DELETE FROM seals WHERE number = 5",
         5},
        {"DELETE FROM sqlite_sequence", std::nullopt},
        {"INSERT INTO figures SELECT 99, quantity, unit, value, standard_uncertainty, low, high, "
         "degrees_of_freedom FROM figures WHERE entry = 1",
         std::nullopt},
    };
    for (const auto& [change, first_bad] : rows) {
        INFO(change);
        const Folder folder;
        const std::string path = filled(folder, 5);
        tamper(path, change);
        const LedgerCheck checked = check(path);
        CHECK_FALSE(checked.intact);
        CHECK(checked.first_bad == first_bad);
        CHECK_FALSE(checked.fault.empty());
    }
}

TEST_CASE("guards that were taken away are missed") {
    const Folder folder;
    const std::string path = filled(folder, 1);
    {
        SQLite::Database database(path, SQLite::OPEN_READWRITE);
        database.exec("DROP TRIGGER entries_are_never_changed");
    }
    const LedgerCheck checked = check(path);
    CHECK_FALSE(checked.intact);
    CHECK(checked.fault.find("entries_are_never_changed") != std::string::npos);
}

TEST_CASE("one byte changed in the file itself is found") {
    const Folder folder;
    const std::string path = filled(folder, 5);
    std::string bytes;
    {
        std::ifstream file(path, std::ios::binary);
        bytes.assign(std::istreambuf_iterator<char>(file), {});
    }
    // The third entry's serial stands in its sheet text, once as a column and once in the sheet.
    const std::size_t place = bytes.find("0.272");
    REQUIRE(place != std::string::npos);
    {
        std::fstream file(path, std::ios::binary | std::ios::in | std::ios::out);
        file.seekp(static_cast<std::streamoff>(place + 4));
        file.put('3');
    }
    CHECK(check(path).first_bad == 3);
}

TEST_CASE("a mistaken entry is superseded, never changed") {
    const Folder folder;
    const std::string path = filled(folder, 3);
    Ledger ledger = Ledger::open_or_create(path);
    NewEntry correction = new_entry(0.3);
    correction.supersedes = 2;
    CHECK_THROWS_AS(ledger.add(correction), InputError);  // no reason
    correction.reason = "wrong mass on the sheet";
    CHECK(ledger.add(correction).number == 4);
    CHECK_THROWS_AS(ledger.add(correction), InputError);  // superseded already
    NewEntry withdrawal;
    withdrawal.supersedes = 3;
    withdrawal.reason = "cable was loose";
    ledger.add(withdrawal);
    withdrawal.supersedes = 77;
    CHECK_THROWS_AS(ledger.add(withdrawal), InputError);
    CHECK_THROWS_AS(ledger.add(NewEntry{}), InputError);

    const auto entries = ledger.list();
    REQUIRE(entries.size() == 5);
    CHECK(entries[1].superseded_by == 4);
    CHECK(entries[3].supersedes == 2);
    CHECK(entries[4].serial == "0417");
    const auto values = ledger.values(Quantity::damping_ratio);
    REQUIRE(values.size() == 2);
    CHECK(values[0].number == 1);
    CHECK(values[1].number == 4);
    CHECK(check(path).intact);
}

TEST_CASE("filters choose entries") {
    const Folder folder;
    Ledger ledger = Ledger::open_or_create(folder.file("shop.ledger"));
    ledger.add(new_entry(0.27, "1"));
    ledger.add(new_entry(0.28, "2"));
    NewEntry later = new_entry(0.29, "2");
    later.sheet_text = sheet_text("2", "night shift", "2031-05-01");
    later.result_json = result_json(0.29, "does_not_conform");
    ledger.add(later);
    NewEntry bare;
    bare.result_json = R"({"schema":"ringwright.identification.v1"})";
    bare.utc = "2031-06-01T00:00:00.000Z";
    ledger.add(bare);
    const auto numbers = [&](const LedgerFilter& filter) {
        std::string text;
        for (const auto& entry : ledger.list(filter)) text += fmt::format("{} ", entry.number);
        return text;
    };
    const auto with = [&](auto change) {
        LedgerFilter filter;
        change(filter);
        return numbers(filter);
    };
    CHECK(with([](auto& filter) { filter.serial = "2"; }) == "2 3 ");
    CHECK(with([](auto& filter) { filter.article_type = "sash damper S2"; }) == "1 2 3 ");
    CHECK(with([](auto& filter) { filter.decision = "does_not_conform"; }) == "3 ");
    CHECK(with([](auto& filter) { filter.test_operator = "day shift"; }) == "1 2 ");
    CHECK(with([](auto& filter) { filter.since = "2031-05-01"; }) == "3 4 ");
    CHECK(with([](auto& filter) { filter.until = "2031-04-30"; }) == "1 2 ");
    CHECK(with([](auto& filter) { filter.quantity = Quantity::damping_ratio; }) == "1 2 3 ");
    CHECK(with([](auto& filter) { filter.quantity = Quantity::stiffness; }).empty());
}

TEST_CASE("what is no result is refused and nothing is filed") {
    const Folder folder;
    Ledger ledger = Ledger::open_or_create(folder.file("shop.ledger"));
    for (const char* text : {"", "nonsense", "[]", "{}", R"({"schema":"ringwright.comparison.v1"})"}) {
        NewEntry entry;
        entry.result_json = text;
        CHECK_THROWS_AS(ledger.add(entry), InputError);
    }
    NewEntry bad_sheet = new_entry();
    bad_sheet.sheet_text = "[artcle]\n";
    CHECK_THROWS_AS(ledger.add(bad_sheet), InputError);
    CHECK(ledger.list().empty());
    CHECK(ledger.check().intact);
}

TEST_CASE("files that are no ledger are refused and left as they were") {
    const Folder folder;
    const std::string text = folder.file("notes.txt");
    std::ofstream(text) << std::string(5000, 'x');
    const std::string other = folder.file("other.db");
    { SQLite::Database(other, SQLite::OPEN_READWRITE | SQLite::OPEN_CREATE).exec("CREATE TABLE t(x)"); }
    for (const std::string& path : {text, other}) {
        const auto size = std::filesystem::file_size(path);
        CHECK_THROWS_AS(Ledger::open_or_create(path), InputError);
        CHECK_THROWS_AS(Ledger::open_to_read(path), InputError);
        CHECK(std::filesystem::file_size(path) == size);
    }
    SQLite::Database database(other, SQLite::OPEN_READONLY);
    CHECK(database.execAndGet("PRAGMA journal_mode").getString() == "delete");
    CHECK_THROWS_AS(Ledger::open_to_read(folder.file("absent")), InputError);
    CHECK_FALSE(std::filesystem::exists(folder.file("absent")));
    CHECK_THROWS_AS(Ledger::open_to_read(folder.path()), InputError);
    CHECK_THROWS_AS(Ledger::open_or_create(folder.path()), OutputError);
    CHECK_THROWS_AS(Ledger::open_or_create(folder.file("no/such/folder.ledger")), OutputError);
    std::ofstream(folder.file("empty"));
    CHECK_THROWS_AS(Ledger::open_to_read(folder.file("empty")), InputError);
}

TEST_CASE("a ledger from a newer version is refused and left as it was") {
    const Folder folder;
    const std::string path = filled(folder, 1);
    { SQLite::Database(path, SQLite::OPEN_READWRITE).exec("PRAGMA user_version = 99"); }
    CHECK_THROWS_AS(Ledger::open_or_create(path), InputError);
    CHECK_THROWS_AS(Ledger::open_to_read(path), InputError);
    CHECK(SQLite::Database(path).execAndGet("PRAGMA user_version").getInt() == 99);
}

TEST_CASE("a ledger of the first schema is lifted and keeps its entries") {
    const Folder folder;
    const std::string path = folder.file("old.ledger");
    {
        SQLite::Database database(path, SQLite::OPEN_READWRITE | SQLite::OPEN_CREATE);
        database.exec("BEGIN IMMEDIATE");
        schema::lift(database, 0, 1);
        database.exec("COMMIT");
        // Version 1 is version 2 without indexes, so an entry can be carried over as it is.
        const std::string source = filled(folder, 2);
        database.exec("ATTACH '" + source + "' AS source");
        for (const char* table : {"entries", "figures", "seals"})
            database.exec(fmt::format("INSERT INTO main.{0} SELECT * FROM source.{0}", table));
    }
    CHECK(Ledger::open_to_read(path).list().size() == 2);
    Ledger::open_or_create(path).add(new_entry());
    SQLite::Database database(path);
    CHECK(database.execAndGet("PRAGMA user_version").getInt() == schema::current_version);
    const LedgerCheck checked = check(path);
    CHECK(checked.intact);
    CHECK(checked.entries == 3);
}

TEST_CASE("a full disk is said and loses nothing") {
    const Folder folder;
    const std::string path = filled(folder, 3);
    const pid_t child = fork();
    if (child == 0) {
        // No file may grow: what a full disk looks like to a process.
        std::signal(SIGXFSZ, SIG_IGN);
        const rlimit nothing{0, 0};
        setrlimit(RLIMIT_FSIZE, &nothing);
        try {
            Ledger::open_or_create(path).add(new_entry());
        } catch (const OutputError&) {
            _exit(6);
        } catch (...) {
            _exit(99);
        }
        _exit(0);
    }
    int status = 0;
    REQUIRE(waitpid(child, &status, 0) == child);
    CHECK(WEXITSTATUS(status) == 6);
    CHECK(check(path).entries == 3);
    CHECK(check(path).intact);
    CHECK(Ledger::open_or_create(path).add(new_entry()).number == 4);
}

TEST_CASE("a folder that cannot be written: adding is refused, reading goes on") {
    const Folder folder;
    const std::string path = filled(folder, 3);
    REQUIRE(chmod(folder.path().c_str(), 0555) == 0);
    REQUIRE(chmod(path.c_str(), 0444) == 0);
    const pid_t child = fork();
    if (child == 0) {
        // The superuser may write anywhere; nobody may not.
        if (geteuid() == 0 && setuid(65534) != 0) _exit(98);
        const auto refused = [](const std::string& file) {
            try {
                Ledger::open_or_create(file).add(new_entry());
            } catch (const OutputError&) {
                return true;
            }
            return false;
        };
        try {
            const bool read =
                Ledger::open_to_read(path).list().size() == 3 && Ledger::open_to_read(path).check().intact;
            _exit((refused(path) ? 1 : 0) + (refused(folder.file("new.ledger")) ? 2 : 0) + (read ? 4 : 0));
        } catch (...) {
            _exit(99);
        }
    }
    int status = 0;
    REQUIRE(waitpid(child, &status, 0) == child);
    CHECK(WEXITSTATUS(status) == 7);
    chmod(folder.path().c_str(), 0755);
    CHECK(check(path).intact);
}

TEST_CASE("cells of CSV are no formulas") {
    EntrySummary entry;
    entry.number = 1;
    entry.article_type = "=HYPERLINK(\"x\")";
    entry.serial = "-1+1";
    entry.test_operator = "a, \"b\"";
    const std::string csv = summaries_as_csv({entry});
    CHECK(csv.find("\"'=HYPERLINK(\"\"x\"\")\"") != std::string::npos);
    CHECK(csv.find(",'-1+1,") != std::string::npos);
    CHECK(csv.find("\"a, \"\"b\"\"\"") != std::string::npos);
}

TEST_CASE("every line of the figures table has as many cells as its header") {
    const Folder folder;
    const std::string path = filled(folder, 1);
    const LedgerEntry entry = Ledger::open_to_read(path).get(1);
    const auto commas = [](const std::string& text, std::size_t begin) {
        const auto end = text.begin() + static_cast<std::ptrdiff_t>(text.find('\n', begin));
        return std::count(text.begin() + static_cast<std::ptrdiff_t>(begin), end, ',');
    };
    const auto wanted = commas(figures_csv_header(), 0);
    const std::string lines = entry_as_figures_csv(entry);
    CHECK(commas(lines, 0) == wanted);
    LedgerEntry bare;
    CHECK(commas(entry_as_figures_csv(bare), 0) == wanted);
    CHECK(commas(summaries_as_csv({bare.summary}), 0) ==
          commas(summaries_as_csv({bare.summary}), summaries_as_csv({}).size()));
}

// "Within a second or so": 2 s of the processor's time are allowed here, because a sanitizer slows it. Time
// on the wall is not asked for: it says how busy the machine is with other work.
TEST_CASE("ten thousand entries are listed and charted in about a second", "[speed]") {
    const Folder folder;
    const std::string path = folder.file("large.ledger");
    {
        // Filed in one transaction, with the hashes left out: only reading is measured here.
        (void)Ledger::open_or_create(path);
        SQLite::Database database(path, SQLite::OPEN_READWRITE);
        database.exec("PRAGMA synchronous = OFF");
        database.exec("BEGIN");
        SQLite::Statement entry(database,
                                "INSERT INTO entries VALUES(?1, '2031-04-02T00:00:00.000Z', '0.1.0', '', "
                                "?1, NULL, '', 'sash damper S2', ?1 % 50, 'day', '2031-04-02', 'conforms', "
                                "'[]', '[]', 's', 's', ?2)");
        SQLite::Statement figure(database,
                                 "INSERT INTO figures VALUES(?1, ?2, '1', 0.27, 0.004, 0.26, 0.28, NULL)");
        const std::string result(8000, 'x');
        for (int number = 1; number <= 10000; ++number) {
            entry.reset();
            entry.bind(1, number);
            entry.bind(2, result);
            entry.exec();
            for (const char* quantity : {"damping_ratio", "natural_frequency", "stiffness", "mass"}) {
                figure.reset();
                figure.bind(1, number);
                figure.bind(2, quantity);
                figure.exec();
            }
        }
        database.exec("COMMIT");
    }
    const Ledger ledger = Ledger::open_to_read(path);
    const std::clock_t begin = std::clock();
    CHECK(ledger.list().size() == 10000);
    CHECK(ledger.values(Quantity::damping_ratio).size() == 10000);
    LedgerFilter one;
    one.serial = "7";
    CHECK(ledger.values(Quantity::damping_ratio, one).size() == 200);
    const double taken = static_cast<double>(std::clock() - begin) / CLOCKS_PER_SEC;
    INFO("seconds: " << taken);
    CHECK(taken < 2.0);
}
