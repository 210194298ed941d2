#include "ringwright/power_spectrum.hpp"

#include <fftw3.h>

#include <algorithm>
#include <map>
#include <memory>
#include <mutex>
#include <new>
#include <type_traits>

#include "value/transform_plans.hpp"

namespace ringwright {
namespace {

struct FreeFftw {
    void operator()(void* memory) const { fftw_free(memory); }
};

/// What a transform reads and writes, aligned as FFTW wants it: plans made for one pair serve any other.
struct Buffers {
    explicit Buffers(std::size_t length)
        : input(fftw_alloc_real(length)), output(fftw_alloc_complex(length / 2 + 1)) {
        if (!input || !output) throw std::bad_alloc();
    }
    std::unique_ptr<double, FreeFftw> input;
    std::unique_ptr<fftw_complex, FreeFftw> output;
};

struct DestroyPlan {
    void operator()(fftw_plan plan) const { fftw_destroy_plan(plan); }
};
using Plan = std::unique_ptr<std::remove_pointer_t<fftw_plan>, DestroyPlan>;

/// Making a plan touches what all plans share, and takes longer than a short transform.
fftw_plan plan_for(std::size_t length, const Buffers& buffers) {
    static std::mutex mutex;
    static std::map<std::size_t, Plan> plans;
    const std::scoped_lock lock(mutex);
    Plan& plan = plans[length];
    if (!plan) {
        // A processor that lacks what the decision rests on refuses it, and FFTW plans as if there were none.
        if (const char* kept = kept_decision(length)) fftw_import_wisdom_from_string(kept);
        plan.reset(fftw_plan_dft_r2c_1d(static_cast<int>(length), buffers.input.get(), buffers.output.get(),
                                        FFTW_ESTIMATE));
    }
    return plan.get();
}

}  // namespace

std::vector<double> padded_power_spectrum(std::span<const double> values, double padding) {
    std::size_t length = 16;
    while (static_cast<double>(length) < padding * static_cast<double>(values.size())) length *= 2;
    const Buffers buffers(length);
    const fftw_plan plan = plan_for(length, buffers);
    std::fill(std::copy(values.begin(), values.end(), buffers.input.get()), buffers.input.get() + length,
              0.0);
    fftw_execute_dft_r2c(plan, buffers.input.get(), buffers.output.get());
    std::vector<double> power(length / 2 + 1);
    for (std::size_t k = 0; k < power.size(); ++k) {
        const fftw_complex& line = buffers.output.get()[k];
        power[k] = line[0] * line[0] + line[1] * line[1];
    }
    return power;
}

}  // namespace ringwright
