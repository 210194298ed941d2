#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cmath>

#include "conformity/sheet_reading.hpp"
#include "ringwright/error.hpp"

namespace ringwright::sheet {
namespace {

/// In what units a quantity's limit may be written: for linear motion and for torsion.
struct LimitUnits {
    Quantity quantity;
    Dimension linear, torsional;
};

constexpr std::array<LimitUnits, 20> limit_units{{
    {Quantity::natural_frequency, Dimension::frequency, Dimension::frequency},
    {Quantity::damped_frequency, Dimension::frequency, Dimension::frequency},
    {Quantity::damping_ratio, Dimension::none, Dimension::none},
    {Quantity::logarithmic_decrement, Dimension::none, Dimension::none},
    {Quantity::loss_factor, Dimension::none, Dimension::none},
    {Quantity::quality_factor, Dimension::none, Dimension::none},
    {Quantity::decay_rate, Dimension::rate, Dimension::rate},
    {Quantity::slow_decay_rate, Dimension::rate, Dimension::rate},
    {Quantity::stiffness, Dimension::stiffness, Dimension::torsional_stiffness},
    {Quantity::damping_coefficient, Dimension::damping, Dimension::torsional_damping},
    {Quantity::mass, Dimension::mass, Dimension::mass},
    {Quantity::inertia, Dimension::inertia, Dimension::inertia},
    {Quantity::static_deflection, Dimension::length, Dimension::length},
    {Quantity::friction_force, Dimension::force, Dimension::torque},
    {Quantity::compression_damping, Dimension::damping, Dimension::torsional_damping},
    {Quantity::rebound_damping, Dimension::damping, Dimension::torsional_damping},
    {Quantity::quadratic_damping, Dimension::quadratic_damping, Dimension::quadratic_damping},
    {Quantity::cubic_stiffness, Dimension::none, Dimension::none},  // in N/m³, read below
    {Quantity::drop_height, Dimension::length, Dimension::length},
    {Quantity::contact_velocity, Dimension::velocity, Dimension::velocity},
}};

const std::vector<std::string_view> rules{"simple acceptance", "guarded acceptance", "guarded rejection"};

/// A number of a limit, in SI units.
struct LimitNumber {
    double value = 0.0;
    std::string text;
    std::optional<bool> torsional;
};

std::optional<Unit> unit_after_number(std::string_view text) {
    const auto space = text.find_first_of(" \t");
    if (space == std::string_view::npos) return std::nullopt;
    return find_unit(text.substr(space));
}

bool is_bare_number(const Table& table, std::string_view key) {
    const toml::node* node = table.entries.get(key);
    return node && node->is_number();
}

/// A cubic stiffness, whose unit is that of nothing else: "2.0e6 N/m³".
LimitNumber cubic_stiffness(const Table& table, std::string_view key) {
    const std::string text = *text_at(table, key);
    const auto space = text.find_first_of(" \t");
    const auto begin = space == std::string::npos ? space : text.find_first_not_of(" \t", space);
    const std::string_view unit = begin == std::string::npos ? "" : std::string_view(text).substr(begin);
    const bool metre = unit == "N/m³" || unit == "N/m^3" || unit == "N/m3";
    if (!metre && unit != "N/mm³" && unit != "N/mm^3" && unit != "N/mm3")
        refuse(table, key, fmt::format("\"{}\" is no cubic stiffness", text),
               "Write it as in \"2.0e6 N/m^3\".");
    try {
        return {
            parse_number(std::string_view(text).substr(0, space), path_of(table, key)) * (metre ? 1.0 : 1e9),
            text, std::nullopt};
    } catch (const UsageError& error) {
        refuse(table, key, error.problem().found, error.problem().remedy);
    }
}

std::optional<LimitNumber> limit_number(const Table& table, std::string_view key, const LimitUnits& units) {
    if (!table.entries.contains(key)) return std::nullopt;
    if (units.quantity == Quantity::cubic_stiffness) return cubic_stiffness(table, key);
    if (units.linear == Dimension::none && is_bare_number(table, key)) {
        const double value = *number_at(table, key);
        return LimitNumber{value, fmt::format("{:g}", value), std::nullopt};
    }
    bool torsional = false;
    if (units.linear != units.torsional && table.entries.get(key)->is_string())
        if (const auto unit = unit_after_number(table.entries.get(key)->as_string()->get()))
            torsional = unit->dimension == units.torsional;
    const auto measured = measured_at(table, key, torsional ? units.torsional : units.linear);
    if (measured->kind != UncertaintyKind::not_stated)
        refuse(table, key, "a limit with an uncertainty", "Write the number alone: a limit is exact.");
    LimitNumber number{measured->value, measured->text, std::nullopt};
    if (units.linear != units.torsional) number.torsional = torsional;
    return number;
}

/// A tolerance: "8 %" of the nominal value, or a half-width in its unit.
double half_width(const Table& table, const LimitNumber& nominal, const LimitUnits& units,
                  std::string& text) {
    const toml::node* node = table.entries.get("tolerance");
    double width = 0.0;
    const bool share = node->is_string() && node->as_string()->get().find('%') != std::string::npos;
    if (share) {
        const auto measured = *measured_at(table, "tolerance", Dimension::none);
        width = measured.value * std::abs(nominal.value);
        text = measured.text;
    } else {
        const LimitNumber read = *limit_number(table, "tolerance", units);
        if (read.torsional != nominal.torsional)
            refuse(table, "tolerance", "unit of another kind than the nominal value's",
                   "Use the same for both.");
        width = read.value;
        text = read.text;
    }
    if (!(width > 0.0)) refuse(table, "tolerance", "not above zero", "Give the half-width, as in \"8 %\".");
    return width;
}

SheetLimit around_nominal(const Table& table, const LimitUnits& units) {
    for (const std::string_view key : {"min", "max"})
        if (table.entries.contains(key))
            refuse(table, key, "contradicts the nominal value beside it",
                   "Give min and max, or nominal and tolerance.");
    const auto nominal = limit_number(table, "nominal", units);
    if (!nominal)
        refuse(table, "tolerance", "a tolerance without a nominal value",
               "Add nominal, or give min and max.");
    if (!table.entries.contains("tolerance"))
        refuse(table, "nominal", "a nominal value without a tolerance", "Add tolerance, as in \"8 %\".");
    std::string tolerance_text;
    const double width = half_width(table, *nominal, units, tolerance_text);
    SheetLimit read;
    read.limit = {units.quantity, nominal->value - width, nominal->value + width};
    read.torsional = nominal->torsional;
    read.text = fmt::format("{} ± {}", nominal->text, tolerance_text);
    return read;
}

SheetLimit between_ends(const Table& table, const LimitUnits& units) {
    const auto lower = limit_number(table, "min", units);
    const auto upper = limit_number(table, "max", units);
    if (lower && upper && lower->value > upper->value)
        refuse(table, "min", fmt::format("min {} lies above max {}", lower->text, upper->text),
               "Exchange or correct them.");
    if (lower && upper && lower->torsional != upper->torsional)
        refuse(table, "max", "unit of another kind than min's", "Use the same for both.");
    SheetLimit read;
    read.limit.quantity = units.quantity;
    if (lower) read.limit.lower = lower->value;
    if (upper) read.limit.upper = upper->value;
    read.torsional = lower ? lower->torsional : upper->torsional;
    read.text = lower && upper ? fmt::format("{} … {}", lower->text, upper->text)
                : lower        ? fmt::format("≥ {}", lower->text)
                               : fmt::format("≤ {}", upper->text);
    return read;
}

SheetLimit read_limit(const Table& limits, const LimitUnits& units) {
    const std::string_view key = key_of(units.quantity);
    const Table table = *table_at(limits, key);
    require_known_keys(table, {"min", "max", "nominal", "tolerance"});
    if (table.entries.empty())
        refuse(limits, key, "a limit with nothing in it", "Give min, max, or nominal and tolerance.");
    const bool nominal = table.entries.contains("nominal") || table.entries.contains("tolerance");
    SheetLimit read = nominal ? around_nominal(table, units) : between_ends(table, units);
    read.line = line_of(limits, key);
    return read;
}

void read_rule(const Table& limits, TestSheet& sheet) {
    if (const auto rule = choice_at(limits, "decision_rule", rules)) {
        sheet.rule_given = true;
        sheet.decision.rule = *decision_rule_from_text(*rule);
    }
    if (const auto multiple = number_at(limits, "guard_band")) {
        if (*multiple < 0.0) refuse(limits, "guard_band", "below zero", "Give a multiple of U, usually 1.");
        sheet.decision.guard_multiple = *multiple;
    }
    if (const auto factor = number_at(limits, "coverage_factor")) {
        if (*factor <= 0.0) refuse(limits, "coverage_factor", "not above zero", "Give k, usually 2.");
        sheet.decision.coverage_factor = factor;
    }
}

}  // namespace

void read_limits(const Table& limits, TestSheet& sheet) {
    std::vector<std::string_view> known{"decision_rule", "guard_band", "coverage_factor"};
    for (const LimitUnits& units : limit_units) known.push_back(key_of(units.quantity));
    require_known_keys(limits, known);
    read_rule(limits, sheet);
    for (const LimitUnits& units : limit_units)
        if (limits.entries.contains(key_of(units.quantity)))
            sheet.limits.push_back(read_limit(limits, units));
    std::ranges::stable_sort(sheet.limits, {}, &SheetLimit::line);
}

}  // namespace ringwright::sheet
