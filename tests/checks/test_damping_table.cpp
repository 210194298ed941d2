// Exact relations of damping against a table computed with 30 digits from the closed forms (mpmath; the
// formulas are those of Thomson, Rao, Inman and Den Hartog, recalled; the light-damping forms were seen in
// the SEG dictionary under "Q" and in a damping cross-reference sheet). Tolerance: the digits printed in the
// table.
#include <catch2/catch.hpp>
#include <cmath>
#include <numbers>

#include "ringwright/damping_relations.hpp"

using namespace ringwright;

namespace {

struct DecayRow {
    double damping_ratio, decrement, amplitude_ratio, cycles_to_half, damped_share, energy_lost;
};
constexpr DecayRow decay_table[] = {
    {0.0005, 0.00314159304629, 0.996863336593, 220.635572573, 0.999999875, 0.0062634881557},
    {0.001, 0.00628318844877, 0.993736509503, 110.317744917, 0.9999995, 0.0124877496811},
    {0.002, 0.0125663957472, 0.987512231705, 55.1587897203, 0.999997999998, 0.0248195922336},
    {0.005, 0.0314163192423, 0.969072045744, 22.063284219, 0.999987499922, 0.0608993701577},
    {0.01, 0.0628349949001, 0.939098416934, 11.0312284048, 0.99994999875, 0.118094163313},
    {0.02, 0.125688846427, 0.881889207075, 5.51478671548, 0.999799979996, 0.222271426445},
    {0.03, 0.188580439516, 0.828133886071, 3.67560486305, 0.999549898704, 0.314194266741},
    {0.05, 0.314552702289, 0.730115380179, 2.20359633065, 0.998749217772, 0.466931531625},
    {0.1, 0.6314838834, 0.531802082944, 1.09764825165, 0.994987437107, 0.717186544576},
    {0.2, 1.28254983016, 0.277329255639, 0.540444639467, 0.979795897113, 0.923088483967},
    {0.3, 1.97597036515, 0.13862672841, 0.350788247023, 0.953939201417, 0.98078263017},
    {0.4, 2.74220688339, 0.0644280047912, 0.252769834675, 0.916515138991, 0.995849032199},
    {0.5, 3.62759872847, 0.0265799334764, 0.191076034711, 0.866025403784, 0.999293507136},
    {0.7, 6.15875347493, 0.00211488789011, 0.112546667663, 0.714142842854, 0.999995527249},
    {0.9, 12.9731541146, 2.32183180057e-6, 0.053429349134, 0.435889894354, 0.999999999995},
};
constexpr double twelve_digits = 5e-12, eleven_digits = 2e-11;

struct HalfPowerRow {
    double damping_ratio;
    double receptance_peak, receptance_low, receptance_high;
    double accelerance_peak, accelerance_low, accelerance_high;
    double mobility_low, mobility_high;
};
constexpr HalfPowerRow half_power_table[] = {
    {0.001, 0.999999, 0.998998499, 1.0009985, 1.000001, 0.999002495, 1.00100251, 0.9990005, 1.0010005},
    {0.005, 0.999975, 0.994962374, 1.00496262, 1.000025, 0.995061882, 1.00506313, 0.9950125, 1.0050125},
    {0.01, 0.999899995, 0.989848978, 1.00985098, 1.00010002, 0.990245116, 1.01025512, 0.990049999, 1.01005},
    {0.02, 0.99959992, 0.979391648, 1.01940767, 1.00040024, 0.980961816, 1.02104199, 0.98019998, 1.02019998},
    {0.05, 0.997496867, 0.9461105, 1.04636271, 1.00250941, 0.955691549, 1.05695899, 0.95124922, 1.05124922},
    {0.1, 0.989949494, 0.883743465, 1.08581651, 1.01015254, 0.920965921, 1.13155009, 0.904987562, 1.10498756},
    {0.15, 0.977241014, 0.811414938, 1.11875189, 1.02328902, 0.893853236, 1.23241507, 0.861187421,
     1.16118742},
    {0.2, 0.959166305, 0.72669226, 1.14539005, 1.04257207, 0.873065034, 1.37609832, 0.819803903, 1.2198039},
    {0.25, 0.935414347, 0.625201633, 1.16581427, 1.06904497, 0.857769564, 1.59948399, 0.780776406,
     1.28077641},
    {0.3, 0.905538514, 0.497630866, 1.17998454, 1.10431526, 0.847468729, 2.00952165, 0.744030651, 1.34403065},
    {0.35, 0.86890736, 0.315079689, 1.18773936, 1.15087068, 0.841935557, 3.17380027, 0.709481005, 1.40948101},
    {0.38, 0.843326746, 0.0906105421, 1.18919709, 1.18578001, 0.840903501, 11.0362434, 0.68976633,
     1.44976633},
};
constexpr double nine_digits = 5e-9;  // half a unit in the ninth digit of numbers between 0.1 and 12

}  // namespace

TEST_CASE("logarithmic decrement, amplitude ratio, cycles to half, damped frequency, energy loss",
          "[decay]") {
    for (const auto& row : decay_table) {
        INFO("damping ratio " << row.damping_ratio);
        CHECK(logarithmic_decrement(row.damping_ratio) == Approx(row.decrement).epsilon(twelve_digits));
        CHECK(damping_ratio_from_decrement(row.decrement) ==
              Approx(row.damping_ratio).epsilon(twelve_digits));
        CHECK(std::exp(-logarithmic_decrement(row.damping_ratio)) ==
              Approx(row.amplitude_ratio).epsilon(eleven_digits));
        CHECK(cycles_to_fraction(row.damping_ratio, 0.5) ==
              Approx(row.cycles_to_half).epsilon(eleven_digits));
        CHECK(damped_frequency(1.0, row.damping_ratio) == Approx(row.damped_share).epsilon(twelve_digits));
        CHECK(undamped_frequency(row.damped_share, row.damping_ratio) == Approx(1.0).epsilon(twelve_digits));
        CHECK(energy_lost_per_cycle(row.damping_ratio) == Approx(row.energy_lost).epsilon(eleven_digits));
    }
}

TEST_CASE("half-power points of displacement per force", "[half-power]") {
    for (const auto& row : half_power_table) {
        INFO("damping ratio " << row.damping_ratio);
        const auto points = half_power_points(FrequencyResponse::receptance, {1.0, row.damping_ratio});
        REQUIRE(points);
        CHECK(points->low_hz == Approx(row.receptance_low).epsilon(nine_digits));
        CHECK(points->high_hz == Approx(row.receptance_high).epsilon(nine_digits));
        CHECK(*peak_frequency(FrequencyResponse::receptance, {1.0, row.damping_ratio}) ==
              Approx(row.receptance_peak).epsilon(nine_digits));
    }
}

TEST_CASE("half-power points of velocity per force", "[half-power]") {
    for (const auto& row : half_power_table) {
        INFO("damping ratio " << row.damping_ratio);
        const auto points = half_power_points(FrequencyResponse::mobility, {1.0, row.damping_ratio});
        REQUIRE(points);
        CHECK(points->low_hz == Approx(row.mobility_low).epsilon(nine_digits));
        CHECK(points->high_hz == Approx(row.mobility_high).epsilon(nine_digits));
    }
}

TEST_CASE("half-power points of acceleration per force", "[half-power]") {
    for (const auto& row : half_power_table) {
        INFO("damping ratio " << row.damping_ratio);
        const auto points = half_power_points(FrequencyResponse::accelerance, {1.0, row.damping_ratio});
        REQUIRE(points);
        CHECK(points->low_hz == Approx(row.accelerance_low).epsilon(nine_digits));
        CHECK(points->high_hz == Approx(row.accelerance_high).epsilon(nine_digits));
        CHECK(*peak_frequency(FrequencyResponse::accelerance, {1.0, row.damping_ratio}) ==
              Approx(row.accelerance_peak).epsilon(nine_digits));
    }
}

TEST_CASE("half-power points back to frequency and damping", "[half-power]") {
    // From nine printed digits of f₁ and f₂ the damping ratio keeps an absolute error of about their
    // rounding.
    for (const auto& row : half_power_table) {
        INFO("damping ratio " << row.damping_ratio);
        const FrequencyAndDamping read[] = {
            from_half_power_points(FrequencyResponse::receptance, {row.receptance_low, row.receptance_high}),
            from_half_power_points(FrequencyResponse::mobility, {row.mobility_low, row.mobility_high}),
            from_half_power_points(FrequencyResponse::accelerance,
                                   {row.accelerance_low, row.accelerance_high})};
        for (const auto& oscillator : read) {
            CHECK(oscillator.damping_ratio == Approx(row.damping_ratio).margin(nine_digits));
            CHECK(oscillator.natural_frequency_hz == Approx(1.0).epsilon(2 * nine_digits));
        }
    }
}

TEST_CASE("beyond sin 22.5 degrees there is no half-power bandwidth of displacement or acceleration",
          "[half-power]") {
    CHECK(half_power_damping_limit == Approx(0.38268343236509).epsilon(1e-14));
    CHECK_FALSE(half_power_points(FrequencyResponse::receptance, {1.0, 0.3827}));
    CHECK_FALSE(half_power_points(FrequencyResponse::accelerance, {1.0, 0.3827}));
    CHECK(half_power_points(FrequencyResponse::receptance, {1.0, 0.3826}));
    CHECK(half_power_points(FrequencyResponse::mobility, {1.0, 0.5}));
    CHECK_FALSE(peak_frequency(FrequencyResponse::receptance, {1.0, 0.70711}));
    CHECK(peak_frequency(FrequencyResponse::receptance, {1.0, 0.7071}));
}

TEST_CASE("third-order error of reading damping off the width", "[half-power]") {
    // (f₂ − f₁)/(2 f_peak) = ζ + 2ζ³ + … for displacement and ζ + 4ζ³ + … for acceleration. At ζ = 0.01 the
    // next term (6ζ⁵, 22ζ⁵) is 6e-10 and 2.2e-9. Printed: 0.0100020006 and 0.0100040022.
    const FrequencyAndDamping oscillator{1.0, 0.01};
    const auto width = [&](FrequencyResponse response) {
        const auto points = half_power_points(response, oscillator);
        return (points->high_hz - points->low_hz) / (2.0 * *peak_frequency(response, oscillator));
    };
    CHECK(width(FrequencyResponse::receptance) == Approx(0.0100020006).epsilon(nine_digits));
    CHECK(width(FrequencyResponse::accelerance) == Approx(0.0100040022).epsilon(nine_digits));
}

TEST_CASE("width read n dB below the peak", "[half-power]") {
    // Factors √(10^(n/10) − 1), printed to ten digits.
    CHECK(half_power_width_from(0.9976283451, 3.0) == Approx(1.0).epsilon(1e-10));
    CHECK(half_power_width_from(0.5088471399, 1.0) == Approx(1.0).epsilon(1e-10));
    CHECK(half_power_width_from(1.726578033, 6.0) == Approx(1.0).epsilon(5e-10));
    CHECK(half_power_width_from(3.0, 10.0) == Approx(1.0).epsilon(1e-14));
    CHECK(half_power_width_from(1.0, 10.0 * std::log10(2.0)) == Approx(1.0).epsilon(1e-14));
}

TEST_CASE("decay time, quality factor and loss factor", "[decay]") {
    // T60 = 6.907755279/σ; η f T60 = 2.198806797 for light damping (both from the cross-reference sheet,
    // recomputed).
    const double frequency = 12.0, ratio = 0.004;
    const double time = decay_time_60db(frequency, ratio);
    CHECK(time * decay_rate(frequency, ratio) == Approx(6.907755279).epsilon(1e-10));
    CHECK(loss_factor(ratio) * frequency * time == Approx(2.198806797).epsilon(1e-9));
    CHECK(quality_factor(ratio) * loss_factor(ratio) == Approx(1.0).epsilon(1e-15));
}

TEST_CASE("quality factor from the time to half amplitude", "[decay]") {
    // Q = 4.53 f T_half (seen in a suspension laboratory's notes; exact π/ln 2 = 4.532360142 for light
    // damping, where f is the damped frequency up to ζ²/2).
    const double ratio = 1e-5;
    CHECK(quality_factor(ratio) / cycles_to_fraction(ratio, 0.5) == Approx(4.532360142).epsilon(1e-9));
}

TEST_CASE("best spacing of two extremes for the logarithmic decrement", "[decay]") {
    // Minimum of √(1 + e^(2u))/u at u = 1.1088575529: 2.87827865; amplitude ratio there 0.32993568 (published
    // optimum 0.3299: Tweten, Ballard & Mann, J. Sound Vib. 333 (2014) 2804, from memory; recomputed).
    CHECK(two_extremes_relative_deviation(0.25) == Approx(6.509957).epsilon(1e-7));
    CHECK(two_extremes_relative_deviation(0.5) == Approx(3.856569).epsilon(2e-7));
    CHECK(two_extremes_relative_deviation(1.0) == Approx(2.896387).epsilon(2e-7));
    CHECK(two_extremes_relative_deviation(2.0) == Approx(3.728208).epsilon(2e-7));
    CHECK(two_extremes_relative_deviation(3.0) == Approx(6.703472).epsilon(1e-7));
    const double best = 1.1088575529;
    CHECK(two_extremes_relative_deviation(best) == Approx(2.87827865).epsilon(2e-9));
    CHECK(two_extremes_relative_deviation(best) < two_extremes_relative_deviation(best * 1.001));
    CHECK(two_extremes_relative_deviation(best) < two_extremes_relative_deviation(best / 1.001));
    CHECK(std::exp(-best) == Approx(0.32993568).epsilon(2e-8));
    CHECK(best / (2.0 * std::numbers::pi) == Approx(0.17648016).epsilon(2e-8));
}
