#include "app/identify_answers.hpp"

#include <nlohmann/json.hpp>

#include "app/filing.hpp"
#include "app/test_arguments.hpp"
#include "ringwright/result_csv.hpp"
#include "ringwright/result_json.hpp"
#include "ringwright/result_text.hpp"

namespace ringwright::app {

nlohmann::ordered_json document_of(const Identification& identification, const IdentifyArguments& arguments) {
    nlohmann::ordered_json json = to_json(identification);
    if (arguments.read_sheet)
        json["test_sheet"] = nlohmann::ordered_json::parse(sheet_facts_json(*arguments.read_sheet));
    json["options"] = given_options(*arguments.command);
    return json;
}

std::string filed_text(const Identification& identification, const IdentifyArguments& arguments) {
    return to_text(document_of(identification, arguments), -1);
}

std::string answer_text(const Identification& identification, const IdentifyArguments& arguments,
                        Format format) {
    if (format == Format::json) return to_text(document_of(identification, arguments));
    return format == Format::csv ? to_csv(identification) : to_text(identification);
}

}  // namespace ringwright::app
