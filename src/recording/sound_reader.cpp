#include "recording/sound_reader.hpp"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <cstring>
#include <limits>
#include <memory>
#include <mutex>
#include <optional>

#include "recording/channel_scale.hpp"
#include "recording/health.hpp"
#include "recording/quantity_words.hpp"
#include "recording/signal_clarity.hpp"
#include "recording/signal_digest.hpp"
#include "recording/sound_file.hpp"
#include "ringwright/error.hpp"
#include "ringwright/measured_value.hpp"

namespace ringwright {
namespace {

using namespace std::string_view_literals;

void add(Findings& findings, const char* code, Severity severity, std::string message) {
    findings.push_back(Finding{code, severity, std::move(message)});
}

std::uint32_t little_endian(std::string_view bytes, std::size_t at) {
    std::uint32_t value = 0;
    for (std::size_t i = 4; i-- > 0;) value = (value << 8) | static_cast<unsigned char>(bytes[at + i]);
    return value;
}

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

// The same of a recording that is not to be held whole: from stretches all over it, `most` samples in all.
std::size_t clearest_track_by_looks(SoundFile& sound, std::size_t most) {
    constexpr std::size_t looks = 32;
    const std::size_t channels = sound.channels(),
                      length = std::max<std::size_t>(most / channels / looks, 64);
    const auto frames = static_cast<std::size_t>(std::max<sf_count_t>(sound.info().frames, 0));
    std::vector<std::vector<double>> tracks(channels);
    for (std::size_t look = 0; look < looks; ++look)
        sound.for_each_block_from(static_cast<sf_count_t>(frames / looks * look),
                                  static_cast<sf_count_t>(std::min(length, frames / looks)),
                                  [&](const std::vector<double>& block, std::size_t count) {
                                      for (std::size_t i = 0; i < count * channels; ++i)
                                          tracks[i % channels].push_back(block[i]);
                                  });
    std::vector<ChannelMerit> merits;
    for (const auto& track : tracks) merits.push_back(merit_of(track));
    return best_channel(merits, true);
}

// `held` is how many samples may be held for the choice; 0: as many as the file has, within reason.
std::size_t choose_track(SoundFile& sound, const ReadOptions& options, std::size_t held, Findings& findings) {
    if (options.channel) {
        if (const auto track = track_named(*options.channel, sound.channels())) return *track;
        throw UsageError(Problem{"--channel", "",
                                 "\"" + options.channel->substr(0, 80) + "\" is no track of the recording",
                                 fmt::format("Give a number from 1 to {}.", sound.channels())});
    }
    if (sound.channels() == 1) return 0;
    const std::size_t track = held > 0 ? clearest_track_by_looks(sound, held) : clearest_track(sound);
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

// Fills unit and quantity; gives what the samples are to be multiplied by.
double scale_track(const SoundFile& sound, const ReadOptions& options, Recording& recording) {
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
    recording.findings.insert(recording.findings.end(), channel.findings.begin(), channel.findings.end());
    return channel.factor * (scale ? scale->value : 1.0);
}

void report_lossy(const SoundFile& sound, Findings& findings) {
    const int format = sound.info().format & SF_FORMAT_TYPEMASK;
    if (format != SF_FORMAT_OGG) return;
    add(findings, "lossy_format", Severity::caution,
        "The file was compressed with loss, which can shorten a decay. Record as WAV or FLAC.");
}

void refuse_unusable(const Recording& recording, std::size_t samples, bool finite) {
    if (samples >= 16 && finite) return;
    throw InputError(Problem{recording.origin.file, "track " + recording.origin.channel,
                             finite ? fmt::format("only {} samples can be read", samples)
                                    : std::string("there are samples that are no numbers"),
                             "The file may be cut or damaged; export it again as WAV."});
}

// Frames in one part of a long recording: what is known of it is kept part by part.
constexpr std::size_t part_frames = std::size_t{1} << 18;

class LongSound final : public LongRecording {
  public:
    LongSound(std::shared_ptr<const InputBytes> input, const ReadOptions& options, Recording facts,
              const LongLimits& limits)
        : input_(std::move(input)), sound_(input_->view(), facts.origin.file) {
        facts_ = std::move(facts);
        limits_ = limits;
        report_cut(input_->view(), facts_.findings);
        report_lossy(sound_, facts_.findings);
        track_ = choose_track(sound_, options, limits.stretch, facts_.findings);
        facts_.origin.channel = std::to_string(track_ + 1);
        facts_.clock.sample_rate_hz = options.rate_hz.value_or(static_cast<double>(sound_.info().samplerate));
        factor_ = scale_track(sound_, options, facts_);
        examine(options.progress);
    }

    [[nodiscard]] Recording stretch(SampleRange range) const override {
        Recording part = like_facts(range);
        part.clock.start_s = facts_.clock.time_of(range.begin);
        part.samples.reserve(range.end - range.begin);
        const std::scoped_lock lock(guard_);
        sound_.for_each_block_from(
            static_cast<sf_count_t>(range.begin), static_cast<sf_count_t>(range.end - range.begin),
            [&](const std::vector<double>& block, std::size_t frames) { take(block, frames, part.samples); });
        if (part.samples.size() < range.end - range.begin)
            throw InputError(Problem{facts_.origin.file, "track " + facts_.origin.channel,
                                     "the file has become shorter while it was read",
                                     "Analyse it when the recorder has finished."});
        return part;
    }

  private:
    void take(const std::vector<double>& block, std::size_t frames, std::vector<double>& samples) const {
        for (std::size_t f = 0; f < frames; ++f)
            samples.push_back(block[f * sound_.channels() + track_] * factor_);
    }

    void examine(const ReadProgress& progress) {
        const auto claimed = static_cast<double>(std::max<sf_count_t>(sound_.info().frames, 1));
        std::vector<double> samples;
        bool finite = true;
        sound_.for_each_block([&](const std::vector<double>& block, std::size_t frames) {
            take(block, frames, samples);
            if (samples.size() < part_frames) return;
            finite = finite && add_part(samples);
            if (progress) progress(std::min(1.0, static_cast<double>(size_) / claimed));
        });
        finite = add_part(samples) && finite;
        refuse_unusable(facts_, size_, finite);
        last_s_ = facts_.clock.time_of(size_ - 1);
        gather_health();
    }

    bool add_part(std::vector<double>& samples) {
        const bool finite =
            std::all_of(samples.begin(), samples.end(), [](double v) { return std::isfinite(v); });
        if (!samples.empty()) parts_.push_back({size_, digest_of(samples)});
        size_ += samples.size();
        samples.clear();
        return finite;
    }

    void gather_health() {
        SignalDigest whole;
        overview_ = like_facts({0, 0});
        for (DigestedPart& part : parts_) {
            append(whole, part.digest);
            add_overview(part.digest, facts_.clock.time_of(part.begin),
                         facts_.clock.time_of(part.begin + part.digest.count), overview_);
            part.digest.blocks = {};
        }
        overview_.clock.start_s = overview_.clock.times_s.front();
        if (whole.low != whole.high) facts_.resolution = whole.smallest_step;
        facts_.clipped = clipped_runs(*this, parts_, whole);
        const double clipped_s =
            facts_.clipped.empty() ? 0.0 : facts_.clock.time_of(facts_.clipped.front().begin);
        report_health(facts_, whole.low, whole.high, clipped_s);
    }

    std::shared_ptr<const InputBytes> input_;
    mutable std::mutex guard_;
    mutable SoundFile sound_;
    std::size_t track_ = 0;
    double factor_ = 1.0;
    std::vector<DigestedPart> parts_;
};

}  // namespace

std::size_t frames_stated(std::string_view bytes, const std::string& file) {
    return static_cast<std::size_t>(std::max<sf_count_t>(SoundFile(bytes, file).info().frames, 0));
}

std::unique_ptr<LongRecording> open_long_sound(std::shared_ptr<const InputBytes> input,
                                               const ReadOptions& options, Recording facts,
                                               const LongLimits& limits) {
    auto recording = std::make_unique<LongSound>(std::move(input), options, std::move(facts), limits);
    if (recording->size() <= limits.held_whole) return nullptr;
    return recording;
}

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
    const std::size_t track = choose_track(sound, options, 0, recording.findings);
    recording.origin.channel = std::to_string(track + 1);
    recording.samples = read_track(sound, track, options.progress);
    const bool finite = std::all_of(recording.samples.begin(), recording.samples.end(),
                                    [](double v) { return std::isfinite(v); });
    refuse_unusable(recording, recording.samples.size(), finite);
    recording.clock.sample_rate_hz = options.rate_hz.value_or(static_cast<double>(sound.info().samplerate));
    const double factor = scale_track(sound, options, recording);
    if (factor != 1.0)
        for (double& sample : recording.samples) sample *= factor;
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
