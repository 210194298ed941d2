#include "recording/preamble_rate.hpp"

#include <algorithm>
#include <array>
#include <cmath>
#include <string>

#include "recording/csv_cells.hpp"
#include "recording/csv_table.hpp"
#include "recording/quantity_words.hpp"
#include "ringwright/units.hpp"

namespace ringwright {
namespace {

constexpr std::array<std::string_view, 14> rate_words = {"sample rate",
                                                         "sampling rate",
                                                         "samplerate",
                                                         "sample_rate",
                                                         "sampling_rate",
                                                         "sampling frequency",
                                                         "sample frequency",
                                                         "abtastrate",
                                                         "abtastfrequenz",
                                                         "messrate",
                                                         "samples per second",
                                                         "fréquence d'échantillonnage",
                                                         "frecuencia de muestreo",
                                                         "frequenza di campionamento"};
constexpr std::array<std::string_view, 10> interval_words = {
    "sample interval", "sampling interval", "sampling period", "sample period", "sample_interval",
    "abtastintervall", "abtastzeit",        "time increment",  "delta t",       "time step"};

template <std::size_t N>
std::size_t end_of_word(const std::string& line, const std::array<std::string_view, N>& words) {
    for (const std::string_view word : words)
        if (const auto at = line.find(word); at != std::string::npos) return at + word.size();
    return std::string::npos;
}

struct NumberAndUnit {
    double number = 0.0;
    std::string_view before, after;  // text between word and number, and behind the number
};

std::optional<NumberAndUnit> first_number(std::string_view text) {
    const std::size_t begin = text.find_first_of("0123456789");
    if (begin == std::string_view::npos) return std::nullopt;
    const std::size_t end = std::min(text.find_first_not_of("0123456789.,eE+-", begin), text.size());
    std::string_view digits = text.substr(begin, end - begin);
    while (!digits.empty() && std::string_view(".,eE+-").find(digits.back()) != std::string_view::npos)
        digits.remove_suffix(1);
    const bool comma =
        digits.find(',') != std::string_view::npos && digits.find('.') == std::string_view::npos;
    const auto value = number_in_cell(digits, Dialect{';', comma ? ',' : '.', '\0'});
    if (!value || !(*value > 0.0)) return std::nullopt;
    return NumberAndUnit{*value, text.substr(0, begin), text.substr(begin + digits.size())};
}

// The unit behind the number, or in brackets before it.
std::optional<Unit> unit_near(const NumberAndUnit& found, Dimension wanted) {
    for (std::string_view text : {found.after, found.before}) {
        while (!text.empty() &&
               std::string_view(" \t;,:=()[]\"").find(text.front()) != std::string_view::npos)
            text.remove_prefix(1);
        const std::size_t end = std::min(text.find_first_of(" \t;,:=()[]\"\r"), text.size());
        std::string name(text.substr(0, end));
        const std::string lower = folded(name);
        if (lower == "s/s" || lower == "sa/s" || lower == "samples/s" || lower == "1/s") name = "Hz";
        if (lower == "ks/s" || lower == "ksa/s") name = "kHz";
        if (const auto unit = find_unit(name, wanted)) return unit;
    }
    return std::nullopt;
}

std::optional<double> rate_in_line(std::string_view raw) {
    const std::string line = folded(raw);
    if (const std::size_t end = end_of_word(line, rate_words); end != std::string::npos) {
        const auto found = first_number(raw.substr(end));
        if (!found) return std::nullopt;
        const auto unit = unit_near(*found, Dimension::frequency);
        return found->number * (unit ? unit->si_factor : 1.0);
    }
    if (const std::size_t end = end_of_word(line, interval_words); end != std::string::npos) {
        const auto found = first_number(raw.substr(end));
        if (!found) return std::nullopt;
        const auto unit = unit_near(*found, Dimension::time);
        return 1.0 / (found->number * (unit ? unit->si_factor : 1.0));
    }
    return std::nullopt;
}

}  // namespace

std::optional<StatedRate> rate_in_preamble(std::string_view preamble) {
    LineReader reader(preamble.substr(0, std::size_t{1} << 20));
    std::string_view line;
    while (reader.next(line)) {
        if (line.size() > 400) continue;
        if (const auto rate = rate_in_line(line); rate && std::isfinite(*rate))
            return StatedRate{*rate, line};
    }
    return std::nullopt;
}

}  // namespace ringwright
