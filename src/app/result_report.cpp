#include "app/result_report.hpp"

#include <nlohmann/json.hpp>

#include "app/messages.hpp"
#include "app/run_again.hpp"

namespace ringwright::app {
namespace {

bool rests_on_recordings(const nlohmann::ordered_json& result) {
    const auto schema = result.find("schema");
    return schema != result.end() && schema->is_string() &&
           schema->get_ref<const std::string&>() == "ringwright.identification.v1";
}

}  // namespace

void draw_result(const ResultToDraw& drawn, const DrawingArguments& arguments, const std::string& output) {
    const DrawnForm form = drawn_form_of(output).value();
    using Json = nlohmann::ordered_json;
    ReportInput input;
    input.result_json = drawn.result.dump(-1, ' ', false, Json::error_handler_t::replace);
    input.file = drawn.name;
    if (rests_on_recordings(drawn.result)) {
        const RunAgain again = run_again(drawn.result, drawn.file, drawn.folders, drawn.sheet);
        if (again.identification) input.figures = sample_figures(*again.identification);
        input.missing_figures = again.missing;
        input.differences = again.differences;
    }
    write_answer(drawn_answer(input, arguments, form), output);
    for (const std::string& missing : input.missing_figures)
        say({drawn.name, "", without_period(missing), "Name the folder with it: --recordings FOLDER"});
    for (const std::string& difference : input.differences)
        say({drawn.name, "", without_period(difference),
             "The version that wrote the result is named in it; see whether the options are the same"});
}

}  // namespace ringwright::app
