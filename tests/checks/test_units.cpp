// Units against their exact definitions (NIST SP 811, appendix B, from memory; the definitions were seen in
// the file definitions.units of Debian's package units 2.22-2) and products of them computed with 30 digits.
#include <catch2/catch.hpp>
#include <numbers>
#include <string>

#include "ringwright/units.hpp"

using namespace ringwright;

namespace {

struct Row {
    const char* text;
    double si_factor;
    Dimension dimension;
};

void check(const Row& row) {
    INFO(row.text);
    const auto unit = find_unit(row.text);
    REQUIRE(unit);
    CHECK(unit->si_factor == Approx(row.si_factor).epsilon(1e-14));  // rounding of one or two products
    CHECK(unit->dimension == row.dimension);
}

}  // namespace

TEST_CASE("units of length and acceleration") {
    for (const Row& row :
         {Row{"in", 0.0254, Dimension::length}, Row{"mil", 0.0000254, Dimension::length},
          Row{"ft", 0.3048, Dimension::length}, Row{"Gal", 0.01, Dimension::acceleration},
          Row{"G", 9.80665, Dimension::acceleration}, Row{"in/s", 0.0254, Dimension::velocity}})
        check(row);
    // g_n in in/s² and ft/s²
    CHECK(9.80665 / find_unit("in/s^2")->si_factor == Approx(386.088582677165354).epsilon(1e-14));
    CHECK(9.80665 / find_unit("ft/s2")->si_factor == Approx(32.1740485564304462).epsilon(1e-14));
}

TEST_CASE("units of mass and force") {
    for (const Row& row :
         {Row{"lb", 0.45359237, Dimension::mass}, Row{"oz", 0.028349523125, Dimension::mass},
          Row{"slug", 14.5939029372063648, Dimension::mass},
          Row{"lbf s^2/in", 175.126835246476378, Dimension::mass},
          Row{"lbf", 4.4482216152605, Dimension::force}, Row{"kgf", 9.80665, Dimension::force},
          Row{"ozf", 0.27801385095378125, Dimension::force}, Row{"pdl", 0.138254954376, Dimension::force}})
        check(row);
}

TEST_CASE("units of stiffness and damping") {
    for (const Row& row : {Row{"lbf/in", 175.126835246476378, Dimension::stiffness},
                           Row{"lbf/ft", 14.5939029372063648, Dimension::stiffness},
                           Row{"kgf/mm", 9806.65, Dimension::stiffness},
                           Row{"lbf s/in", 175.126835246476378, Dimension::damping},
                           Row{"lbf in/rad", 0.1129848290276167, Dimension::torsional_stiffness}})
        check(row);
}

TEST_CASE("units of angle and rotation") {
    for (const Row& row : {Row{"deg", 0.0174532925199432958, Dimension::angle},
                           Row{"rpm", 0.104719755119659775, Dimension::angular_velocity}})
        check(row);
}
