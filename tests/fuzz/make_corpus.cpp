// Good and damaged recordings, small, for the fuzz targets to begin with: make_corpus FOLDER writes
// FOLDER/csv, sound and identify. The byte before each stands for options.

#include <filesystem>
#include <fstream>

#include "faults/damage.hpp"

using namespace ringwright::test;

namespace {

void write(const std::filesystem::path& folder, const std::string& name, const std::string& bytes) {
    std::filesystem::create_directories(folder);
    std::ofstream(folder / name, std::ios::binary) << '\0' << bytes;
}

}  // namespace

int main(int count, char** arguments) {
    if (count != 2) return 2;
    const std::filesystem::path folder = arguments[1];
    for (std::uint64_t seed = 0; seed < 300; ++seed) {
        const DamagedFile file = damaged_file(seed);
        if (file.bytes.size() > 40'000) continue;
        const std::string name = "made-" + std::to_string(seed);
        write(folder / (file.ending == ".csv" ? "csv" : "sound"), name, file.bytes);
        if (seed % 4 == 0) write(folder / "identify", name, file.bytes);
    }
    write(folder / "sound", "plain", wav_bytes({}, 400));
    write(folder / "sound", "rf64", rf64_bytes(400, 400));
}
