#include "recording/channel_scale.hpp"

#include <fmt/format.h>

#include <cmath>

#include "recording/quantity_words.hpp"
#include "ringwright/error.hpp"
#include "ringwright/measured_value.hpp"

namespace ringwright {
namespace {

[[noreturn]] void refuse_sensitivity(std::string_view text) {
    throw UsageError(Problem{"--sensitivity", "",
                             "\"" + std::string(text.substr(0, 60)) + "\" is no sensitivity of a transducer",
                             "Write volts for each unit of motion, such as \"100 mV/g\" or \"50 mV/mm\"."});
}

void add(Findings& findings, const char* code, Severity severity, std::string message) {
    findings.push_back(Finding{code, severity, std::move(message)});
}

std::size_t end_of_number(std::string_view text) {
    std::size_t end = text.find_first_not_of("0123456789.,+- ");
    if (end == std::string_view::npos) return text.size();
    const bool exponent = (text[end] == 'e' || text[end] == 'E') && end + 1 < text.size() &&
                          std::string_view("0123456789+-").find(text[end + 1]) != std::string_view::npos;
    if (exponent) end = std::min(text.find_first_not_of("0123456789+-", end + 1), text.size());
    return end;
}

std::string_view without_enclosing(std::string_view text) {
    while (!text.empty() && text.front() == ' ') text.remove_prefix(1);
    while (!text.empty() && text.back() == ' ') text.remove_suffix(1);
    return text;
}

class ScaleFinder {
  public:
    ScaleFinder(const RawChannel& channel, const ReadOptions& options)
        : channel_(channel), options_(options) {}

    ChannelScale find() {
        auto unit = stated_unit();
        if (options_.sensitivity) unit = apply_sensitivity(unit);
        find_quantity(unit);
        if (unit) scale_by(*unit);
        return std::move(scale_);
    }

  private:
    std::optional<Unit> stated_unit() {
        if (options_.unit) {
            if (options_.quantity)
                if (auto unit = find_unit(*options_.unit, dimension_of(*options_.quantity))) return unit;
            return parse_unit(*options_.unit, "--unit");
        }
        if (channel_.unit) return channel_.unit;
        if (channel_.unit_text.empty()) return std::nullopt;
        const std::string_view nearest = suggested_unit(channel_.unit_text);
        add(scale_.findings, "unit_unknown", Severity::caution,
            fmt::format(
                "The unit \"{}\" of the channel is not known{}; the samples are kept as recorded. Say "
                "it with --unit.",
                channel_.unit_text,
                nearest.empty() ? "" : fmt::format(" (the nearest known is \"{}\")", nearest)));
        return std::nullopt;
    }

    std::optional<Unit> apply_sensitivity(const std::optional<Unit>& recorded) {
        const Sensitivity sensitivity = parse_sensitivity(*options_.sensitivity);
        if (recorded && recorded->dimension != Dimension::voltage) {
            add(scale_.findings, "sensitivity_not_used", Severity::caution,
                fmt::format("The channel is in {}, not in volts, so --sensitivity was not applied. If it "
                            "holds volts, "
                            "add --unit V.",
                            recorded->symbol));
            return recorded;
        }
        if (!recorded)
            add(scale_.findings, "volts_assumed", Severity::note,
                "The channel names no unit; its values were taken as volts because --sensitivity was given. "
                "Say "
                "otherwise with --unit, such as --unit mV.");
        voltage_factor_ = (recorded ? recorded->si_factor : 1.0) / sensitivity.volts_per_si_unit;
        return sensitivity.unit;
    }

    void find_quantity(const std::optional<Unit>& unit) {
        const auto by_unit = unit ? quantity_from_dimension(unit->dimension) : std::nullopt;
        const auto by_label = quantity_from_label(channel_.label);
        const auto known = options_.quantity ? options_.quantity : by_unit ? by_unit : by_label;
        scale_.quantity_known = known.has_value();
        if (known) {
            scale_.quantity = *known;
            return;
        }
        add(scale_.findings, "quantity_assumed", Severity::note,
            "Neither the header nor the unit says what was measured; displacement is assumed. Frequency and "
            "damping do "
            "not depend on it. Say otherwise with --quantity.");
    }

    void scale_by(const Unit& unit) {
        scale_.unit = unit;
        if (unit.dimension == dimension_of(scale_.quantity)) {
            scale_.scaled = true;
            scale_.factor = voltage_factor_ != 0.0 ? voltage_factor_ : unit.si_factor;
            return;
        }
        if (quantity_from_dimension(unit.dimension))
            add(scale_.findings, "unit_contradicts_quantity", Severity::caution,
                fmt::format("{} is no unit of {}; the samples are kept as recorded, without a scale. Check "
                            "--quantity "
                            "and --unit.",
                            unit.symbol, to_text(scale_.quantity)));
    }

    const RawChannel& channel_;
    const ReadOptions& options_;
    ChannelScale scale_;
    double voltage_factor_ = 0.0;
};

void report_missing_scale(ChannelScale& scale, const RawChannel& channel, const ReadOptions& options) {
    if (scale.scaled) return;
    if (scale.unit.symbol.empty() && channel.unit_text.empty() && !options.unit)
        add(scale.findings, "unit_missing", Severity::note,
            "The channel names no unit, so lengths and forces cannot be told from its amplitude; frequency "
            "and damping "
            "can. Say the unit with --unit.");
    else if (scale.unit.dimension == Dimension::voltage)
        add(scale.findings, "voltage_not_scaled", Severity::note,
            fmt::format(
                "The channel is in {}; without the transducer's --sensitivity its amplitude has no length or "
                "acceleration. Frequency and damping do not depend on it.",
                scale.unit.symbol));
}

}  // namespace

Sensitivity parse_sensitivity(std::string_view text) {
    const std::size_t number_end = end_of_number(text);
    std::string_view unit_text = without_enclosing(text.substr(number_end));
    const std::size_t slash = unit_text.find('/');
    const std::size_t per = unit_text.find(" per ");
    const std::size_t cut = std::min(slash, per);
    if (number_end == 0 || cut == std::string_view::npos) refuse_sensitivity(text);
    const double number = parse_number(text.substr(0, number_end), "--sensitivity");
    const auto above = find_unit(unit_text.substr(0, cut));
    const auto below = find_unit(unit_text.substr(cut == slash ? cut + 1 : cut + 5));
    if (!above || !below || !(number > 0.0)) refuse_sensitivity(text);
    if (above->dimension == Dimension::voltage && quantity_from_dimension(below->dimension))
        return {number * above->si_factor / below->si_factor, *below};
    if (below->dimension == Dimension::voltage && quantity_from_dimension(above->dimension))
        return {below->si_factor / (number * above->si_factor), *above};
    // "20 m/s²/V": the unit of motion itself holds a slash.
    const std::size_t last = unit_text.rfind('/');
    const auto motion = find_unit(unit_text.substr(0, last));
    const auto volts = find_unit(unit_text.substr(last + 1));
    if (!motion || !volts || volts->dimension != Dimension::voltage ||
        !quantity_from_dimension(motion->dimension))
        refuse_sensitivity(text);
    return {volts->si_factor / (number * motion->si_factor), *motion};
}

ChannelScale scale_channel(const RawChannel& channel, const ReadOptions& options) {
    ChannelScale scale = ScaleFinder(channel, options).find();
    report_missing_scale(scale, channel, options);
    return scale;
}

}  // namespace ringwright
