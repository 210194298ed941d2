// Draws many recordings of known truth over a grid of conditions and counts how often the intervals hold it.
#include <fmt/format.h>

#include <atomic>
#include <cmath>
#include <cstdlib>
#include <cstring>
#include <mutex>
#include <numbers>
#include <string>
#include <thread>
#include <vector>

#include "ringwright/distributions.hpp"
#include "ringwright/identify.hpp"
#include "support/simulated_decay.hpp"

using namespace ringwright;
using simulated::Truth;

struct Score {
    double in68 = 0, in95 = 0, in99 = 0, square = 0, sum = 0;
};
struct MethodTally {
    int answered = 0;
    Score frequency, ratio;
};
struct Cell {
    MethodTally method[3];
    int disagree = 0, tested = 0, alarms = 0, components = 0;
    double ms = 0;
};

void count(Score& score, const Estimate& e, double truth, double error) {
    const double t95 = student_t_factor(0.95, e.degrees_of_freedom);
    // other levels from the shape of the 95 % interval: each side scaled by the ratio of t factors
    const auto holds = [&](double level) {
        const double ratio = student_t_factor(level, e.degrees_of_freedom) / t95;
        return truth >= e.value - (e.value - e.interval.low) * ratio &&
               truth <= e.value + (e.interval.high - e.value) * ratio;
    };
    score.in68 += holds(0.683);
    score.in95 += e.interval.low <= truth && truth <= e.interval.high;
    score.in99 += holds(0.99);
    score.square += error * error;
    score.sum += error;
}

std::mutex guard;
int replicates = 200;

void run(const Truth& truth, std::uint64_t seed, Cell& cell) {
    simulated::Deviates deviates(seed);
    auto s = simulated::draw(truth, deviates);
    IdentifyOptions options;
    options.replicates = replicates;
    const auto t0 = std::chrono::steady_clock::now();
    const EventIdentification result = identify_event(s.recording, s.event, options);
    const double ms =
        std::chrono::duration<double, std::milli>(std::chrono::steady_clock::now() - t0).count();
    const std::scoped_lock lock(guard);
    cell.ms += ms;
    const MethodResult* methods[3] = {&result.curve_fit, &result.logarithmic_decrement,
                                      &result.half_power_bandwidth};
    for (int m = 0; m < 3; ++m) {
        if (methods[m]->status != MethodStatus::ok) {
            if (std::getenv("WHY")) fmt::print("{} {}\n", m, methods[m]->reason);
            continue;
        }
        ++cell.method[m].answered;
        const auto& q = methods[m]->quantities;
        if (auto it = q.find(Quantity::natural_frequency); it != q.end())
            count(cell.method[m].frequency, it->second, truth.frequency_hz,
                  std::log(it->second.value / truth.frequency_hz));
        if (auto it = q.find(Quantity::damping_ratio); it != q.end())
            count(cell.method[m].ratio, it->second, truth.damping_ratio,
                  it->second.value - truth.damping_ratio);
    }
    cell.tested += result.agreement.tested;
    cell.disagree += !result.agreement.consistent;
    for (const auto& f : result.findings) {
        if (f.code.starts_with("residuals")) ++cell.alarms;
        if (f.code == "steady_tone" || f.code == "second_mode") ++cell.components;
    }
}

int main(int argc, char** argv) {
    int n = 200;
    std::vector<double> zetas{0.002, 0.02, 0.1, 0.3, 0.7, 1.0, 1.5}, cycles{3, 10, 30, 100}, snrs{20, 40, 60},
        phis{0, 0.8, 0.95};
    Truth base;
    auto list = [](const char* a) {
        std::vector<double> v;
        for (char* p = const_cast<char*>(a); *p;) {
            v.push_back(std::strtod(p, &p));
            if (*p == ',') ++p;
        }
        return v;
    };
    for (int i = 1; i + 1 < argc; i += 2) {
        std::string k = argv[i];
        if (k == "-n")
            n = std::atoi(argv[i + 1]);
        else if (k == "-z")
            zetas = list(argv[i + 1]);
        else if (k == "-c")
            cycles = list(argv[i + 1]);
        else if (k == "-s")
            snrs = list(argv[i + 1]);
        else if (k == "-p")
            phis = list(argv[i + 1]);
        else if (k == "-b")
            replicates = std::atoi(argv[i + 1]);
        else if (k == "-hum")
            base.hum_share = std::atof(argv[i + 1]);
        else if (k == "-bits")
            base.bits = std::atoi(argv[i + 1]);
        else if (k == "-clip")
            base.clip_share = std::atof(argv[i + 1]);
        else if (k == "-jitter")
            base.jitter_share = std::atof(argv[i + 1]);
        else if (k == "-spc")
            base.samples_per_cycle = std::atof(argv[i + 1]);
    }
    fmt::print(
        "zeta  cyc snr phi |CF ans f:68 95 99 z:68 95 99 f/crb z/crb|LD ans f95 z95 z/crb|HP ans f95 z95 "
        "z/crb| dis% alarm comp ms\n");
    for (double z : zetas)
        for (double c : cycles)
            for (double s : snrs)
                for (double p : phis) {
                    Truth t = base;
                    t.damping_ratio = z;
                    t.cycles = c;
                    t.signal_to_noise_db = s;
                    t.noise_correlation = p;
                    Cell cell;
                    std::atomic<int> next{0};
                    auto work = [&] {
                        for (int i; (i = next++) < n;) run(t, 1000 + i, cell);
                    };
                    std::thread a(work);
                    work();
                    a.join();
                    auto b = simulated::cramer_rao(t);
                    auto& cf = cell.method[0];
                    auto& ld = cell.method[1];
                    auto& hp = cell.method[2];
                    auto pc = [](double x, int k) { return k ? 100.0 * x / k : -1.0; };
                    auto rat = [](double x, int k, double c0) { return k ? std::sqrt(x / k) / c0 : -1.0; };
                    fmt::print(
                        "{:5} {:4} {:3} {:4} |{:5.1f} {:5.1f} {:5.1f} {:5.1f} {:5.1f} {:5.1f} {:5.1f} "
                        "{:5.2f} {:5.2f} |{:5.1f} {:5.1f} {:5.1f} {:5.2f} |{:5.1f} {:5.1f} {:5.1f} {:5.2f} | "
                        "{:.1f} {:.2f} {:.2f} {:.1f}\n",
                        z, c, s, p, pc(cf.answered, n), pc(cf.frequency.in68, cf.answered),
                        pc(cf.frequency.in95, cf.answered), pc(cf.frequency.in99, cf.answered),
                        pc(cf.ratio.in68, cf.answered), pc(cf.ratio.in95, cf.answered),
                        pc(cf.ratio.in99, cf.answered),
                        rat(cf.frequency.square, cf.answered, b.log_frequency),
                        rat(cf.ratio.square, cf.answered, b.damping_ratio), pc(ld.answered, n),
                        pc(ld.frequency.in95, ld.answered), pc(ld.ratio.in95, ld.answered),
                        rat(ld.ratio.square, ld.answered, b.damping_ratio), pc(hp.answered, n),
                        pc(hp.frequency.in95, hp.answered), pc(hp.ratio.in95, hp.answered),
                        rat(hp.ratio.square, hp.answered, b.damping_ratio), pc(cell.disagree, cell.tested),
                        double(cell.alarms) / n, double(cell.components) / n, cell.ms / n);
                    std::fflush(stdout);
                }
}
