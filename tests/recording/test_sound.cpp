// Sound files written here with libsndfile, read back by the room. Truth: the formula in ring(); tolerance:
// half a quantisation step of the format.
#include <sndfile.h>

#include <catch2/catch.hpp>
#include <cmath>
#include <cstring>
#include <string>
#include <vector>

#include "recording/bench_table.hpp"
#include "ringwright/error.hpp"

using namespace ringwright;
using bench::has_finding;

namespace {

constexpr int rate = 8000;
constexpr int frames = 8000;

double ring(int i) {
    const double t = i / static_cast<double>(rate);
    return 0.8 * std::exp(-4.0 * t) * std::sin(2.0 * 3.141592653589793 * 120.0 * t);
}

struct Memory {
    std::string bytes;
    sf_count_t at = 0;
};

sf_count_t length_of(void* user) {
    return static_cast<sf_count_t>(static_cast<Memory*>(user)->bytes.size());
}
sf_count_t seek_in(sf_count_t offset, int whence, void* user) {
    auto* memory = static_cast<Memory*>(user);
    memory->at = offset + (whence == SEEK_SET ? 0 : whence == SEEK_CUR ? memory->at : length_of(user));
    return memory->at;
}
sf_count_t read_from(void* target, sf_count_t count, void* user) {
    auto* memory = static_cast<Memory*>(user);
    count = std::min(count, length_of(user) - memory->at);
    std::memcpy(target, memory->bytes.data() + memory->at, static_cast<std::size_t>(count));
    memory->at += count;
    return count;
}
sf_count_t write_to(const void* source, sf_count_t count, void* user) {
    auto* memory = static_cast<Memory*>(user);
    const auto end = static_cast<std::size_t>(memory->at + count);
    if (memory->bytes.size() < end) memory->bytes.resize(end);
    std::memcpy(memory->bytes.data() + memory->at, source, static_cast<std::size_t>(count));
    memory->at += count;
    return count;
}
sf_count_t place_in(void* user) {
    return static_cast<Memory*>(user)->at;
}

// `tracks` tracks of which the last rings and the others hiss.
std::string sound(int format, int tracks = 1, double gain = 1.0) {
    Memory memory;
    SF_VIRTUAL_IO io{length_of, seek_in, read_from, write_to, place_in};
    SF_INFO info{};
    info.samplerate = rate;
    info.channels = tracks;
    info.format = format;
    SNDFILE* file = sf_open_virtual(&io, SFM_WRITE, &info, &memory);
    REQUIRE(file != nullptr);
    bench::Random random;
    std::vector<double> samples;
    for (int i = 0; i < frames; ++i)
        for (int c = 0; c < tracks; ++c)
            samples.push_back(c + 1 == tracks ? gain * ring(i) : 0.01 * (random.next() - 0.5));
    sf_writef_double(file, samples.data(), frames);
    sf_close(file);
    return memory.bytes;
}

double worst_error(const Recording& recording, double factor = 1.0) {
    if (recording.size() != static_cast<std::size_t>(frames)) return 1e9;
    double worst = 0.0;
    for (int i = 0; i < frames; ++i)
        worst = std::max(worst, std::abs(recording.samples[static_cast<std::size_t>(i)] / factor - ring(i)));
    return worst;
}

}  // namespace

TEST_CASE("sound files of every common kind are read") {
    struct Kind {
        const char* name;
        int format;
        double step;  // of the quantisation
    };
    const Kind kinds[] = {{"WAV 8", SF_FORMAT_WAV | SF_FORMAT_PCM_U8, 0x1p-7},
                          {"WAV 16", SF_FORMAT_WAV | SF_FORMAT_PCM_16, 0x1p-15},
                          {"WAV 24", SF_FORMAT_WAV | SF_FORMAT_PCM_24, 0x1p-23},
                          {"WAV 32", SF_FORMAT_WAV | SF_FORMAT_PCM_32, 0x1p-31},
                          {"WAV float", SF_FORMAT_WAV | SF_FORMAT_FLOAT, 0x1p-23},
                          {"WAV double", SF_FORMAT_WAV | SF_FORMAT_DOUBLE, 0x1p-50},
                          {"WAVEX 24", SF_FORMAT_WAVEX | SF_FORMAT_PCM_24, 0x1p-23},
                          {"RF64", SF_FORMAT_RF64 | SF_FORMAT_PCM_24, 0x1p-23},
                          {"W64", SF_FORMAT_W64 | SF_FORMAT_PCM_24, 0x1p-23},
                          {"AIFF", SF_FORMAT_AIFF | SF_FORMAT_PCM_24, 0x1p-23},
                          {"FLAC", SF_FORMAT_FLAC | SF_FORMAT_PCM_24, 0x1p-23},
                          {"CAF", SF_FORMAT_CAF | SF_FORMAT_PCM_24, 0x1p-23}};
    for (const Kind& kind : kinds) {
        INFO(kind.name);
        const Recording recording = read_recording_from_memory(sound(kind.format), "tap.wav");
        // libsndfile scales by 2^(bits-1) on reading and 2^(bits-1) - 1 on writing: one more step at full
        // scale.
        CHECK(worst_error(recording) < 1.6 * kind.step);
        CHECK(recording.clock.sample_rate_hz == rate);
        CHECK(recording.clock.uniform());
        CHECK(recording.unit.symbol == "full scale");
        CHECK_FALSE(recording.scaled);
        CHECK_FALSE(recording.quantity_known);
        CHECK(has_finding(recording.findings, "no_scale"));
        CHECK(has_finding(recording.findings, "quantity_assumed"));
    }
}

TEST_CASE("sensitivity and full scale make units") {
    ReadOptions options;
    options.full_scale = "5 V";
    options.sensitivity = "100 mV/g";
    const Recording recording =
        read_recording_from_memory(sound(SF_FORMAT_WAV | SF_FORMAT_PCM_24), "tap.wav", options);
    CHECK(recording.scaled);
    CHECK(recording.quantity == MeasuredQuantity::acceleration);
    CHECK(recording.quantity_known);
    CHECK(recording.unit.symbol == "g");
    // 5 V / (0.1 V/g) = 50 g at full scale; g_n = 9.80665 m/s² (NIST SP 811).
    CHECK(worst_error(recording, 50.0 * 9.80665) < 1.6 * 0x1p-23);

    options.sensitivity.reset();
    const Recording volts =
        read_recording_from_memory(sound(SF_FORMAT_WAV | SF_FORMAT_PCM_24), "tap.wav", options);
    CHECK(volts.unit.symbol == "V");
    CHECK_FALSE(volts.scaled);
    CHECK(worst_error(volts, 5.0) < 1.6 * 0x1p-23);

    options.full_scale.reset();
    options.sensitivity = "100 mV/g";
    CHECK_THROWS_AS(read_recording_from_memory(sound(SF_FORMAT_WAV | SF_FORMAT_PCM_24), "tap.wav", options),
                    UsageError);
    options.full_scale = "5 kg";
    CHECK_THROWS_AS(read_recording_from_memory(sound(SF_FORMAT_WAV | SF_FORMAT_PCM_24), "tap.wav", options),
                    UsageError);
    for (const char* text : {"", "g", "100 mV", "100 g", "mV/g", "-1 mV/g", "100 mV/kg", "100 mm/g"}) {
        INFO(text);
        options.full_scale = "5 V";
        options.sensitivity = text;
        CHECK_THROWS_AS(
            read_recording_from_memory(sound(SF_FORMAT_WAV | SF_FORMAT_PCM_16), "tap.wav", options),
            UsageError);
    }
}

TEST_CASE("the track that rings is taken, or the one that is named") {
    const std::string stereo = sound(SF_FORMAT_WAV | SF_FORMAT_PCM_24, 2);
    const Recording clearest = read_recording_from_memory(stereo, "two.wav");
    CHECK(clearest.origin.channel == "2");
    CHECK(has_finding(clearest.findings, "channel_chosen"));
    ReadOptions options;
    options.channel = "1";
    CHECK(read_recording_from_memory(stereo, "two.wav", options).origin.channel == "1");
    options.channel = "right";
    CHECK(read_recording_from_memory(stereo, "two.wav", options).origin.channel == "2");
    for (const char* name : {"0", "3", "laser", ""}) {
        options.channel = name;
        CHECK_THROWS_AS(read_recording_from_memory(stereo, "two.wav", options), UsageError);
    }
}

TEST_CASE("headers that do not tell the truth") {
    std::string wav = sound(SF_FORMAT_WAV | SF_FORMAT_PCM_16);
    const std::size_t data = wav.find("data");
    REQUIRE(data != std::string::npos);
    SECTION("a cut file is read as far as it goes") {
        const Recording recording =
            read_recording_from_memory(std::string_view(wav).substr(0, wav.size() / 2), "cut.wav");
        CHECK(recording.size() > 3900);
        CHECK(recording.size() < 4000);
        CHECK(has_finding(recording.findings, "cut_file"));
    }
    SECTION("sizes that were never written") {
        for (const int byte : {0x00, 0xFF}) {
            INFO(byte);
            std::string broken = wav;
            std::fill_n(broken.begin() + 4, 4, static_cast<char>(byte));
            std::fill_n(broken.begin() + static_cast<std::ptrdiff_t>(data) + 4, 4, static_cast<char>(byte));
            CHECK(read_recording_from_memory(broken, "power.wav").size() == frames);
        }
    }
    SECTION("a claim of 10^9 bytes is not believed") {
        wav.replace(data + 4, 4, std::string("\x00\xCA\x9A\x3B", 4));
        const Recording recording = read_recording_from_memory(wav, "claim.wav");
        CHECK(recording.size() == frames);
        CHECK(recording.samples.capacity() <= wav.size());
    }
    SECTION("damage ends in an answer or an exception") {
        bench::Random random;
        for (int trial = 0; trial < 300; ++trial) {
            std::string damaged = wav.substr(0, 2000);
            for (int k = 0; k < 6; ++k)
                damaged[static_cast<std::size_t>(random.next() * 60.0)] =
                    static_cast<char>(random.next() * 256.0 - 128.0);
            try {
                const Recording recording = read_recording_from_memory(damaged, "damaged.wav");
                CHECK(recording.size() >= 16);
            } catch (const InputError&) {
            }
        }
    }
}
