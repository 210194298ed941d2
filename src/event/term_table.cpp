#include "event/term_table.hpp"

#include <algorithm>
#include <cmath>

namespace ringwright::event_search {
namespace {

constexpr std::size_t ways = 4;

/// z(t+1) = trace·z(t) − determinant·z(t−1).
struct Recurrence {
    double trace = 0.0, determinant = 0.0;
    /// The same over twice the step.
    [[nodiscard]] Recurrence doubled() const {
        return {trace * trace - 2.0 * determinant, determinant * determinant};
    }
};

/// Goes on from the first two values.
void go_on(const Recurrence& one, double* z, std::size_t count) {
    const std::size_t head = std::min(count, 2 * ways);
    for (std::size_t k = 2; k < head; ++k) z[k] = one.trace * z[k - 1] - one.determinant * z[k - 2];
    const Recurrence four = one.doubled().doubled();
    std::size_t k = head;
    for (; k + ways <= count; k += ways)
        for (std::size_t i = 0; i < ways; ++i)
            z[k + i] = four.trace * z[k + i - ways] - four.determinant * z[k + i - 2 * ways];
    for (; k < count; ++k) z[k] = four.trace * z[k - ways] - four.determinant * z[k - 2 * ways];
}

}  // namespace

void TermTable::set(const DecayShape& shape, double first, std::size_t count) {
    if (count == 0) return;
    const DecayTerms one = decay_terms(shape, 1.0);
    const double squared = std::exp(-std::min(2.0 * shape.decay_rate(), 300.0));
    const DecayTerms begin = first == 0.0 ? DecayTerms{1.0, 0.0} : decay_terms(shape, first);
    const DecayTerms next = first == 0.0 ? one : decay_terms(shape, first + 1.0);
    cosine_like_[0] = begin.cosine_like, sine_like_[0] = begin.sine_like;
    if (count > 1) cosine_like_[1] = next.cosine_like, sine_like_[1] = next.sine_like;
    const Recurrence recurrence{2.0 * one.cosine_like, squared};
    go_on(recurrence, cosine_like_.data(), count);
    go_on(recurrence, sine_like_.data(), count);
}

}  // namespace ringwright::event_search
