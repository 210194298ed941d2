// Test sheets.

#include "fuzz/reading.hpp"
#include "ringwright/test_sheet.hpp"

using namespace ringwright;

extern "C" int LLVMFuzzerTestOneInput(const std::uint8_t* data, std::size_t size) {
    fuzz::with_messages([&] {
        const TestSheet sheet = read_test_sheet_from_memory(fuzz::text_of(data, size), "fuzz.toml");
        (void)sheet_findings(sheet, Date{});
        for (const Limit& limit : limits_of(sheet)) {
            fuzz::promise(limit.lower || limit.upper);
            fuzz::promise(!limit.lower || !limit.upper || *limit.lower <= *limit.upper);
        }
    });
    return 0;
}
