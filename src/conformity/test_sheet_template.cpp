#include "ringwright/test_sheet.hpp"

namespace ringwright {

std::string_view test_sheet_template() {
    return R"(# Test sheet: what is known of a test before it is run. Everything may be left out; an option on the
# command line wins over the sheet. Lines that begin with # are comments.
# A value is a number with a unit in quotes. "3.20(1) kg" states a standard uncertainty in the last digits,
# "3.2 ± 0.1 kg" (or +/-) a tolerance.

[article]
type = "sash damper S2"            # what kind of thing; charts and capability go by it
serial = "0417"                    # which one; its history goes by it
mass = "3.20(1) kg"                # what moves; for torsion instead: inertia = "0.012(1) kg m2"
# spring_mass = "0.15 kg"          # of a heavy spring; a third of it moves with the mass
# note = "returned by the laboratory on the second floor"

[test]
kind = "pluck"                     # pluck (pulled and released), tap (struck), drop (dropped or lowered)
operator = "bench 3, day shift"    # the gauge study goes by it
date = 2031-04-02
# gravity = "9.8128(2) m/s2"       # of the place, for drops; else 9.80665 m/s2
# note = "new oil"

[recording]
quantity = "displacement"          # displacement, velocity, acceleration, angle, angular-velocity,
                                   # angular-acceleration
unit = "mm"                        # where the recording does not say it
# channel = "laser"                # name or number (the first is 1)
# time_column = "none"             # name, number, or "none" where the recording has no times
# rate = "2000 Hz"                 # where the recording has no times
# sensitivity = "100 mV/g"         # where it was recorded in volts
# full_scale = "5 V"               # of a sound file: volts at digital full scale
sensor = "laser L-07"
sensor_calibrated = 2031-01-15
sensor_due = 2032-01-15

[limits]
decision_rule = "guarded acceptance"   # simple acceptance: the limits themselves decide
                                       # guarded acceptance: conforms only when inside them by the guard band
                                       # guarded rejection: fails only when outside them by the guard band
# guard_band = 1.0                     # as a multiple of the expanded uncertainty U = k u
# coverage_factor = 2.0                # k; left out: for a coverage of 95.45 %, so 2.00 or more
damping_ratio = { min = 0.22, max = 0.34 }
# natural_frequency = { min = "4.0 Hz" }
# stiffness = { nominal = "3.1 N/mm", tolerance = "8 %" }
# damping_coefficient = { max = "60 N s/m" }
# Also: damped_frequency, logarithmic_decrement, loss_factor, quality_factor, decay_rate, slow_decay_rate, mass,
# inertia, static_deflection, friction_force, compression_damping, rebound_damping, quadratic_damping,
# cubic_stiffness, drop_height, contact_velocity

# Recordings of the test, relative to the folder of this sheet, each with what was added to the article's mass:
# [[recordings]]
# file = "sash-0417-1.csv"
# [[recordings]]
# file = "sash-0417-2.csv"
# added_mass = "0.500(1) kg"
)";
}

}  // namespace ringwright
