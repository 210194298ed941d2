// Draws many recordings of known truth over a grid of conditions and counts how often the intervals hold it.
#include <fmt/format.h>

#include <atomic>
#include <cmath>
#include <cstdlib>
#include <cstring>
#include <numbers>
#include <string>
#include <thread>
#include <vector>

#include "identify/curve_fit.hpp"
#include "identify/decay_quantities.hpp"
#include "ringwright/distributions.hpp"
#include "support/simulated_decay.hpp"

using namespace ringwright;
using simulated::Truth;

struct Outcome {
    bool answered = false;
    double f_error = 0, z_error = 0, f_value = 0, z_value = 0;
    std::array<bool, 3> f_in{}, z_in{};
    std::array<bool, 3> z_has{}, f_has{};
    bool plain_f = false, plain_z = false;
    double ms = 0;
    long order = 0;
    std::size_t components = 0;
};

Outcome run(const Truth& truth, std::uint64_t seed) {
    simulated::Deviates deviates(seed);
    auto s = simulated::draw(truth, deviates);
    Outcome o;
    identify::CurveFitOptions options;
    const auto t0 = std::chrono::steady_clock::now();
    auto fit = identify::fit_decay(s.recording, s.event, options);
    if (fit.valid) {
        o.answered = true;
        int i = 0;
        o.order = fit.noise.noise.order();
        o.components = fit.fit.model.tones.size() + fit.fit.model.oscillators.size() - 1;
        for (double level : {0.683, 0.95, 0.99}) {
            auto q = identify::decay_quantities(fit, 0, level);
            if (auto it = q.find(Quantity::natural_frequency); it != q.end()) {
                o.f_has[i] = true;
                o.f_in[i] = it->second.interval.low <= truth.frequency_hz && truth.frequency_hz <= it->second.interval.high;
            }
            if (auto it = q.find(Quantity::damping_ratio); it != q.end()) {
                o.z_has[i] = true;
                o.z_in[i] = it->second.interval.low <= truth.damping_ratio && truth.damping_ratio <= it->second.interval.high;
            }
            ++i;
        }
        o.f_error = std::log(fit.oscillator().angular_frequency() / (2 * std::numbers::pi * truth.frequency_hz));
        o.z_error = fit.oscillator().damping_ratio() - truth.damping_ratio;
    }
    o.ms = std::chrono::duration<double, std::milli>(std::chrono::steady_clock::now() - t0).count();
    return o;
}

int main(int argc, char** argv) {
    int n = 200;
    std::vector<double> zetas{0.002, 0.02, 0.1, 0.3, 0.7, 1.0, 1.5}, cycles{3, 10, 30, 100}, snrs{20, 40, 60}, phis{0, 0.8, 0.95};
    Truth base;
    auto list = [](const char* a) { std::vector<double> v; for (char* p = const_cast<char*>(a); *p;) { v.push_back(std::strtod(p, &p)); if (*p == ',') ++p; } return v; };
    for (int i = 1; i + 1 < argc; i += 2) {
        std::string k = argv[i];
        if (k == "-n") n = std::atoi(argv[i + 1]);
        else if (k == "-z") zetas = list(argv[i + 1]);
        else if (k == "-c") cycles = list(argv[i + 1]);
        else if (k == "-s") snrs = list(argv[i + 1]);
        else if (k == "-p") phis = list(argv[i + 1]);
        else if (k == "-hum") base.hum_share = std::atof(argv[i + 1]);
        else if (k == "-bits") base.bits = std::atoi(argv[i + 1]);
        else if (k == "-clip") base.clip_share = std::atof(argv[i + 1]);
        else if (k == "-jitter") base.jitter_share = std::atof(argv[i + 1]);
        else if (k == "-spc") base.samples_per_cycle = std::atof(argv[i + 1]);
    }
    fmt::print("zeta cyc snr phi | ans  f68 f95 f99 | z68 z95 z99 | f/crb z/crb fbias zbias | ms order comps\n");
    for (double z : zetas) for (double c : cycles) for (double s : snrs) for (double p : phis) {
        Truth t = base; t.damping_ratio = z; t.cycles = c; t.signal_to_noise_db = s; t.noise_correlation = p;
        std::vector<Outcome> out(n);
        std::atomic<int> next{0};
        auto work = [&] { for (int i; (i = next++) < n;) out[i] = run(t, 1000 + i); };
        std::thread a(work); work(); a.join();
        double ans = 0, f[3]{}, zz[3]{}, fe = 0, ze = 0, fb = 0, zb = 0, ms = 0, ord = 0, comps = 0;
        for (auto& o : out) {
            ms += o.ms / n;
            if (!o.answered) continue;
            ans++; ord += o.order; comps += o.components;
            for (int i = 0; i < 3; ++i) { f[i] += !o.f_has[i] || o.f_in[i]; zz[i] += !o.z_has[i] || o.z_in[i]; }
            fe += o.f_error * o.f_error; ze += o.z_error * o.z_error; fb += o.f_error; zb += o.z_error;
        }
        auto b = simulated::cramer_rao(t);
        fmt::print("{:5} {:4} {:3} {:4} | {:4.2f} {:5.1f} {:5.1f} {:5.1f} | {:5.1f} {:5.1f} {:5.1f} | {:5.2f} {:5.2f} {:5.2f} {:5.2f} | {:.1f} {:.1f} {:.2f}\n", z, c, s, p, ans / n,
                   100 * f[0] / ans, 100 * f[1] / ans, 100 * f[2] / ans, 100 * zz[0] / ans, 100 * zz[1] / ans, 100 * zz[2] / ans,
                   std::sqrt(fe / ans) / b.log_frequency, std::sqrt(ze / ans) / b.damping_ratio, fb / ans / b.log_frequency, zb / ans / b.damping_ratio, ms, ord / ans, comps / ans);
        std::fflush(stdout);
    }
}
