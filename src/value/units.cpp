#include "ringwright/units.hpp"

#include <algorithm>
#include <array>
#include <cmath>
#include <cstdlib>
#include <numbers>
#include <utility>
#include <vector>

#include "ringwright/error.hpp"

namespace ringwright {
namespace {

// Exponents of the base units m, kg, s, rad, V.
using Powers = std::array<int, 5>;

// Cycles per second count as a dimension of their own, so that Hz and 1/s stay apart.
struct Atom {
    std::string_view spelling;
    std::string_view canonical;
    double si_factor;
    Powers powers;
    std::string_view prefixes;  // SI prefixes that the trade writes before it; 'u' stands for micro
    bool cycles = false;
};

constexpr double standard_gravity = 9.80665;         // m/s², exact (NIST SP 811, appendix B.8)
constexpr double inch = 0.0254;                      // m, exact
constexpr double pound = 0.45359237;                 // kg, exact
constexpr double pound_force = 4.4482216152605;      // N, exact
constexpr double degree = std::numbers::pi / 180.0;  // rad

constexpr Powers one{}, metre{1, 0, 0, 0, 0}, kilogram{0, 1, 0, 0, 0}, second{0, 0, 1, 0, 0},
    radian{0, 0, 0, 1, 0}, volt{0, 0, 0, 0, 1}, newton{1, 1, -2, 0, 0}, gravity{1, 0, -2, 0, 0},
    per_second{0, 0, -1, 0, 0}, radian_per_second{0, 0, -1, 1, 0};

constexpr Atom atoms[] = {
    {"m", "m", 1.0, metre, "kdcmun"},
    {"meter", "m", 1.0, metre, ""},
    {"meters", "m", 1.0, metre, ""},
    {"metre", "m", 1.0, metre, ""},
    {"metres", "m", 1.0, metre, ""},
    {"Meter", "m", 1.0, metre, ""},
    {"millimeter", "mm", 1e-3, metre, ""},
    {"millimeters", "mm", 1e-3, metre, ""},
    {"millimetre", "mm", 1e-3, metre, ""},
    {"millimetres", "mm", 1e-3, metre, ""},
    {"centimeter", "cm", 1e-2, metre, ""},
    {"centimeters", "cm", 1e-2, metre, ""},
    {"centimetre", "cm", 1e-2, metre, ""},
    {"centimetres", "cm", 1e-2, metre, ""},
    {"micrometer", "µm", 1e-6, metre, ""},
    {"micrometers", "µm", 1e-6, metre, ""},
    {"micrometre", "µm", 1e-6, metre, ""},
    {"micrometres", "µm", 1e-6, metre, ""},
    {"micron", "µm", 1e-6, metre, ""},
    {"microns", "µm", 1e-6, metre, ""},
    {"in", "in", inch, metre, "u"},
    {"inch", "in", inch, metre, ""},
    {"inches", "in", inch, metre, ""},
    {"mil", "mil", 2.54e-5, metre, ""},
    {"mils", "mil", 2.54e-5, metre, ""},
    {"thou", "mil", 2.54e-5, metre, ""},
    {"ft", "ft", 0.3048, metre, ""},
    {"foot", "ft", 0.3048, metre, ""},
    {"feet", "ft", 0.3048, metre, ""},
    {"s", "s", 1.0, second, "mun"},
    {"sec", "s", 1.0, second, "mu"},
    {"secs", "s", 1.0, second, ""},
    {"second", "s", 1.0, second, ""},
    {"seconds", "s", 1.0, second, ""},
    {"Sekunde", "s", 1.0, second, ""},
    {"Sekunden", "s", 1.0, second, ""},
    {"Sek", "s", 1.0, second, ""},
    {"seconde", "s", 1.0, second, ""},
    {"secondes", "s", 1.0, second, ""},
    {"segundo", "s", 1.0, second, ""},
    {"segundos", "s", 1.0, second, ""},
    {"millisecond", "ms", 1e-3, second, ""},
    {"milliseconds", "ms", 1e-3, second, ""},
    {"Millisekunden", "ms", 1e-3, second, ""},
    {"microsecond", "µs", 1e-6, second, ""},
    {"microseconds", "µs", 1e-6, second, ""},
    {"min", "min", 60.0, second, ""},
    {"minute", "min", 60.0, second, ""},
    {"minutes", "min", 60.0, second, ""},
    {"h", "h", 3600.0, second, ""},
    {"hour", "h", 3600.0, second, ""},
    {"hours", "h", 3600.0, second, ""},
    {"Hz", "Hz", 1.0, per_second, "kMm", true},
    {"cps", "Hz", 1.0, per_second, "", true},
    {"cpm", "cpm", 1.0 / 60.0, per_second, "", true},
    {"kg", "kg", 1.0, kilogram, ""},
    {"kilogram", "kg", 1.0, kilogram, ""},
    {"kilograms", "kg", 1.0, kilogram, ""},
    {"gram", "g", 1e-3, kilogram, ""},
    {"grams", "g", 1e-3, kilogram, ""},
    {"t", "t", 1000.0, kilogram, ""},
    {"tonne", "t", 1000.0, kilogram, ""},
    {"lb", "lb", pound, kilogram, ""},
    {"lbs", "lb", pound, kilogram, ""},
    {"lbm", "lb", pound, kilogram, ""},
    {"pound", "lb", pound, kilogram, ""},
    {"pounds", "lb", pound, kilogram, ""},
    {"oz", "oz", 0.028349523125, kilogram, ""},
    {"slug", "slug", pound_force / 0.3048, kilogram, ""},
    {"slugs", "slug", pound_force / 0.3048, kilogram, ""},
    {"G", "g", standard_gravity, gravity, "m"},
    {"gn", "g", standard_gravity, gravity, "m"},
    {"g_n", "g", standard_gravity, gravity, ""},
    {"g0", "g", standard_gravity, gravity, ""},
    {"g's", "g", standard_gravity, gravity, ""},
    {"Gal", "Gal", 0.01, gravity, "mu"},
    {"N", "N", 1.0, newton, "kMmu"},
    {"newton", "N", 1.0, newton, ""},
    {"newtons", "N", 1.0, newton, ""},
    {"Newton", "N", 1.0, newton, ""},
    {"daN", "daN", 10.0, newton, ""},
    {"dyn", "dyn", 1e-5, newton, ""},
    {"lbf", "lbf", pound_force, newton, ""},
    {"klbf", "klbf", 1000.0 * pound_force, newton, ""},
    {"kip", "klbf", 1000.0 * pound_force, newton, ""},
    {"ozf", "ozf", 0.27801385095378125, newton, ""},
    {"pdl", "pdl", 0.138254954376, newton, ""},
    {"kgf", "kgf", standard_gravity, newton, ""},
    {"kp", "kgf", standard_gravity, newton, ""},
    {"gf", "gf", standard_gravity * 1e-3, newton, ""},
    {"rad", "rad", 1.0, radian, "mu"},
    {"radian", "rad", 1.0, radian, ""},
    {"radians", "rad", 1.0, radian, ""},
    {"deg", "°", degree, radian, ""},
    {"degs", "°", degree, radian, ""},
    {"degree", "°", degree, radian, ""},
    {"degrees", "°", degree, radian, ""},
    {"°", "°", degree, radian, ""},
    {"º", "°", degree, radian, ""},
    {"mdeg", "mdeg", degree * 1e-3, radian, ""},
    {"Grad", "°", degree, radian, ""},
    {"gon", "gon", std::numbers::pi / 200.0, radian, ""},
    {"rev", "rev", 2.0 * std::numbers::pi, radian, ""},
    {"turn", "rev", 2.0 * std::numbers::pi, radian, ""},
    {"rpm", "rpm", std::numbers::pi / 30.0, radian_per_second, ""},
    {"V", "V", 1.0, volt, "kmu"},
    {"volt", "V", 1.0, volt, ""},
    {"volts", "V", 1.0, volt, ""},
    {"Volt", "V", 1.0, volt, ""},
    {"%", "%", 0.01, one, ""},
    {"percent", "%", 0.01, one, ""},
    {"‰", "‰", 0.001, one, ""},
    {"ppm", "ppm", 1e-6, one, ""},
};

// What a bare "g", "lb" or "kg" stands for depends on what is wanted.
struct Reading {
    bool gram = false;             // g is the gram, not standard gravity
    bool weight_as_force = false;  // lb, kg, oz are forces, as on spring catalogues ("lb/in", "kg/mm")
    bool fold_case = false;        // HZ, Sec, MM/S2
};

constexpr Atom gravity_atom{"g", "g", standard_gravity, gravity, "mu"};
constexpr Atom gram_atom{"g", "g", 1e-3, kilogram, "mu"};
constexpr Atom pound_force_atom{"lb", "lbf", pound_force, newton, ""};
constexpr Atom pounds_force_atom{"lbs", "lbf", pound_force, newton, ""};
constexpr Atom ounce_force_atom{"oz", "ozf", 0.27801385095378125, newton, ""};
constexpr Atom kilogram_force_atom{"kg", "kgf", standard_gravity, newton, ""};

char lower(char c) {
    return c >= 'A' && c <= 'Z' ? static_cast<char>(c - 'A' + 'a') : c;
}

bool same(std::string_view a, std::string_view b, bool fold_case) {
    if (!fold_case) return a == b;
    return std::equal(a.begin(), a.end(), b.begin(), b.end(),
                      [](char x, char y) { return lower(x) == lower(y); });
}

const Atom* contextual_atom(std::string_view text, const Reading& reading) {
    const Atom* g = reading.gram ? &gram_atom : &gravity_atom;
    if (text == "g") return g;
    if (!reading.weight_as_force) return nullptr;
    for (const Atom* atom : {&pound_force_atom, &pounds_force_atom, &ounce_force_atom, &kilogram_force_atom})
        if (same(text, atom->spelling, reading.fold_case)) return atom;
    return nullptr;
}

const Atom* find_atom(std::string_view text, const Reading& reading) {
    if (const Atom* atom = contextual_atom(text, reading)) return atom;
    for (const Atom& atom : atoms)
        if (same(text, atom.spelling, reading.fold_case)) return &atom;
    return nullptr;
}

double prefix_factor(char prefix) {
    switch (prefix) {
        case 'M':
            return 1e6;
        case 'k':
            return 1e3;
        case 'd':
            return 1e-1;
        case 'c':
            return 1e-2;
        case 'm':
            return 1e-3;
        case 'u':
            return 1e-6;
        default:
            return 1e-9;
    }
}

struct Factor {
    std::string symbol;
    double si_factor = 1.0;
    Powers powers{};
    bool cycles = false;
    int exponent = 1;
};

// "mm" → prefix m and atom m. With folded case nano and mega are left out: "NM" means newton metre.
std::optional<Factor> prefixed_factor(std::string_view text, const Reading& reading) {
    if (const Atom* atom = find_atom(text, reading))
        return Factor{std::string(atom->canonical), atom->si_factor, atom->powers, atom->cycles, 1};
    if (text.size() < 2) return std::nullopt;
    const char prefix = reading.fold_case ? lower(text[0]) : text[0];
    if (reading.fold_case && prefix == 'n') return std::nullopt;
    const Atom* atom = find_atom(text.substr(1), reading);
    if (atom == nullptr || atom->prefixes.find(prefix) == std::string_view::npos) return std::nullopt;
    std::string symbol = prefix == 'u' ? "µ" : std::string(1, prefix);
    symbol += atom->canonical;
    // A division by a whole power of ten is correctly rounded where a product with 1e-3 is not.
    const double factor = prefix_factor(prefix);
    const double si = factor < 1.0 ? atom->si_factor / std::round(1.0 / factor) : atom->si_factor * factor;
    return Factor{std::move(symbol), si, atom->powers, atom->cycles, 1};
}

// "Nm", "kNm", "Nms", "kgm", "lbfin": units written without a sign between them, a force or a mass first.
bool split_run(std::string_view text, const Reading& reading, std::vector<Factor>& out, int depth = 0) {
    if (auto whole = prefixed_factor(text, reading)) {
        out.push_back(*whole);
        return true;
    }
    if (depth > 2) return false;
    for (std::size_t cut = text.size() - 1; cut > 0 && cut < text.size(); --cut) {
        auto first = prefixed_factor(text.substr(0, cut), reading);
        if (!first || (depth == 0 && first->powers[1] == 0)) continue;
        std::vector<Factor> rest;
        if (!split_run(text.substr(cut), reading, rest, depth + 1)) continue;
        out.push_back(*first);
        out.insert(out.end(), rest.begin(), rest.end());
        return true;
    }
    return false;
}

void replace_all(std::string& text, std::string_view from, std::string_view to) {
    for (std::size_t at = 0; (at = text.find(from, at)) != std::string::npos; at += to.size())
        text.replace(at, from.size(), to);
}

// One sign for each meaning: u for micro, ^ before exponents, * between factors.
std::string plain_spelling(std::string_view text) {
    std::string plain(text);
    constexpr std::pair<std::string_view, std::string_view> signs[] = {
        {"µ", "u"},       {"μ", "u"},       {"⁻", "^-"},      {"¹", "^1"},     {"²", "^2"},  {"³", "^3"},
        {"·", "*"},       {"⋅", "*"},       {"×", "*"},       {"∙", "*"},      {"•", "*"},   {"−", "-"},
        {"**", "^"},      {"^-^", "^-"},    {"\u00a0", " "},  {"\u202f", " "}, {"g₀", "g0"}, {"gₙ", "gn"},
        {"U/min", "rpm"}, {"r/min", "rpm"}, {"tr/min", "rpm"}};
    for (const auto& [from, to] : signs) replace_all(plain, from, to);
    return plain;
}

// Reads "kg m^2/s^2", "N*s/m", "m s-2", "N/(m/s)" into factors.
class ExpressionReader {
  public:
    ExpressionReader(std::string_view text, const Reading& reading) : text_(text), reading_(reading) {}

    std::optional<std::vector<Factor>> read() {
        std::vector<Factor> factors;
        if (!product(factors, 1, 0)) return std::nullopt;
        skip_blanks();
        if (at_ != text_.size()) return std::nullopt;
        return factors;
    }

  private:
    void skip_blanks() {
        while (at_ < text_.size() && text_[at_] == ' ') ++at_;
    }
    [[nodiscard]] bool ended() const { return at_ >= text_.size() || text_[at_] == ')'; }

    bool product(std::vector<Factor>& out, int sign, int depth) {
        int next_sign = sign;
        for (bool first = true;; first = false) {
            skip_blanks();
            if (ended()) return !first && !pending_;
            if (!first && !operation(sign, next_sign)) return false;
            pending_ = true;
            if (!factor(out, next_sign, depth)) return false;
            pending_ = false;
            next_sign = sign;
        }
    }

    // The sign between two factors; a blank (already skipped) multiplies.
    bool operation(int sign, int& next_sign) {
        const char c = text_[at_];
        if (c == '/') next_sign = -sign;
        if (c == '/' || c == '*' || c == '.' || c == '-') ++at_;
        skip_blanks();
        return !ended();
    }

    bool factor(std::vector<Factor>& out, int sign, int depth) {
        if (text_[at_] == '(') {
            if (depth > 3) return false;
            ++at_;
            if (!product(out, sign, depth + 1) || at_ >= text_.size()) return false;
            ++at_;
            return true;
        }
        if (text_[at_] == '1') {
            ++at_;
            return true;
        }
        return named(out, sign);
    }

    bool named(std::vector<Factor>& out, int sign) {
        const std::size_t begin = at_;
        while (at_ < text_.size() && is_letter(begin)) ++at_;
        if (at_ == begin) return false;
        std::vector<Factor> run;
        if (!split_run(text_.substr(begin, at_ - begin), reading_, run)) return false;
        const auto power = exponent();
        if (!power) return false;
        run.back().exponent = *power;
        for (Factor& each : run) each.exponent *= sign;
        out.insert(out.end(), run.begin(), run.end());
        return true;
    }

    [[nodiscard]] bool is_letter(std::size_t begin) const {
        const char c = text_[at_];
        if ((c >= 'a' && c <= 'z') || (c >= 'A' && c <= 'Z') || c == '%' || (c & 0x80) != 0 || c == '\'')
            return true;
        // "g_n" and "g0" are the only names with other signs in them.
        return (c == '_' || c == '0') && at_ == begin + 1 && text_[begin] == 'g';
    }

    // 1 when none is written; nothing when it is not a small whole number other than 0.
    std::optional<int> exponent() {
        const bool caret = at_ < text_.size() && text_[at_] == '^';
        if (caret) ++at_;
        std::size_t at = at_;
        const bool minus = at < text_.size() && text_[at] == '-';
        if (minus) ++at;
        if (at >= text_.size() || text_[at] < '1' || text_[at] > '4')
            return caret ? std::nullopt : std::optional<int>(1);
        const int value = text_[at] - '0';
        at_ = at + 1;
        return minus ? -value : value;
    }

    std::string_view text_;
    Reading reading_;
    std::size_t at_ = 0;
    bool pending_ = false;
};

// "m/s/s" and "m/s²" become one: equal symbols are merged.
std::vector<Factor> merged(const std::vector<Factor>& factors) {
    std::vector<Factor> out;
    for (const Factor& factor : factors) {
        auto same_symbol =
            std::find_if(out.begin(), out.end(), [&](const Factor& f) { return f.symbol == factor.symbol; });
        if (same_symbol == out.end())
            out.push_back(factor);
        else
            same_symbol->exponent += factor.exponent;
    }
    std::erase_if(out, [](const Factor& f) { return f.exponent == 0; });
    return out;
}

std::string with_exponent(const Factor& factor) {
    constexpr std::string_view superscripts[] = {"", "", "²", "³", "⁴"};
    const int power = std::min(std::abs(factor.exponent), 4);
    return factor.symbol + std::string(superscripts[power]);
}

std::string symbol_of(const std::vector<Factor>& factors) {
    std::string above, below;
    int count_below = 0;
    for (const Factor& factor : factors) {
        std::string& side = factor.exponent > 0 ? above : below;
        if (!side.empty()) side += "·";
        side += with_exponent(factor);
        if (factor.exponent < 0) ++count_below;
    }
    if (below.empty()) return above;
    if (above.empty()) above.push_back('1');
    return above + "/" + (count_below > 1 ? "(" + below + ")" : below);
}

struct DimensionEntry {
    Dimension dimension;
    Powers powers;
    std::string_view name;
    std::string_view si_unit;
};

constexpr DimensionEntry dimensions[] = {
    {Dimension::none, {0, 0, 0, 0, 0}, "ratio", "1"},
    {Dimension::time, {0, 0, 1, 0, 0}, "time", "s"},
    {Dimension::rate, {0, 0, -1, 0, 0}, "rate", "1/s"},
    {Dimension::length, {1, 0, 0, 0, 0}, "length", "m"},
    {Dimension::velocity, {1, 0, -1, 0, 0}, "velocity", "m/s"},
    {Dimension::acceleration, {1, 0, -2, 0, 0}, "acceleration", "m/s²"},
    {Dimension::angle, {0, 0, 0, 1, 0}, "angle", "rad"},
    {Dimension::angular_velocity, {0, 0, -1, 1, 0}, "angular velocity", "rad/s"},
    {Dimension::angular_acceleration, {0, 0, -2, 1, 0}, "angular acceleration", "rad/s²"},
    {Dimension::mass, {0, 1, 0, 0, 0}, "mass", "kg"},
    {Dimension::inertia, {2, 1, 0, 0, 0}, "moment of inertia", "kg·m²"},
    {Dimension::force, {1, 1, -2, 0, 0}, "force", "N"},
    {Dimension::torque, {2, 1, -2, 0, 0}, "torque", "N·m"},
    {Dimension::stiffness, {0, 1, -2, 0, 0}, "stiffness", "N/m"},
    {Dimension::torsional_stiffness, {2, 1, -2, -1, 0}, "torsional stiffness", "N·m/rad"},
    {Dimension::damping, {0, 1, -1, 0, 0}, "damping coefficient", "N·s/m"},
    {Dimension::torsional_damping, {2, 1, -1, -1, 0}, "torsional damping coefficient", "N·m·s/rad"},
    {Dimension::quadratic_damping, {-1, 1, 0, 0, 0}, "quadratic damping coefficient", "N·s²/m²"},
    {Dimension::voltage, {0, 0, 0, 0, 1}, "voltage", "V"},
};

std::optional<Dimension> dimension_with(const Powers& powers, bool cycles) {
    if (cycles) {
        if (powers == per_second) return Dimension::frequency;
        return std::nullopt;
    }
    for (const DimensionEntry& entry : dimensions)
        if (entry.powers == powers) return entry.dimension;
    return std::nullopt;
}

std::optional<Unit> unit_from_factors(const std::vector<Factor>& read) {
    const std::vector<Factor> factors = merged(read);
    double above = 1.0, below = 1.0;
    Powers powers{};
    bool cycles = false;
    for (const Factor& factor : factors) {
        cycles = cycles || factor.cycles;
        for (int i = 0; i < std::abs(factor.exponent); ++i)
            (factor.exponent > 0 ? above : below) *= factor.si_factor;
        for (std::size_t i = 0; i < powers.size(); ++i) powers[i] += factor.powers[i] * factor.exponent;
    }
    const auto dimension = dimension_with(powers, cycles);
    if (!dimension) return std::nullopt;
    return Unit{symbol_of(factors), *dimension, above / below};
}

std::optional<Unit> read_as(const std::string& plain, const Reading& reading) {
    const auto factors = ExpressionReader(plain, reading).read();
    if (!factors) return std::nullopt;
    return unit_from_factors(*factors);
}

std::string_view trimmed(std::string_view text) {
    while (!text.empty() && (text.front() == ' ' || text.front() == '\t')) text.remove_prefix(1);
    while (!text.empty() && (text.back() == ' ' || text.back() == '\t')) text.remove_suffix(1);
    return text;
}

constexpr std::size_t longest_unit = 48;

// Every meaning of the text, the likeliest first; weights as forces only where a dimension is wanted.
std::vector<Unit> readings_of(std::string_view text, bool dimension_is_wanted) {
    std::vector<Unit> units;
    text = trimmed(text);
    if (text.empty() || text.size() > longest_unit) return units;
    const std::string plain = plain_spelling(text);
    for (const bool fold_case : {false, true}) {
        for (const bool gram : {false, true})
            if (auto unit = read_as(plain, {gram, false, fold_case})) units.push_back(std::move(*unit));
        if (!dimension_is_wanted) continue;
        if (auto unit = read_as(plain, {false, true, fold_case})) units.push_back(std::move(*unit));
    }
    return units;
}

// Levenshtein's distance with letters that differ in case alone at half price.
double spelling_distance(std::string_view a, std::string_view b) {
    std::vector<double> row(b.size() + 1);
    for (std::size_t j = 0; j <= b.size(); ++j) row[j] = static_cast<double>(j);
    for (std::size_t i = 0; i < a.size(); ++i) {
        double diagonal = row[0];
        row[0] = static_cast<double>(i + 1);
        for (std::size_t j = 0; j < b.size(); ++j) {
            const double swap = a[i] == b[j] ? 0.0 : lower(a[i]) == lower(b[j]) ? 0.5 : 1.0;
            const double best = std::min({diagonal + swap, row[j] + 1.0, row[j + 1] + 1.0});
            diagonal = row[j + 1];
            row[j + 1] = best;
        }
    }
    return row[b.size()];
}

struct Spelling {
    std::string_view text;
    Dimension dimension;
};

constexpr Spelling usual_spellings[] = {
    {"m", Dimension::length},
    {"mm", Dimension::length},
    {"cm", Dimension::length},
    {"µm", Dimension::length},
    {"in", Dimension::length},
    {"mil", Dimension::length},
    {"ft", Dimension::length},
    {"m/s", Dimension::velocity},
    {"mm/s", Dimension::velocity},
    {"in/s", Dimension::velocity},
    {"m/s²", Dimension::acceleration},
    {"mm/s²", Dimension::acceleration},
    {"g", Dimension::acceleration},
    {"m/s^2", Dimension::acceleration},
    {"mm/s^2", Dimension::acceleration},
    {"in/s^2", Dimension::acceleration},
    {"in/s²", Dimension::acceleration},
    {"ft/s²", Dimension::acceleration},
    {"Gal", Dimension::acceleration},
    {"rad", Dimension::angle},
    {"mrad", Dimension::angle},
    {"deg", Dimension::angle},
    {"rad/s", Dimension::angular_velocity},
    {"deg/s", Dimension::angular_velocity},
    {"rpm", Dimension::angular_velocity},
    {"rad/s²", Dimension::angular_acceleration},
    {"rad/s^2", Dimension::angular_acceleration},
    {"deg/s²", Dimension::angular_acceleration},
    {"s", Dimension::time},
    {"ms", Dimension::time},
    {"µs", Dimension::time},
    {"min", Dimension::time},
    {"Hz", Dimension::frequency},
    {"kHz", Dimension::frequency},
    {"1/s", Dimension::rate},
    {"kg", Dimension::mass},
    {"g", Dimension::mass},
    {"lb", Dimension::mass},
    {"oz", Dimension::mass},
    {"slug", Dimension::mass},
    {"kg·m²", Dimension::inertia},
    {"kg m^2", Dimension::inertia},
    {"g·cm²", Dimension::inertia},
    {"N", Dimension::force},
    {"kN", Dimension::force},
    {"lbf", Dimension::force},
    {"kgf", Dimension::force},
    {"N·m", Dimension::torque},
    {"N/m", Dimension::stiffness},
    {"N/mm", Dimension::stiffness},
    {"kN/m", Dimension::stiffness},
    {"lbf/in", Dimension::stiffness},
    {"kgf/mm", Dimension::stiffness},
    {"N·m/rad", Dimension::torsional_stiffness},
    {"N·s/m", Dimension::damping},
    {"N·s/mm", Dimension::damping},
    {"N·m·s/rad", Dimension::torsional_damping},
    {"N·s²/m²", Dimension::quadratic_damping},
    {"V", Dimension::voltage},
    {"mV", Dimension::voltage},
    {"%", Dimension::none},
    {"1", Dimension::none},
};

// Nothing where more than half of the letters would have to change: "furlong" is no slip for "slug".
std::string_view nearest_spelling(std::string_view text, std::optional<Dimension> wanted) {
    std::string_view best;
    double best_distance = 1e9;
    for (const Spelling& spelling : usual_spellings) {
        if (wanted && spelling.dimension != *wanted) continue;
        const double distance = spelling_distance(text, spelling.text);
        if (distance < best_distance) {
            best_distance = distance;
            best = spelling.text;
        }
    }
    return best_distance <= 0.5 * static_cast<double>(text.size()) ? best : std::string_view();
}

std::string quoted(std::string_view text) {
    return "\"" + std::string(text.substr(0, 60)) + "\"";
}

[[noreturn]] void refuse_unit(std::string_view text, std::string_view where,
                              std::optional<Dimension> wanted) {
    const std::string_view nearest = nearest_spelling(trimmed(text).substr(0, longest_unit), wanted);
    std::string found =
        trimmed(text).empty() ? std::string("no unit is given") : quoted(text) + " is no unit that is known";
    std::string remedy = "Did you mean " + quoted(nearest) + "?";
    if (nearest.empty())
        remedy = "Give a unit such as " +
                 (wanted ? quoted(si_unit_of(*wanted)) : "mm, in, m/s, m/s², g or deg") + ".";
    if (wanted) remedy += " A unit of " + std::string(name_of(*wanted)) + " is wanted here.";
    throw UsageError(Problem{std::string(where), "", std::move(found), std::move(remedy)});
}

bool serves(const Unit& unit, Dimension wanted) {
    return unit.dimension == wanted || (wanted == Dimension::frequency && unit.dimension == Dimension::rate);
}

}  // namespace

std::string_view name_of(Dimension dimension) {
    if (dimension == Dimension::frequency) return "frequency";
    for (const DimensionEntry& entry : dimensions)
        if (entry.dimension == dimension) return entry.name;
    return "";
}

std::string_view si_unit_of(Dimension dimension) {
    if (dimension == Dimension::frequency) return "Hz";
    for (const DimensionEntry& entry : dimensions)
        if (entry.dimension == dimension) return entry.si_unit;
    return "";
}

std::optional<Unit> find_unit(std::string_view text) {
    auto units = readings_of(text, false);
    if (units.empty()) return std::nullopt;
    return std::move(units.front());
}

std::optional<Unit> find_unit(std::string_view text, Dimension wanted) {
    for (Unit& unit : readings_of(text, true))
        if (serves(unit, wanted)) {
            unit.dimension = wanted;
            return std::move(unit);
        }
    return std::nullopt;
}

Unit parse_unit(std::string_view text, std::string_view where) {
    if (auto unit = find_unit(text)) return std::move(*unit);
    refuse_unit(text, where, std::nullopt);
}

Unit parse_unit(std::string_view text, std::string_view where, Dimension wanted) {
    if (wanted == Dimension::none && trimmed(text).empty()) return Unit{};
    if (auto unit = find_unit(text, wanted)) return std::move(*unit);
    const auto other = find_unit(text);
    if (!other) refuse_unit(text, where, wanted);
    throw UsageError(Problem{
        std::string(where), "",
        quoted(text) + " is a unit of " + std::string(name_of(other->dimension)) + ", not of " +
            std::string(name_of(wanted)),
        "Give a unit of " + std::string(name_of(wanted)) + ", such as " + quoted(si_unit_of(wanted)) + "."});
}

std::string_view suggested_unit(std::string_view text) {
    return nearest_spelling(trimmed(text).substr(0, longest_unit), std::nullopt);
}

}  // namespace ringwright
