#pragma once
// Filing a result in the ledger, and what is needed to run it again.

#include <optional>
#include <string>
#include <vector>

#include "ringwright/analysis.hpp"
#include "ringwright/ledger.hpp"
#include "ringwright/test_sheet.hpp"

namespace CLI {
class App;
}

namespace ringwright::app {

/// The options given on the command line, one text each ("--mass=12.4 kg"), without the FILEs, their added
/// masses and what concerns only where the answer goes.
[[nodiscard]] std::vector<std::string> given_options(const CLI::App& command);

/// The recordings of an identification with size and hash.
[[nodiscard]] std::vector<LedgerRecording> recordings_of(const Identification& identification);

/// Files the result and says on standard error which entry it became.
void file_result(const std::string& ledger_path, const std::string& result_json,
                 const std::optional<TestSheet>& sheet, std::vector<std::string> options,
                 std::vector<LedgerRecording> recordings);

/// --ledger, else the environment variable RINGWRIGHT_LEDGER, else ringwright.ledger in this folder.
[[nodiscard]] std::string ledger_path_from(const std::string& option);

/// Today in UTC.
[[nodiscard]] Date today();

}  // namespace ringwright::app
