// Sound files; what does not begin like one is read as text and of no interest here.

#include <string>

#include "fuzz/reading.hpp"

using namespace ringwright;

extern "C" int LLVMFuzzerTestOneInput(const std::uint8_t* data, std::size_t size) {
    static constexpr std::string_view beginnings[] = {"RIFF", "RIFX", "RF64", "fLaC", "caff",
                                                      ".snd", "OggS", "riff", "FORM"};
    if (size < 5) return 0;
    const std::string_view bytes = fuzz::text_of(data + 1, size - 1);
    bool sound = false;
    for (const std::string_view beginning : beginnings) sound = sound || bytes.starts_with(beginning);
    if (!sound) return -1;
    fuzz::with_messages(
        [&] { fuzz::check(read_recording_from_memory(bytes, "fuzz.wav", fuzz::options_from(*data)), size); });
    return 0;
}
