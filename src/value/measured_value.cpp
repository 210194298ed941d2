#include "ringwright/measured_value.hpp"

#include <fast_float/fast_float.h>
#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <numbers>
#include <optional>
#include <utility>

#include "ringwright/error.hpp"

namespace ringwright {
namespace {

[[noreturn]] void refuse(std::string_view text, std::string_view where, const std::string& what,
                         const std::string& remedy) {
    throw UsageError(
        Problem{std::string(where), "", "\"" + std::string(text.substr(0, 80)) + "\" " + what, remedy});
}

bool is_blank(char c) {
    return c == ' ' || c == '\t';
}

// A place in the text that moves forward as parts are recognised.
struct Cursor {
    std::string_view rest;

    void skip_blanks() {
        for (;;) {
            if (!rest.empty() && is_blank(rest.front()))
                rest.remove_prefix(1);
            else if (!take("\u00a0") && !take("\u202f"))
                return;
        }
    }
    bool take(std::string_view sign) {
        if (!rest.starts_with(sign)) return false;
        rest.remove_prefix(sign.size());
        return true;
    }
};

// A number as it stands in the text: its value, and the decimal places of its last digit.
struct WrittenNumber {
    double value = 0.0;
    int decimals = 0;
};

bool is_digit(char c) {
    return c >= '0' && c <= '9';
}

// The digits with one point or comma: "12.40", "12,4", ".5".
std::optional<std::string> take_mantissa(Cursor& cursor, int& decimals) {
    std::string digits;
    bool mark = false, any = false;
    decimals = 0;
    std::size_t used = 0;
    for (; used < cursor.rest.size(); ++used) {
        const char c = cursor.rest[used];
        if (is_digit(c)) {
            digits += c;
            any = true;
            if (mark) ++decimals;
        } else if ((c == '.' || c == ',') && !mark) {
            digits += '.';
            mark = true;
        } else {
            break;
        }
    }
    const bool second_mark = used < cursor.rest.size() &&
                             (cursor.rest[used] == '.' || cursor.rest[used] == ',') &&
                             used + 1 < cursor.rest.size() && is_digit(cursor.rest[used + 1]);
    if (!any || digits.size() > 60 || second_mark) return std::nullopt;
    cursor.rest.remove_prefix(used);
    return digits;
}

// "e-3", "E+5", "×10^-3", "x10-3"; nothing when there is none.
std::optional<int> take_exponent(Cursor& cursor) {
    Cursor probe = cursor;
    if (!probe.take("e") && !probe.take("E")) {
        probe.skip_blanks();
        if (!probe.take("×10") && !probe.take("x10") && !probe.take("*10")) return std::nullopt;
        probe.take("^");
    }
    const bool minus = probe.take("-") || probe.take("−");
    if (!minus) probe.take("+");
    int value = 0;
    std::size_t digits = 0;
    while (digits < probe.rest.size() && digits < 4 && is_digit(probe.rest[digits]))
        value = 10 * value + (probe.rest[digits++] - '0');
    if (digits == 0) return std::nullopt;
    probe.rest.remove_prefix(digits);
    cursor = probe;
    return minus ? -value : value;
}

double to_double(const std::string& mantissa, int exponent) {
    const std::string text = fmt::format("{}e{}", mantissa, exponent);
    double value = 0.0;
    const auto result = fast_float::from_chars(text.data(), text.data() + text.size(), value);
    return result.ec == std::errc() ? value : std::nan("");
}

bool take_minus(Cursor& cursor) {
    if (cursor.take("-") || cursor.take("−")) return true;
    if (!cursor.rest.starts_with("+/") && !cursor.rest.starts_with("+-")) cursor.take("+");
    return false;
}

std::optional<WrittenNumber> take_number(Cursor& cursor) {
    Cursor probe = cursor;
    const bool minus = take_minus(probe);
    int decimals = 0;
    const auto mantissa = take_mantissa(probe, decimals);
    if (!mantissa) return std::nullopt;
    const int exponent = take_exponent(probe).value_or(0);
    const double value = to_double(*mantissa, exponent);
    if (!std::isfinite(value)) return std::nullopt;
    cursor = probe;
    return WrittenNumber{minus ? -value : value, decimals - exponent};
}

// "(5)" in the last digits, or "(0.05)" in the unit, then perhaps an exponent for both.
struct Parentheses {
    double standard_uncertainty = 0.0;
    int exponent = 0;
};

std::optional<Parentheses> take_parentheses(Cursor& cursor, int decimals) {
    Cursor probe = cursor;
    if (!probe.take("(")) return std::nullopt;
    int places = 0;
    const auto digits = take_mantissa(probe, places);
    if (!digits || !probe.take(")")) return std::nullopt;
    const bool in_last_digits = digits->find('.') == std::string::npos;
    Parentheses found;
    found.exponent = take_exponent(probe).value_or(0);
    found.standard_uncertainty = to_double(*digits, (in_last_digits ? -decimals : 0) + found.exponent);
    if (!std::isfinite(found.standard_uncertainty)) return std::nullopt;
    cursor = probe;
    return found;
}

bool take_plus_minus(Cursor& cursor) {
    Cursor probe = cursor;
    probe.skip_blanks();
    if (!probe.take("±") && !probe.take("+/-") && !probe.take("+-") && !probe.take("+/−")) return false;
    probe.skip_blanks();
    cursor = probe;
    return true;
}

std::string_view trimmed(std::string_view text) {
    while (!text.empty() && is_blank(text.front())) text.remove_prefix(1);
    while (!text.empty() && is_blank(text.back())) text.remove_suffix(1);
    return text;
}

// The unit text before a plus-minus sign, or all that is left.
std::string_view take_unit_text(Cursor& cursor) {
    std::size_t end = cursor.rest.size();
    for (std::string_view sign : {"±", "+/-", "+-", "+/−"}) end = std::min(end, cursor.rest.find(sign));
    const std::string_view unit = trimmed(cursor.rest.substr(0, end));
    cursor.rest.remove_prefix(end);
    return unit;
}

class ValueReader {
  public:
    ValueReader(std::string_view text, std::string_view where, Dimension wanted)
        : text_(text), where_(where), wanted_(wanted), cursor_{trimmed(text)} {}

    MeasuredValue read() {
        value_.text = std::string(text_);
        const bool enclosed = text_begins_enclosed();
        const auto number = take_number(cursor_);
        if (!number) no_number();
        magnitude_ = number->value;
        last_digits(number->decimals);
        const bool early = plus_minus();
        if (enclosed && (cursor_.skip_blanks(), !cursor_.take(")"))) no_number();
        cursor_.skip_blanks();
        unit(early);
        return finish();
    }

  private:
    // "(12.4 ± 0.1) kg"
    bool text_begins_enclosed() { return cursor_.take("("); }

    void last_digits(int decimals) {
        const auto found = take_parentheses(cursor_, decimals);
        if (!found) return;
        magnitude_ *= std::pow(10.0, found->exponent);
        uncertainty_ = found->standard_uncertainty;
        value_.kind = UncertaintyKind::standard;
    }

    // The tolerance in the unit of the value; false when none is written here.
    bool plus_minus() {
        if (value_.kind != UncertaintyKind::not_stated || !take_plus_minus(cursor_)) return false;
        take_tolerance();
        return true;
    }

    void take_tolerance() {
        const auto tolerance = take_number(cursor_);
        if (!tolerance) no_number();
        if (tolerance->value < 0.0)
            refuse(text_, where_, "has a negative uncertainty", "Write the tolerance as a positive number.");
        uncertainty_ = tolerance->value;
        value_.kind = UncertaintyKind::tolerance;
    }

    void unit(bool early) {
        const std::string_view unit_text = take_unit_text(cursor_);
        // "12.4 ± 1 % kg" is nothing that people write; "5 ± 1 %" is a ratio with a tolerance in per cent.
        value_.unit = unit_of(unit_text);
        factor_ = value_.unit.si_factor;
        tolerance_factor_ = factor_;
        if (cursor_.rest.empty()) return;
        if (early || value_.kind != UncertaintyKind::not_stated || !take_plus_minus(cursor_)) no_number();
        take_tolerance();
        tolerance_unit();
    }

    // "12.4 kg ± 0.1 kg", "12.4 kg ± 100 g", "12.4 kg ± 1 %", "12.4 kg ± 0.1"
    void tolerance_unit() {
        cursor_.skip_blanks();
        const std::string_view unit_text = trimmed(cursor_.rest);
        if (unit_text.empty()) return;
        if (unit_text == "%" && wanted_ != Dimension::none)
            tolerance_factor_ = 0.01 * std::abs(magnitude_) * factor_;
        else
            tolerance_factor_ = unit_of(unit_text).si_factor;
    }

    [[nodiscard]] Unit unit_of(std::string_view unit_text) const {
        if (unit_text.empty() && wanted_ != Dimension::none)
            refuse(text_, where_, "has no unit",
                   fmt::format("Write it with a unit of {}, such as \"{} {}\".", name_of(wanted_),
                               trimmed(text_), si_unit_of(wanted_)));
        return parse_unit(unit_text, where_, wanted_);
    }

    MeasuredValue finish() {
        value_.value = magnitude_ * factor_;
        const double half_width = uncertainty_ * tolerance_factor_;
        value_.standard_uncertainty =
            value_.kind == UncertaintyKind::tolerance ? half_width / std::numbers::sqrt3 : half_width;
        if (!std::isfinite(value_.value) || !std::isfinite(value_.standard_uncertainty)) no_number();
        return std::move(value_);
    }

    [[noreturn]] void no_number() const {
        const std::string unit(wanted_ == Dimension::none ? std::string_view("") : si_unit_of(wanted_));
        refuse(text_, where_, "is no number with a unit",
               fmt::format("Write it like \"12.4 {0}\", \"12.40(5) {0}\" or \"12.4 ± 0.1 {0}\".", unit));
    }

    std::string_view text_;
    std::string_view where_;
    Dimension wanted_;
    Cursor cursor_;
    MeasuredValue value_;
    double magnitude_ = 0.0;
    double uncertainty_ = 0.0;
    double factor_ = 1.0;
    double tolerance_factor_ = 1.0;
};

// Decimal place of the second significant digit of u: 0.0123 → 3 decimals, 1234 → −2.
int decimals_for(double uncertainty) {
    const int leading = static_cast<int>(std::floor(std::log10(uncertainty)));
    const int decimals = 1 - leading;
    // 0.0996 becomes 0.10, not 0.100.
    const double rounded = std::round(uncertainty * std::pow(10.0, decimals));
    return rounded >= 100.0 ? decimals - 1 : decimals;
}

int decimals_for_six_digits(double value) {
    if (value == 0.0 || !std::isfinite(value)) return 0;
    return 5 - static_cast<int>(std::floor(std::log10(std::abs(value))));
}

std::string without_negative_zero(std::string text) {
    if (text.starts_with('-') && text.find_first_of("123456789") == std::string::npos) text.erase(0, 1);
    return text;
}

std::string fixed_text(double value, int decimals) {
    if (!std::isfinite(value)) return std::isnan(value) ? "unknown" : value > 0.0 ? "∞" : "-∞";
    if (decimals >= 0) return without_negative_zero(fmt::format("{:.{}f}", value, decimals));
    const double place = std::pow(10.0, -decimals);
    return without_negative_zero(fmt::format("{:.0f}", std::round(value / place) * place));
}

// Very small and very large figures: "1.234e-08", each with the digits down to the same decimal place.
std::string scientific_text(double value, int decimals) {
    if (!std::isfinite(value) || value == 0.0) return fixed_text(value, 0);
    const int leading = static_cast<int>(std::floor(std::log10(std::abs(value))));
    return fmt::format("{:.{}e}", value, std::clamp(decimals + leading, 0, 17));
}

}  // namespace

MeasuredValue parse_measured_value(std::string_view text, std::string_view where, Dimension wanted) {
    return ValueReader(text, where, wanted).read();
}

double parse_number(std::string_view text, std::string_view where) {
    Cursor cursor{trimmed(text)};
    const auto number = take_number(cursor);
    if (!number || !cursor.rest.empty())
        refuse(text, where, "is no plain number", "Write a number such as 12.5 or 1.25e1, with no unit.");
    return number->value;
}

RoundedEstimate round_to_uncertainty(const Estimate& estimate) {
    return round_to_uncertainty(estimate, 1.0);
}

RoundedEstimate round_to_uncertainty(const Estimate& estimate, double unit_factor) {
    const double value = estimate.value / unit_factor;
    const double uncertainty = estimate.standard_uncertainty / unit_factor;
    const bool known = std::isfinite(uncertainty) && uncertainty > 0.0;
    const int decimals = known ? decimals_for(uncertainty) : decimals_for_six_digits(value);
    const bool far = decimals > 9 || decimals < -6;
    const auto text = far ? scientific_text : fixed_text;
    return RoundedEstimate{text(value, decimals), text(uncertainty, decimals),
                           text(estimate.interval.low / unit_factor, decimals),
                           text(estimate.interval.high / unit_factor, decimals)};
}

}  // namespace ringwright
