#include "recording/quantity_words.hpp"

#include <algorithm>
#include <array>
#include <vector>

namespace ringwright {
namespace {

struct Words {
    MeasuredQuantity quantity;
    std::vector<std::string_view> inside;  // anywhere in the label
    std::vector<std::string_view> whole;   // as a word of its own
};

// The angular quantities first: "Winkelgeschwindigkeit" also holds "Geschwindigkeit".
const std::array<Words, 6>& vocabulary() {
    static const std::array<Words, 6> words = {{
        {MeasuredQuantity::angular_acceleration,
         {"angular accel", "angular_accel", "winkelbeschleunigung", "drehbeschleunigung",
          "accélération angulaire", "acceleration angulaire", "aceleración angular", "aceleracion angular"},
         {}},
        {MeasuredQuantity::angular_velocity,
         {"angular vel", "angular_vel", "angular rate", "angular speed", "winkelgeschwindigkeit", "drehrate",
          "drehgeschwindigkeit", "vitesse angulaire", "velocidad angular", "gyro"},
         {"omega"}},
        {MeasuredQuantity::acceleration,
         {"accel", "beschleunigung", "accélération", "aceleración", "aceleracion", "accelerazione"},
         {"acc", "beschl"}},
        {MeasuredQuantity::velocity,
         {"velocity", "geschwindigkeit", "vitesse", "velocidad", "velocità"},
         {"vel", "speed", "schnelle"}},
        {MeasuredQuantity::angle,
         {"winkel", "verdrehung", "ángulo", "angulo", "angolo"},
         {"angle", "rotation", "twist", "ang"}},
        {MeasuredQuantity::displacement,
         {"displacement", "deflection", "position", "auslenkung", "verschiebung", "einfederung",
          "déplacement", "deplacement", "desplazamiento", "spostamento", "federweg", "posición", "posicion",
          "deflexion"},
         {"disp", "displ", "pos", "weg", "hub", "travel", "stroke", "recorrido", "abstand", "elongation"}},
    }};
    return words;
}

bool is_word_byte(char c) {
    return (c >= 'a' && c <= 'z') || (static_cast<unsigned char>(c) & 0x80) != 0;
}

bool has_word(std::string_view text, std::string_view word) {
    for (std::size_t at = 0; (at = text.find(word, at)) != std::string_view::npos; ++at) {
        const bool left = at == 0 || !is_word_byte(text[at - 1]);
        const std::size_t end = at + word.size();
        if (left && (end == text.size() || !is_word_byte(text[end]))) return true;
    }
    return false;
}

template <std::size_t N>
bool has_any_word(std::string_view text, const std::array<std::string_view, N>& words) {
    return std::any_of(words.begin(), words.end(),
                       [&](std::string_view word) { return has_word(text, word); });
}

}  // namespace

std::string folded(std::string_view text) {
    std::string out(text);
    for (std::size_t i = 0; i < out.size(); ++i) {
        const auto byte = static_cast<unsigned char>(out[i]);
        if (byte >= 'A' && byte <= 'Z') out[i] = static_cast<char>(byte + 32);
        // À … Þ are C3 80 … C3 9E in UTF-8 and their small letters C3 A0 … C3 BE.
        const bool accented = i > 0 && static_cast<unsigned char>(out[i - 1]) == 0xC3;
        if (accented && byte >= 0x80 && byte <= 0x9E) out[i] = static_cast<char>(byte + 32);
    }
    return out;
}

std::optional<MeasuredQuantity> quantity_from_label(std::string_view label) {
    const std::string text = folded(label);
    for (const Words& words : vocabulary()) {
        for (const std::string_view word : words.inside)
            if (text.find(word) != std::string::npos) return words.quantity;
        for (const std::string_view word : words.whole)
            if (has_word(text, word)) return words.quantity;
    }
    return std::nullopt;
}

std::optional<MeasuredQuantity> quantity_from_dimension(Dimension dimension) {
    switch (dimension) {
        case Dimension::length:
            return MeasuredQuantity::displacement;
        case Dimension::velocity:
            return MeasuredQuantity::velocity;
        case Dimension::acceleration:
            return MeasuredQuantity::acceleration;
        case Dimension::angle:
            return MeasuredQuantity::angle;
        case Dimension::angular_velocity:
            return MeasuredQuantity::angular_velocity;
        case Dimension::angular_acceleration:
            return MeasuredQuantity::angular_acceleration;
        default:
            return std::nullopt;
    }
}

bool label_names_time(std::string_view label) {
    static constexpr std::array<std::string_view, 24> words = {
        "time",    "zeit",  "temps",  "tiempo",  "tempo",    "timestamp", "zeitstempel", "t",
        "uhrzeit", "heure", "hora",   "elapsed", "datum",    "date",      "fecha",       "clock",
        "sec",     "secs",  "second", "seconds", "sekunden", "x_value",   "datetime",    "messzeit"};
    return has_any_word(folded(label), words);
}

bool label_names_counter(std::string_view label) {
    static constexpr std::array<std::string_view, 18> words = {
        "index", "idx", "sample",    "samples", "nr",     "no",  "n",    "count",    "counter",
        "point", "row", "messpunkt", "scan",    "zähler", "lfd", "satz", "compteur", "contador"};
    const std::string text = folded(label);
    return text == "#" || has_any_word(text, words);
}

std::string_view to_text(MeasuredQuantity quantity) {
    switch (quantity) {
        case MeasuredQuantity::displacement:
            return "displacement";
        case MeasuredQuantity::velocity:
            return "velocity";
        case MeasuredQuantity::acceleration:
            return "acceleration";
        case MeasuredQuantity::angle:
            return "angle";
        case MeasuredQuantity::angular_velocity:
            return "angular-velocity";
        case MeasuredQuantity::angular_acceleration:
            return "angular-acceleration";
    }
    return "";
}

std::optional<MeasuredQuantity> measured_quantity_from_text(std::string_view text) {
    std::string name = folded(text);
    std::replace(name.begin(), name.end(), '_', '-');
    std::replace(name.begin(), name.end(), ' ', '-');
    for (const Words& words : vocabulary())
        if (to_text(words.quantity) == name) return words.quantity;
    return std::nullopt;
}

Dimension dimension_of(MeasuredQuantity quantity) {
    switch (quantity) {
        case MeasuredQuantity::displacement:
            return Dimension::length;
        case MeasuredQuantity::velocity:
            return Dimension::velocity;
        case MeasuredQuantity::acceleration:
            return Dimension::acceleration;
        case MeasuredQuantity::angle:
            return Dimension::angle;
        case MeasuredQuantity::angular_velocity:
            return Dimension::angular_velocity;
        case MeasuredQuantity::angular_acceleration:
            return Dimension::angular_acceleration;
    }
    return Dimension::none;
}

bool is_torsional(MeasuredQuantity quantity) {
    return quantity == MeasuredQuantity::angle || quantity == MeasuredQuantity::angular_velocity ||
           quantity == MeasuredQuantity::angular_acceleration;
}

double Recording::duration_s() const {
    return samples.size() < 2 ? 0.0 : clock.time_of(samples.size() - 1) - clock.time_of(0);
}

}  // namespace ringwright
