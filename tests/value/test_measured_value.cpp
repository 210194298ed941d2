#include "ringwright/measured_value.hpp"

#include <catch2/catch.hpp>
#include <clocale>
#include <limits>

#include "ringwright/error.hpp"

using namespace ringwright;

namespace {

MeasuredValue mass(const char* text) {
    return parse_measured_value(text, "--mass", Dimension::mass);
}

}  // namespace

TEST_CASE("values as people write them") {
    // Worked by hand; 1e-15 relative covers the decimal fractions that binary cannot hold.
    CHECK(mass("12.4 kg").value == 12.4);
    CHECK(mass("12,4 kg").value == 12.4);
    CHECK(mass("12.4kg").value == 12.4);
    CHECK(mass("  12.4  kg ").value == 12.4);
    CHECK(mass("1.5e-3 kg").value == 1.5e-3);
    CHECK(mass("1.5×10^-3 kg").value == 1.5e-3);
    CHECK(mass("250 g").value == 0.25);
    CHECK(mass("12.4 kg").kind == UncertaintyKind::not_stated);
    CHECK(parse_measured_value("1.5e-3 kg m2", "--inertia", Dimension::inertia).value == 1.5e-3);
    CHECK(parse_measured_value("-3 mm", "x", Dimension::length).value == Approx(-3e-3).epsilon(1e-15));
    CHECK(parse_measured_value("8 %", "x", Dimension::none).value == 0.08);
    CHECK(parse_measured_value("0.22", "x", Dimension::none).value == 0.22);
}

TEST_CASE("a standard uncertainty in the last digits (JCGM 100:2008, 7.2.2)") {
    // The standard's own example: m_S = 100,021 47(35) g and 100,021 47(0,000 35) g are the same statement.
    const MeasuredValue digits = mass("100,02147(35) g");
    CHECK(digits.value == Approx(0.10002147).epsilon(1e-15));
    CHECK(digits.standard_uncertainty == Approx(0.35e-6).epsilon(1e-14));
    CHECK(digits.kind == UncertaintyKind::standard);
    const MeasuredValue figure = mass("100,02147(0,00035) g");
    CHECK(figure.standard_uncertainty == Approx(0.35e-6).epsilon(1e-14));
    CHECK(mass("12.40(5) kg").standard_uncertainty == Approx(0.05).epsilon(1e-15));
    CHECK(mass("1240(15) kg").standard_uncertainty == 15.0);
    CHECK(mass("12.40(5)e-3 kg").value == Approx(0.0124).epsilon(1e-15));
    CHECK(mass("12.40(5)e-3 kg").standard_uncertainty == Approx(5e-5).epsilon(1e-14));
}

TEST_CASE("a tolerance is the half-width of a rectangle (JCGM 100:2008, 4.3.7)") {
    // u = a/√3 with a = 0.1 kg, √3 to 16 digits.
    for (const char* text : {"12.4 ± 0.1 kg", "12.4 +/- 0.1 kg", "12.4+-0.1 kg", "(12.4 ± 0.1) kg",
                             "12.4 kg ± 0.1 kg", "12.4 kg ± 100 g", "12,4 ± 0,1 kg", "12.4 kg ± 0.1"}) {
        INFO(text);
        const MeasuredValue value = mass(text);
        CHECK(value.value == 12.4);
        CHECK(value.kind == UncertaintyKind::tolerance);
        CHECK(value.standard_uncertainty == Approx(0.1 / 1.7320508075688772).epsilon(1e-14));
    }
    CHECK(mass("20 kg ± 1 %").standard_uncertainty == Approx(0.2 / 1.7320508075688772).epsilon(1e-14));
}

TEST_CASE("what is no value is refused with the option's name") {
    for (const char* text : {"", "kg", "12.4", "12.4 mm", "12.4 kgg", "nan kg", "inf kg", "1e999 kg",
                             "12.4 ± -0.1 kg", "12.4 ± kg", "12.40(5 kg", "12.4(x) kg", "1,234.5 kg",
                             "12.4 ± 0.1 ± 0.2 kg", "--3 kg", "12.4(5) ± 0.1 kg", "(12.4 kg", "12 . 4 kg"}) {
        INFO(text);
        CHECK_THROWS_AS(mass(text), UsageError);
    }
    try {
        (void)mass("12.4");
    } catch (const UsageError& error) {
        CHECK(error.problem().file == "--mass");
        CHECK(error.problem().remedy.find("12.4 kg") != std::string::npos);
    }
    CHECK_THROWS_AS(parse_number("12 kg", "--rate"), UsageError);
    CHECK_THROWS_AS(parse_number("", "--rate"), UsageError);
    CHECK_THROWS_AS(parse_number("nan", "--rate"), UsageError);
    CHECK(parse_number("2000", "--rate") == 2000.0);
    CHECK(parse_number("+2e3", "--rate") == 2000.0);
    CHECK(parse_number("0,5", "--rate") == 0.5);
}

TEST_CASE("the uncertainty keeps two digits and the value ends where it ends (JCGM 100:2008, 7.2.6)") {
    const auto rounded = [](double value, double u) {
        return round_to_uncertainty(Estimate{value, u, {value - 2 * u, value + 2 * u}, 10.0});
    };
    // The standard's own example: y = 10,057 62 Ω with u = 27 mΩ is given as 10,058 Ω.
    CHECK(rounded(10.05762, 0.027).value == "10.058");
    CHECK(rounded(10.05762, 0.027).standard_uncertainty == "0.027");
    CHECK(rounded(10.05762, 0.027).low == "10.004");
    CHECK(rounded(10.05762, 0.027).high == "10.112");
    CHECK(rounded(1.0, 0.0996).standard_uncertainty == "0.10");
    CHECK(rounded(1.0, 0.0996).value == "1.00");
    CHECK(rounded(123456.0, 1234.0).value == "123500");
    CHECK(rounded(123456.0, 1234.0).standard_uncertainty == "1200");
    CHECK(rounded(-0.0001, 0.5).value == "0.00");
    CHECK(rounded(1.23456789e-12, 4.5e-15).value == "1.2346e-12");
    CHECK(rounded(1.23456789e-12, 4.5e-15).standard_uncertainty == "4.5e-15");
    CHECK(rounded(3.14159265, 0.0).value == "3.14159");
    CHECK(round_to_uncertainty(Estimate{0.0025, 0.0001, {0.0023, 0.0027}, 5.0}, 1e-3).value == "2.50");
    const auto open =
        round_to_uncertainty(Estimate{1.0, 0.1, {0.5, std::numeric_limits<double>::infinity()}, 5.0});
    CHECK(open.high == "∞");
}
