#pragma once
// A result as JSON, run again on its recordings for what the JSON does not hold: the samples and the fits.

#include <nlohmann/json_fwd.hpp>
#include <optional>
#include <string>
#include <vector>

#include "ringwright/analysis.hpp"
#include "ringwright/test_sheet.hpp"

namespace ringwright::app {

/// What came of it: the identification with samples and pictures, or a sentence for each recording why not.
struct RunAgain {
    std::optional<Identification> identification;
    std::vector<std::string> missing;
    std::vector<std::string> differences;  ///< a sentence over the quantities that come out otherwise
};

/// Looks for each recording under the path that the result names, then beside the result and in `folders`,
/// and takes it only when its SHA-256 is the one in the result. `file` is the path of the result. The test
/// sheet is `sheet`, else it is looked for in the same way.
[[nodiscard]] RunAgain run_again(const nlohmann::ordered_json& result, const std::string& file,
                                 const std::vector<std::string>& folders,
                                 const std::optional<TestSheet>& sheet = std::nullopt);

}  // namespace ringwright::app
