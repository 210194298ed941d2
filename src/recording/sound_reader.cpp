#include "recording/sound_reader.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <cstring>
#include <limits>
#include <memory>
#include <optional>

#include "recording/channel_scale.hpp"
#include "recording/quantity_words.hpp"
#include "recording/signal_clarity.hpp"
#include "recording/sound_library.hpp"
#include "ringwright/error.hpp"
#include "ringwright/measured_value.hpp"

namespace ringwright {
namespace {

using namespace std::string_view_literals;

constexpr sf_count_t block_frames = 4096;

void add(Findings& findings, const char* code, Severity severity, std::string message) {
    findings.push_back(Finding{code, severity, std::move(message)});
}

std::uint32_t little_endian(std::string_view bytes, std::size_t at) {
    std::uint32_t value = 0;
    for (std::size_t i = 4; i-- > 0;) value = (value << 8) | static_cast<unsigned char>(bytes[at + i]);
    return value;
}

// Four bytes of a header that are read otherwise than they stand there.
struct Patch {
    std::size_t at = 0;
    std::array<char, 4> bytes{};
    bool active = false;
};

// A recorder that lost power leaves a data chunk of length 0: it is read to the end of the file.
Patch data_length_patch(std::string_view bytes) {
    Patch patch;
    if (!bytes.starts_with("RIFF")) return patch;
    for (std::size_t at = 12; at + 8 <= bytes.size();) {
        const std::uint32_t size = little_endian(bytes, at + 4);
        if (bytes.substr(at, 4) == "data") {
            const std::size_t there = std::min<std::size_t>(bytes.size() - at - 8, 0x7FFFFFF0);
            patch.active = size == 0 && there > 64;
            patch.at = at + 4;
            for (std::size_t i = 0; i < 4; ++i) patch.bytes[i] = static_cast<char>((there >> (8 * i)) & 0xFF);
            return patch;
        }
        at += std::size_t{8} + size + (size & 1U);
    }
    return patch;
}

// The bytes as libsndfile's virtual file.
struct ByteFile {
    std::string_view bytes;
    sf_count_t at = 0;
    Patch patch;
};

sf_count_t file_length(void* user) {
    return static_cast<sf_count_t>(static_cast<ByteFile*>(user)->bytes.size());
}

sf_count_t seek_to(sf_count_t offset, int whence, void* user) {
    auto* file = static_cast<ByteFile*>(user);
    const sf_count_t base = whence == SEEK_SET ? 0 : whence == SEEK_CUR ? file->at : file_length(user);
    file->at = std::clamp<sf_count_t>(base + offset, 0, file_length(user));
    return file->at;
}

sf_count_t read_bytes(void* target, sf_count_t count, void* user) {
    auto* file = static_cast<ByteFile*>(user);
    const sf_count_t available = std::clamp<sf_count_t>(count, 0, file_length(user) - file->at);
    const auto begin = static_cast<std::size_t>(file->at), size = static_cast<std::size_t>(available);
    std::memcpy(target, file->bytes.data() + begin, size);
    for (std::size_t i = 0; file->patch.active && i < 4; ++i)
        if (const std::size_t place = file->patch.at + i; place >= begin && place < begin + size)
            static_cast<char*>(target)[place - begin] = file->patch.bytes[i];
    file->at += available;
    return available;
}

sf_count_t write_nothing(const void*, sf_count_t, void*) {
    return 0;
}
sf_count_t position(void* user) {
    return static_cast<ByteFile*>(user)->at;
}

class SoundFile {
  public:
    SoundFile(std::string_view bytes, const std::string& name) : file_{bytes, 0, data_length_patch(bytes)} {
        SF_VIRTUAL_IO io{file_length, seek_to, read_bytes, write_nothing, position};
        handle_.reset(sound_library().open_virtual(&io, SFM_READ, &info_, &file_));
        const bool usable = handle_ && info_.channels > 0 && info_.samplerate > 0 && info_.channels <= 4096;
        if (usable) return;
        std::string reason =
            handle_ ? "it names no tracks or no sampling rate" : sound_library().strerror(nullptr);
        while (!reason.empty() && (reason.back() == '.' || reason.back() == '\n')) reason.pop_back();
        throw InputError(Problem{name, "", "the sound file cannot be decoded (" + reason + ")",
                                 "The file may be cut or damaged; export it again as WAV."});
    }

    [[nodiscard]] const SF_INFO& info() const { return info_; }
    [[nodiscard]] std::size_t channels() const { return static_cast<std::size_t>(info_.channels); }
    [[nodiscard]] std::size_t byte_count() const { return file_.bytes.size(); }

    // Calls `take(block, frames)` with interleaved frames, from the first to the last that can be decoded.
    template <typename Take>
    void for_each_block(Take take) {
        sound_library().seek(handle_.get(), 0, SEEK_SET);
        std::vector<double> block(static_cast<std::size_t>(block_frames) * channels());
        for (sf_count_t done = 0; done < most_frames();) {
            const sf_count_t frames = sound_library().readf_double(handle_.get(), block.data(), block_frames);
            if (frames <= 0) break;
            take(block, static_cast<std::size_t>(frames));
            done += frames;
        }
    }

    // Samples bounded by the bytes: packed silence must not grow without end.
    [[nodiscard]] sf_count_t most_frames() const {
        return static_cast<sf_count_t>(byte_count()) * 64 + 1'000'000;
    }

    [[nodiscard]] bool is_float() const {
        const int subtype = info_.format & SF_FORMAT_SUBMASK;
        return subtype == SF_FORMAT_FLOAT || subtype == SF_FORMAT_DOUBLE;
    }

    [[nodiscard]] std::string name_of(int format) const {
        SF_FORMAT_INFO names{};
        names.format = format;
        if (sound_library().command(handle_.get(), SFC_GET_FORMAT_INFO, &names, sizeof names) != 0 ||
            names.name == nullptr)
            return "";
        return names.name;
    }

  private:
    struct Closer {
        void operator()(SNDFILE* handle) const { sound_library().close(handle); }
    };
    ByteFile file_;
    SF_INFO info_{};
    std::unique_ptr<SNDFILE, Closer> handle_;
};

std::optional<std::size_t> track_named(const std::string& wanted, std::size_t channels) {
    const std::string name = folded(wanted);
    if (channels == 2 && (name == "left" || name == "l")) return 0;
    if (channels == 2 && (name == "right" || name == "r")) return 1;
    if (name.empty() || name.size() > 4 || name.find_first_not_of("0123456789") != std::string::npos)
        return std::nullopt;
    const std::size_t number = std::stoul(name);
    if (number < 1 || number > channels) return std::nullopt;
    return number - 1;
}

// The track with the clearest signal, from at most 64 million samples.
std::size_t clearest_track(SoundFile& sound) {
    constexpr std::size_t budget = std::size_t{64} << 20;
    std::vector<std::vector<double>> tracks(sound.channels());
    sound.for_each_block([&](const std::vector<double>& block, std::size_t frames) {
        if ((tracks.front().size() + frames) * tracks.size() > budget) return;
        for (std::size_t f = 0; f < frames; ++f)
            for (std::size_t c = 0; c < tracks.size(); ++c) tracks[c].push_back(block[f * tracks.size() + c]);
    });
    std::vector<ChannelMerit> merits;
    for (const auto& track : tracks) merits.push_back(merit_of(track));
    return best_channel(merits, true);
}

std::size_t choose_track(SoundFile& sound, const ReadOptions& options, Findings& findings) {
    if (options.channel) {
        if (const auto track = track_named(*options.channel, sound.channels())) return *track;
        throw UsageError(Problem{"--channel", "",
                                 "\"" + options.channel->substr(0, 80) + "\" is no track of the recording",
                                 fmt::format("Give a number from 1 to {}.", sound.channels())});
    }
    if (sound.channels() == 1) return 0;
    const std::size_t track = clearest_track(sound);
    add(findings, "channel_chosen", Severity::caution,
        fmt::format("Of {} tracks number {} was taken because its signal is the clearest. Say otherwise with "
                    "--channel.",
                    sound.channels(), track + 1));
    return track;
}

std::vector<double> read_track(SoundFile& sound, std::size_t track, const ReadProgress& progress) {
    std::vector<double> samples;
    const auto claimed = static_cast<std::size_t>(std::max<sf_count_t>(sound.info().frames, 0));
    samples.reserve(std::min(claimed, sound.byte_count()));
    const std::size_t channels = sound.channels();
    std::size_t blocks = 0;
    sound.for_each_block([&](const std::vector<double>& block, std::size_t frames) {
        for (std::size_t f = 0; f < frames; ++f) samples.push_back(block[f * channels + track]);
        if (progress && claimed > 0 && ++blocks % 256 == 0)
            progress(std::min(1.0, static_cast<double>(samples.size()) / static_cast<double>(claimed)));
    });
    return samples;
}

void report_cut(std::string_view bytes, Findings& findings) {
    if (!bytes.starts_with("RIFF") || bytes.size() < 12) return;
    const std::uint32_t stated = little_endian(bytes, 4);
    if (stated >= 0xFFFFFF00U || std::size_t{stated} + 8 <= bytes.size()) return;
    add(findings, "cut_file", Severity::caution,
        fmt::format(
            "The header announces {} bytes but the file holds {}: it was cut. What is there was read.",
            std::size_t{stated} + 8, bytes.size()));
}

// Digital full scale in a unit, as `--full-scale` says it.
struct FullScale {
    double value = 1.0;
    std::optional<Unit> unit;
};

FullScale full_scale_from(const std::string& text) {
    const std::size_t unit_at = std::min(text.find_first_not_of("0123456789.,eE+- "), text.size());
    const auto unit = find_unit(std::string_view(text).substr(unit_at));
    const bool usable =
        unit && (unit->dimension == Dimension::voltage || quantity_from_dimension(unit->dimension));
    const double value =
        usable ? parse_number(std::string_view(text).substr(0, unit_at), "--full-scale") : 0.0;
    if (!(value > 0.0))
        throw UsageError(Problem{"--full-scale", "",
                                 "\"" + text.substr(0, 60) + "\" is no voltage at digital full scale",
                                 "Write it like \"5 V\"."});
    return {value, unit};
}

// What one unit of the samples (1.0 is digital full scale) stands for, as a unit and a factor.
std::optional<FullScale> calibration(const SoundFile& sound, const ReadOptions& options, Findings& findings) {
    if (options.full_scale) return full_scale_from(*options.full_scale);
    if (sound.is_float() && options.unit) {
        add(findings, "float_samples_as_unit", Severity::note,
            fmt::format("The samples are floating-point numbers and were taken as {}, 1.0 being one unit. "
                        "Say otherwise "
                        "with --full-scale.",
                        *options.unit));
        return FullScale{1.0, parse_unit(*options.unit, "--unit")};
    }
    if (sound.is_float() && options.sensitivity) {
        add(findings, "volts_assumed", Severity::note,
            "The samples are floating-point numbers and were taken as volts. Say otherwise with "
            "--full-scale.");
        return FullScale{1.0, find_unit("V")};
    }
    if (options.sensitivity)
        throw UsageError(Problem{"--sensitivity", "", "the volts at digital full scale are not known",
                                 "Give them too, such as --full-scale \"5 V\"."});
    return std::nullopt;
}

void scale_track(const SoundFile& sound, const ReadOptions& options, Recording& recording) {
    const auto scale = calibration(sound, options, recording.findings);
    ReadOptions shown = options;
    if (scale) shown.unit.reset();
    const RawChannel raw{"", scale ? scale->unit->symbol : "", scale ? scale->unit : std::nullopt};
    ChannelScale channel = scale_channel(raw, shown);
    recording.quantity = channel.quantity;
    recording.quantity_known = channel.quantity_known;
    if (!scale) {
        channel.scaled = false;
        channel.factor = 1.0;
        std::erase_if(channel.findings, [](const Finding& f) { return f.code == "unit_missing"; });
        add(channel.findings, "no_scale", Severity::note,
            "The sound file has no scale: its amplitude is in parts of full scale. Frequency and damping do "
            "not depend "
            "on it. Give --sensitivity and --full-scale for units.");
        channel.unit = Unit{"full scale", Dimension::none, 1.0};
    }
    recording.unit = channel.unit;
    recording.scaled = channel.scaled;
    const double factor = channel.factor * (scale ? scale->value : 1.0);
    if (factor != 1.0)
        for (double& sample : recording.samples) sample *= factor;
    recording.findings.insert(recording.findings.end(), channel.findings.begin(), channel.findings.end());
}

void report_lossy(const SoundFile& sound, Findings& findings) {
    const int format = sound.info().format & SF_FORMAT_TYPEMASK;
    if (format != SF_FORMAT_OGG) return;
    add(findings, "lossy_format", Severity::caution,
        "The file was compressed with loss, which can shorten a decay. Record as WAV or FLAC.");
}

}  // namespace

bool is_sound(std::string_view bytes) {
    static constexpr std::string_view signs[] = {"RIFF"sv, "RIFX"sv,   "RF64"sv, "riff\x2E\x91\xCF\x11"sv,
                                                 "fLaC"sv, "caff\0"sv, ".snd"sv, "OggS"sv};
    for (const std::string_view sign : signs)
        if (bytes.starts_with(sign)) return true;
    return bytes.starts_with("FORM") && bytes.size() > 12 && bytes.substr(8, 3) == "AIF";
}

void read_sound(std::string_view bytes, const ReadOptions& options, Recording& recording) {
    SoundFile sound(bytes, recording.origin.file);
    report_cut(bytes, recording.findings);
    report_lossy(sound, recording.findings);
    const std::size_t track = choose_track(sound, options, recording.findings);
    recording.origin.channel = std::to_string(track + 1);
    recording.samples = read_track(sound, track, options.progress);
    const bool finite = std::all_of(recording.samples.begin(), recording.samples.end(),
                                    [](double v) { return std::isfinite(v); });
    if (recording.samples.size() < 16 || !finite)
        throw InputError(Problem{recording.origin.file, "track " + recording.origin.channel,
                                 finite ? fmt::format("only {} samples can be read", recording.samples.size())
                                        : std::string("there are samples that are no numbers"),
                                 "The file may be cut or damaged; export it again as WAV."});
    recording.clock.sample_rate_hz = options.rate_hz.value_or(static_cast<double>(sound.info().samplerate));
    scale_track(sound, options, recording);
}

void summarise_sound(std::string_view bytes, const ReadOptions&, FileSummary& summary) {
    SoundFile sound(bytes, summary.file);
    report_cut(bytes, summary.findings);
    report_lossy(sound, summary.findings);
    summary.format = sound.name_of(sound.info().format & SF_FORMAT_TYPEMASK);
    summary.dialect =
        fmt::format("{}, {} track{}, {} Hz", sound.name_of(sound.info().format & SF_FORMAT_SUBMASK),
                    sound.channels(), sound.channels() == 1 ? "" : "s", sound.info().samplerate);
    summary.channels.resize(sound.channels());
    std::vector<double> sums(sound.channels(), 0.0);
    for (std::size_t c = 0; c < summary.channels.size(); ++c) {
        summary.channels[c].name = std::to_string(c + 1);
        summary.channels[c].role = "signal";
        summary.channels[c].unit = "full scale";
    }
    sound.for_each_block([&](const std::vector<double>& block, std::size_t frames) {
        for (std::size_t i = 0; i < frames * sound.channels(); ++i) {
            ChannelSummary& channel = summary.channels[i % sound.channels()];
            const double value = block[i];
            if (!std::isfinite(value)) {
                ++channel.missing;
                continue;
            }
            const bool first = channel.values++ == 0;
            channel.minimum = first ? value : std::min(channel.minimum, value);
            channel.maximum = first ? value : std::max(channel.maximum, value);
            sums[i % sound.channels()] += value;
        }
    });
    for (std::size_t c = 0; c < summary.channels.size(); ++c)
        if (summary.channels[c].values > 0)
            summary.channels[c].mean = sums[c] / static_cast<double>(summary.channels[c].values);
}

}  // namespace ringwright
