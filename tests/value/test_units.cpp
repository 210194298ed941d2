// Factors: NIST Special Publication 811, appendix B (exact definitions); the products of definitions were
// computed with Python's fractions. Tolerance 1e-14 relative: a handful of roundings in double precision.
#include <catch2/catch.hpp>

#include "ringwright/error.hpp"
#include "ringwright/units.hpp"

using namespace ringwright;

namespace {

struct Case {
    const char* text;
    Dimension dimension;
    double si_factor;
};

bool close(double a, double b) {
    return std::abs(a - b) <= 1e-14 * std::abs(b);
}

}  // namespace

TEST_CASE("units carry their exact factors") {
    const Case cases[] = {
        {"g", Dimension::acceleration, 9.80665},
        {"in", Dimension::length, 0.0254},
        {"mil", Dimension::length, 2.54e-5},
        {"lb", Dimension::mass, 0.45359237},
        {"oz", Dimension::mass, 0.028349523125},
        {"slug", Dimension::mass, 14.5939029372064},
        {"lbf", Dimension::force, 4.4482216152605},
        {"kgf", Dimension::force, 9.80665},
        {"ozf", Dimension::force, 0.27801385095378125},
        {"pdl", Dimension::force, 0.138254954376},
        {"Gal", Dimension::acceleration, 0.01},
        {"lbf/in", Dimension::stiffness, 175.126835246476},
        {"lbf/ft", Dimension::stiffness, 14.5939029372064},
        {"lbf s^2/in", Dimension::mass, 175.126835246476},
        {"lbf in/rad", Dimension::torsional_stiffness, 0.1129848290276167},
        {"kgf/mm", Dimension::stiffness, 9806.65},
        {"rpm", Dimension::angular_velocity, 0.104719755119660},
        {"deg", Dimension::angle, 0.017453292519943295},
        {"in/s2", Dimension::acceleration, 0.0254},
        {"ft/s²", Dimension::acceleration, 0.3048},
    };
    for (const Case& each : cases) {
        INFO(each.text);
        const auto unit = find_unit(each.text);
        REQUIRE(unit);
        CHECK(unit->dimension == each.dimension);
        CHECK(close(unit->si_factor, each.si_factor));
    }
}

TEST_CASE("one unit has many spellings") {
    const char* millimetres_per_second_squared[] = {"mm/s^2", "mm/s2",   "mm/s²",    "mm s-2",   "mm/s/s",
                                                    "mm·s⁻²", "mm.s-2",  "mm/sec^2", "mm s^-2",  "mm*s-2",
                                                    "MM/S2",  "mm / s²", "mm/s**2",  "mm/(s^2)", "mm/(s·s)"};
    for (const char* text : millimetres_per_second_squared) {
        INFO(text);
        const auto unit = find_unit(text);
        REQUIRE(unit);
        CHECK(unit->dimension == Dimension::acceleration);
        CHECK(close(unit->si_factor, 1e-3));
        CHECK(unit->symbol == "mm/s²");
    }
    for (const char* text : {"N s/m", "N·s/m", "Ns/m", "N*s/m", "N-s/m", "N.s/m", "N/(m/s)", "(N s)/m"}) {
        INFO(text);
        const auto unit = find_unit(text);
        REQUIRE(unit);
        CHECK(unit->dimension == Dimension::damping);
        CHECK(unit->si_factor == 1.0);
    }
    for (const char* text : {"N.m/rad", "Nm/rad", "N m/rad", "N·m/rad", "NM/RAD"}) {
        INFO(text);
        const auto unit = find_unit(text);
        REQUIRE(unit);
        CHECK(unit->dimension == Dimension::torsional_stiffness);
        CHECK(unit->symbol == "N·m/rad");
    }
    CHECK(find_unit("\u00b5m")->symbol == "µm");
    CHECK(find_unit("\u03bcm")->symbol == "µm");
    CHECK(find_unit("um")->si_factor == 1e-6);
    CHECK(find_unit("°/s")->dimension == Dimension::angular_velocity);
    CHECK(find_unit("inch")->symbol == "in");
    CHECK(find_unit("kN/m")->si_factor == 1000.0);
    CHECK(find_unit("N/mm")->si_factor == 1000.0);
    CHECK(find_unit("kg m2")->dimension == Dimension::inertia);
    CHECK(find_unit("kgm²")->dimension == Dimension::inertia);
    CHECK(close(find_unit("g·cm²")->si_factor, 1e-7));
    CHECK(find_unit("N·m·s/rad")->dimension == Dimension::torsional_damping);
    CHECK(find_unit("N·s²/m²")->dimension == Dimension::quadratic_damping);
    CHECK(find_unit("%")->si_factor == 0.01);
    CHECK(find_unit("mV")->si_factor == 1e-3);
    CHECK(find_unit("Nm")->dimension == Dimension::torque);
    CHECK(find_unit("nm")->dimension == Dimension::length);
    CHECK(find_unit("1/s")->dimension == Dimension::rate);
    CHECK(find_unit("s-1")->dimension == Dimension::rate);
    CHECK(find_unit("Hz")->dimension == Dimension::frequency);
    CHECK(find_unit("min")->si_factor == 60.0);
    CHECK(find_unit("HZ")->symbol == "Hz");
}

TEST_CASE("what is wanted settles what can be read in two ways") {
    CHECK(find_unit("g")->dimension == Dimension::acceleration);
    CHECK(find_unit("mg")->dimension == Dimension::acceleration);
    CHECK(parse_unit("g", "--mass", Dimension::mass).si_factor == 1e-3);
    CHECK(parse_unit("mg", "--mass", Dimension::mass).si_factor == 1e-6);
    CHECK(close(parse_unit("lb/in", "stiffness", Dimension::stiffness).si_factor, 175.126835246476));
    CHECK(close(parse_unit("kg/mm", "stiffness", Dimension::stiffness).si_factor, 9806.65));
    CHECK(parse_unit("lb/in", "stiffness", Dimension::stiffness).symbol == "lbf/in");
    CHECK(parse_unit("", "ratio", Dimension::none).si_factor == 1.0);
    CHECK(parse_unit("1/s", "limit", Dimension::frequency).dimension == Dimension::frequency);
}

TEST_CASE("an unknown unit is refused and the nearest is named") {
    const auto remedy = [](const char* text) {
        try {
            (void)parse_unit(text, "--unit");
        } catch (const UsageError& error) {
            CHECK(error.problem().file == "--unit");
            return error.problem().remedy;
        }
        return std::string();
    };
    CHECK(remedy("mmm").find("\"mm\"") != std::string::npos);
    CHECK(remedy("m/s^22").find("\"m/s^2\"") != std::string::npos);
    CHECK(remedy("lfb/in").find("\"lbf/in\"") != std::string::npos);
    // More letters differ than agree: no slip of the pen.
    CHECK(remedy("furlong").find("Did you mean") == std::string::npos);
    CHECK(remedy("furlong").find("mm") != std::string::npos);
    CHECK(suggested_unit("furlong").empty());
    CHECK_THROWS_AS(parse_unit("kg", "--unit", Dimension::length), UsageError);
    CHECK_THROWS_AS(parse_unit("", "--unit"), UsageError);
}

TEST_CASE("nonsense is no unit") {
    for (const char* text : {"",    " ",      "/",    "*",    "m//s", "m/",       "1/",
                             "()",  "(m",     "m)",   "m^",   "m^0",  "m^-",      "((((((m))))))",
                             "foo", "counts", "m*kg", "Hz/s", "-m",   "\xff\xfe", "m\n"}) {
        INFO(text);
        CHECK_FALSE(find_unit(text));
    }
    CHECK_FALSE(find_unit(std::string(100000, 'm')));
}
