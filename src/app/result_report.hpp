#pragma once
// The report of a result that lies before us as JSON, with what its recordings add.

#include <nlohmann/json_fwd.hpp>
#include <optional>
#include <string>
#include <vector>

#include "app/drawing.hpp"
#include "ringwright/test_sheet.hpp"

namespace ringwright::app {

struct ResultToDraw {
    const nlohmann::ordered_json& result;  ///< of any schema that ReportInput takes
    std::string name;                      ///< in messages
    std::string file;                      ///< recordings are looked for beside it
    std::vector<std::string> folders;      ///< and in these
    std::optional<TestSheet> sheet;        ///< that it goes with, where it is at hand
};

/// Draws it into `output`, whose ending says in which form. What could not be drawn, and a number that does
/// not come out again, is said in the report and on standard error. Throws as drawn_answer.
void draw_result(const ResultToDraw& drawn, const DrawingArguments& arguments, const std::string& output);

}  // namespace ringwright::app
