// What the program makes of recordings as they come from the bench: draws many of each kind, of known truth,
// hands each to the whole of identify as the text of a file, and counts. Prints a table in Markdown.
#include <fmt/format.h>

#include <CLI/CLI.hpp>
#include <algorithm>
#include <cmath>
#include <cstdio>
#include <fstream>
#include <map>
#include <mutex>
#include <string>
#include <utility>
#include <vector>

#include "bench/for_each_recording.hpp"
#include "support/bench_judgement.hpp"
#include "support/bench_kinds.hpp"

namespace {

using simulated::BenchKind;
using simulated::BenchRecording;
using simulated::BenchTruth;
using simulated::Miss;
using simulated::Outcome;

struct Run {
    int recordings = 100;
    std::uint64_t seed = 1;
    std::string only, folder;
    bool list = false, findings = false;
    int replicates = 0;
};

/// Hits of one quantity over the recordings of a kind.
struct Score {
    int count = 0, held = 0, beyond_tolerance = 0, beyond_four = 0;
    double worst = 0.0;

    void add(const std::vector<Miss>& misses, double tolerance) {
        for (const Miss& miss : misses) {
            ++count;
            held += miss.held;
            beyond_tolerance += std::abs(miss.relative) > tolerance;
            beyond_four += miss.beyond_four;
            worst = std::max(worst, std::abs(miss.relative));
        }
    }
    [[nodiscard]] std::string held_percent() const {
        return count > 0 ? fmt::format("{:.1f}", 100.0 * held / count) : "–";
    }
};

struct Tally {
    int answered = 0, wrong_count = 0, misnamed = 0, without_frequency = 0, without_second = 0,
        without_coefficient = 0;
    Score frequency, damping;
    std::map<std::string, int> findings;
};

bool is_off(const std::vector<Miss>& misses, double tolerance) {
    return std::any_of(misses.begin(), misses.end(), [&](const Miss& miss) {
        return miss.beyond_four || std::abs(miss.relative) > tolerance;
    });
}

/// A line for whoever looks for the cause: everything that went wrong with one recording.
std::string shortcomings(const Outcome& outcome, const BenchTruth& truth,
                         const simulated::Tolerance& tolerance) {
    std::string text;
    if (outcome.events != truth.events) text += fmt::format(" {} events;", outcome.events);
    if (!truth.mode) return text;
    if (!outcome.answered) return text + " not answered;";
    if (!outcome.named) text += fmt::format(" called {};", outcome.model);
    if (outcome.without_frequency) text += " no frequency;";
    if (outcome.coefficient_missing) text += " coefficient missing;";
    if (!outcome.second_listed) text += " second mode not listed;";
    const auto add = [&](const char* what, const std::vector<Miss>& misses, double most) {
        if (!is_off(misses, most)) return;
        text += fmt::format(" {}", what);
        for (const Miss& miss : misses)
            text += fmt::format(" {:+.2f} %{}{}", 100.0 * miss.relative, miss.held ? "" : " not held",
                                miss.beyond_four ? ", beyond 4 u" : "");
        text += ";";
    };
    add("frequency", outcome.frequency, tolerance.frequency);
    add("damping", outcome.damping, tolerance.damping);
    return text;
}

void add(Tally& tally, const Outcome& outcome, const BenchTruth& truth,
         const simulated::Tolerance& tolerance) {
    tally.wrong_count += outcome.events != truth.events;
    tally.answered += outcome.answered;
    for (const std::string& code : outcome.findings) ++tally.findings[code];
    if (!outcome.answered || !truth.mode) return;
    tally.misnamed += !outcome.named;
    tally.without_frequency += outcome.without_frequency;
    tally.without_second += !outcome.second_listed;
    tally.without_coefficient += outcome.coefficient_missing;
    tally.frequency.add(outcome.frequency, tolerance.frequency);
    tally.damping.add(outcome.damping, tolerance.damping);
}

void write_down(const BenchRecording& made, const Run& run, std::uint64_t seed) {
    if (run.folder.empty()) return;
    std::ofstream(fmt::format("{}/{}.csv", run.folder, seed), std::ios::binary) << made.csv;
}

void list(const BenchKind& kind, std::uint64_t seed, const BenchTruth& truth, const std::string& wrong) {
    const auto mode = truth.mode.value_or(simulator::Mode{0.0, 0.0});
    fmt::print("{} {} ({:.4g} Hz, ζ {:.4g}, {}):{}\n", kind.name, seed, mode.frequency_hz, mode.damping_ratio,
               truth.conditions, wrong);
}

Tally run_kind(const BenchKind& kind, std::uint64_t first_seed, const Run& run) {
    Tally tally;
    std::mutex guard;
    simulated::for_each_recording(run.recordings, [&](int i) {
        const std::uint64_t seed = first_seed + static_cast<std::uint64_t>(i);
        const BenchRecording made = kind.draw(seed);
        write_down(made, run, seed);
        const Outcome outcome = simulated::judge(made, run.replicates);
        const std::string wrong = shortcomings(outcome, made.truth, kind.tolerance);
        const std::scoped_lock lock(guard);
        add(tally, outcome, made.truth, kind.tolerance);
        if (run.list && !wrong.empty()) list(kind, seed, made.truth, wrong);
    });
    return tally;
}

std::string shortcomings_of(const Tally& tally) {
    const std::pair<int, const char*> counts[] = {
        {tally.wrong_count, "with a wrong number of events"},
        {tally.misnamed, "called by another law"},
        {tally.without_frequency, "without a frequency"},
        {tally.without_second, "without the second mode"},
        {tally.without_coefficient, "without a coefficient"},
        {tally.frequency.beyond_tolerance, "f beyond the tolerance"},
        {tally.damping.beyond_tolerance, "of damping beyond the tolerance"},
    };
    std::string text;
    for (const auto& [count, what] : counts)
        if (count > 0) text += fmt::format("{}{} {}", text.empty() ? "" : "; ", count, what);
    return text.empty() ? "–" : text;
}

void print_row(const BenchKind& kind, const Tally& tally) {
    fmt::print("| {} | {} | {}, {} | {:.2g}, {:.2g} | {} f, {} ζ | {} |\n", kind.name, tally.answered,
               tally.frequency.held_percent(), tally.damping.held_percent(), 100.0 * tally.frequency.worst,
               100.0 * tally.damping.worst, tally.frequency.beyond_four, tally.damping.beyond_four,
               shortcomings_of(tally));
    std::fflush(stdout);
}

}  // namespace

int main(int argc, char** argv) {
    CLI::App app{"What becomes of recordings as they come from the bench, kind by kind, of known truth."};
    Run run;
    app.add_option("--recordings", run.recordings, "Of each kind")->capture_default_str();
    app.add_option("--seed", run.seed, "Of the first recording; each kind has a million of its own")
        ->capture_default_str();
    app.add_option("--kind", run.only, "Only kinds whose names begin so");
    app.add_option("--replicates", run.replicates, "Of the bootstrap; 0: curve fit only")
        ->capture_default_str();
    app.add_flag("--list", run.list, "Each recording with which something went wrong, with its seed");
    app.add_flag("--findings", run.findings, "How often each finding was given");
    app.add_option("--write", run.folder, "Keep the recordings in this folder, as SEED.csv")
        ->check(CLI::ExistingDirectory);
    CLI11_PARSE(app, argc, argv);
    fmt::print(
        "| kind | answered of {} | 95 % intervals hold f, ζ / % | worst f, ζ off / % | "
        "beyond 4 | what falls short |\n|---|---|---|---|---|---|\n",
        run.recordings);
    std::uint64_t seed = run.seed;
    for (const BenchKind& kind : simulated::bench_kinds()) {
        if (kind.name.starts_with(run.only)) {
            const Tally tally = run_kind(kind, seed, run);
            print_row(kind, tally);
            if (run.findings)
                for (const auto& [code, count] : tally.findings) fmt::print("    {} {}\n", code, count);
        }
        seed += 1'000'000;
    }
    return 0;
}
