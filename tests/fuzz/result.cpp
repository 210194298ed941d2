// Results as JSON: what verify's successors, the ledger and the report read back.

#include <nlohmann/json.hpp>
#include <string>

#include "fuzz/reading.hpp"
#include "ringwright/report_document.hpp"
#include "ringwright/result_json.hpp"

using namespace ringwright;

extern "C" int LLVMFuzzerTestOneInput(const std::uint8_t* data, std::size_t size) {
    const std::string text(fuzz::text_of(data, size));
    fuzz::with_messages([&] { (void)figures_of_result(text, "fuzz.json"); });
    const auto json = nlohmann::ordered_json::parse(text, nullptr, false);
    if (json.is_discarded() || !json.is_object()) return 0;
    const auto result = json.find("result");
    fuzz::with_messages([&] {
        (void)quantities_from_json(result == json.end() ? json : *result, "fuzz.json");
        if (result != json.end() && result->is_object() && result->contains("quantities"))
            (void)quantities_from_json((*result)["quantities"], "fuzz.json");
    });
    return 0;
}
