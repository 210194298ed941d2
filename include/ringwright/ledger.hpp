#pragma once
// The ledger: an append-only store of results in one SQLite file, each entry chained to the one before it.

#include <cstdint>
#include <functional>
#include <memory>
#include <optional>
#include <string>
#include <string_view>
#include <vector>

#include "ringwright/estimate.hpp"

namespace ringwright {

/// A recording that a result rests on: enough to find it again and to tell that it is the same.
struct LedgerRecording {
    std::string file;                    ///< as the user named it
    std::string sha256;                  ///< of its bytes, lower-case hex
    std::optional<std::uint64_t> bytes;  ///< its size, where known
    std::string channel;
    std::string added_mass;  ///< as written; empty when none
};

/// One quantity of one entry, SI units.
struct LedgerFigure {
    Quantity quantity = Quantity::natural_frequency;
    std::string unit;
    double value = 0.0;
    double standard_uncertainty = 0.0;
    std::optional<double> low, high;
    std::optional<double> degrees_of_freedom;  ///< absent: nothing limits them
};

/// What is filed. Everything else of an entry follows from it.
struct NewEntry {
    std::string result_json;                  ///< ringwright.identification.v1; empty for a withdrawal
    std::string sheet_name, sheet_text;       ///< the test sheet, every byte of it; empty when none
    std::vector<std::string> arguments;       ///< of the command line that gave the result, files left out
    std::vector<LedgerRecording> recordings;  ///< empty: as the result names them
    std::optional<std::int64_t> supersedes;   ///< the number of the entry that this one replaces
    std::string reason;                       ///< why; needed with `supersedes`
    std::string utc;                          ///< "2031-04-02T08:15:30.123Z"; empty: now
};

/// An entry as it is listed.
struct EntrySummary {
    std::int64_t number = 0;
    std::string utc;
    std::string software_version;
    std::string article_type, serial, test_operator, test_date;  ///< from the sheet; empty when not said
    std::string decision;  ///< "conforms", "does_not_conform", "undecided", or empty when not judged
    std::optional<std::int64_t> supersedes, superseded_by;
    std::string reason;
    std::string hash, previous_hash;
};

/// A whole entry.
struct LedgerEntry {
    EntrySummary summary;
    std::vector<LedgerRecording> recordings;
    std::vector<LedgerFigure> figures;
    std::vector<std::string> arguments;
    std::string sheet_name, sheet_text;
    std::string result_json;
};

/// Which entries. Texts must be equal; dates are "2031-04-02", both ends included, and are held against the
/// date of the test, or of the entry where the sheet has none.
struct LedgerFilter {
    std::optional<std::string> article_type, serial, test_operator, decision, since, until;
    std::optional<Quantity> quantity;  ///< entries that hold it
    bool with_superseded = true;
};

/// One value of a quantity over the entries, for charts.
struct LedgerValue {
    std::int64_t number = 0;
    std::string day;  ///< of the test, or of the entry
    std::string article_type, serial, test_operator;
    std::string unit;
    double value = 0.0;
    double standard_uncertainty = 0.0;
};

/// What a walk along the chain found.
struct LedgerCheck {
    bool intact = true;
    std::int64_t entries = 0;  ///< that are there
    std::optional<std::int64_t>
        first_bad;      ///< the first entry that does not hold; absent: a fault of the whole
    std::string fault;  ///< what is wrong with it, as a sentence
    std::string head;   ///< hash of the last entry; empty for an empty ledger
};

/// A connection to one ledger file. Entries are durable when `add` returns (write-ahead log, synchronous
/// FULL); many processes may add and read at once. Throws InputError when the file is no ledger, is damaged,
/// or was written by a newer version; OutputError when it cannot be written: disk full, no permission, or
/// locked for more than half a minute. A ledger that is refused is not touched.
class Ledger {
  public:
    /// For adding; creates the file where there is none, lifts an older schema to the present one.
    [[nodiscard]] static Ledger open_or_create(const std::string& path);
    /// For reading; throws InputError where there is no file.
    [[nodiscard]] static Ledger open_to_read(const std::string& path);
    Ledger(Ledger&&) noexcept;
    Ledger& operator=(Ledger&&) noexcept;
    ~Ledger();

    /// Files the entry and returns it. Throws InputError when the result is no ringwright.identification.v1,
    /// the sheet cannot be read, or `supersedes` names no entry, one that is superseded already, or comes
    /// without a reason.
    EntrySummary add(const NewEntry& entry);
    [[nodiscard]] std::vector<EntrySummary> list(const LedgerFilter& filter = {}) const;
    /// Throws InputError when there is no such entry.
    [[nodiscard]] LedgerEntry get(std::int64_t number) const;
    /// Values of a quantity in the order of their tests, superseded entries left out.
    [[nodiscard]] std::vector<LedgerValue> values(Quantity quantity, const LedgerFilter& filter = {}) const;
    /// Walks the whole chain.
    [[nodiscard]] LedgerCheck check() const;
    [[nodiscard]] const std::string& path() const;

  private:
    struct Connection;
    explicit Ledger(std::unique_ptr<Connection> connection);
    std::unique_ptr<Connection> connection_;
};

/// Text that a hash covers: `name length` and the bytes themselves for every field, so that no two entries
/// have the same (docs/ledger.md).
[[nodiscard]] std::string canonical_text(const LedgerEntry& entry);
/// SHA-256 as lower-case hex.
[[nodiscard]] std::string sha256_of(std::string_view bytes);
/// The same of a file, read piece by piece; empty when it cannot be read.
[[nodiscard]] std::string sha256_of_file(const std::string& path);

/// The recordings and figures that a result names. Throws InputError (`name` stands for the file) when it is
/// no ringwright.identification.v1.
struct ResultFacts {
    std::string decision;
    std::vector<LedgerRecording> recordings;
    std::vector<LedgerFigure> figures;
};
[[nodiscard]] ResultFacts facts_of_result(std::string_view result_json, const std::string& name);

/// CSV with a header line (RFC 4180). A text that a spreadsheet would run as a formula (it begins with = + -
/// @, tab or carriage return) is led by an apostrophe.
[[nodiscard]] std::string summaries_as_csv(const std::vector<EntrySummary>& entries);
[[nodiscard]] std::string summaries_as_json(const std::vector<EntrySummary>& entries);
/// The whole entry; result and recordings as JSON, not as text.
[[nodiscard]] std::string entry_as_json(const LedgerEntry& entry);
/// One line a figure of each entry (an entry without figures has one line).
[[nodiscard]] std::string figures_csv_header();
[[nodiscard]] std::string entry_as_figures_csv(const LedgerEntry& entry);

}  // namespace ringwright
