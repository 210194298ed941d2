#pragma once
// The parts of an entry that are kept as JSON text.

#include <string>
#include <string_view>
#include <vector>

#include "ringwright/ledger.hpp"

namespace ringwright::documents {

[[nodiscard]] std::string arguments_as_json(const std::vector<std::string>& arguments);
[[nodiscard]] std::vector<std::string> arguments_from_json(std::string_view text);
[[nodiscard]] std::string recordings_as_json(const std::vector<LedgerRecording>& recordings);
[[nodiscard]] std::vector<LedgerRecording> recordings_from_json(std::string_view text);

}  // namespace ringwright::documents
