// Text recordings. The first byte chooses options.

#include "fuzz/reading.hpp"

using namespace ringwright;

extern "C" int LLVMFuzzerTestOneInput(const std::uint8_t* data, std::size_t size) {
    if (size == 0) return 0;
    const std::string_view bytes = fuzz::text_of(data + 1, size - 1);
    fuzz::with_messages(
        [&] { fuzz::check(read_recording_from_memory(bytes, "fuzz.csv", fuzz::options_from(*data)), size); });
    return 0;
}
