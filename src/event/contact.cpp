#include "event/contact.hpp"

namespace ringwright::event_search {

/// The decaying motion whose rate this is: with D² + 2sD + ω² = 0 it is −(D + 2s)/ω² of it.
DecayAmplitudes Swing::integral_of(const DecayAmplitudes& amplitudes) const {
    const double s = shape_.decay_rate(), omega = shape_.undamped_angular_frequency;
    const DecayAmplitudes rate = rate_of(shape_, amplitudes);
    const double divisor = -omega * omega;
    return {(rate.cosine_part + 2.0 * s * amplitudes.cosine_part) / divisor,
            (rate.sine_part + 2.0 * s * amplitudes.sine_part) / divisor};
}

Swing::Swing(const DecayFit& fit, const Footing& footing) : shape_(fit.shape), gravity_(footing.gravity) {
    const DecayAmplitudes measured{footing.down * fit.cosine_part, footing.down * fit.sine_part};
    if (footing.quantity == MeasuredQuantity::displacement) {
        way_ = measured, acceleration_ = rate_of(shape_, rate_of(shape_, measured));
    } else if (footing.quantity == MeasuredQuantity::velocity) {
        way_ = integral_of(measured), acceleration_ = rate_of(shape_, measured);
    } else {
        way_ = integral_of(integral_of(measured)), acceleration_ = measured;
    }
}

bool Swing::pushed(double t) const {
    const DecayTerms terms = decay_terms(shape_, t);
    const double omega = shape_.undamped_angular_frequency;
    return acceleration_.at(terms) <= gravity_ && way_.at(terms) >= -gravity_ / (omega * omega);
}

std::optional<double> Swing::last_free(double from, double to) const {
    constexpr double step = 0.5, fine = 0.01;
    double t = to;
    while (t >= from && pushed(t)) t -= step;
    if (t < from) return {};
    double free = t, held = t + step;
    while (held - free > fine) {
        const double middle = 0.5 * (free + held);
        (pushed(middle) ? held : free) = middle;
    }
    return free;
}

}  // namespace ringwright::event_search
