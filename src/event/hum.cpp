#include "event/hum.hpp"

#include <algorithm>
#include <array>
#include <cmath>
#include <complex>
#include <cstddef>
#include <numbers>
#include <numeric>

#include "ringwright/each_index.hpp"

namespace ringwright::event_search {
namespace {

using Complex = std::complex<double>;

constexpr double periods_a_piece = 10.0, highest = 0.45;  // of the rate
constexpr std::size_t fewest_pieces = 8, most_pieces = 400;
constexpr double off_line_hz = 0.5;

/// Pieces of equal length, evenly over the recording.
struct Pieces {
    std::size_t length = 0, step = 0, count = 0;
};

Pieces pieces_of(std::size_t size, double line) {
    Pieces pieces;
    pieces.length = static_cast<std::size_t>(std::lround(periods_a_piece / line));
    if (pieces.length < 16 || size < pieces.length * fewest_pieces / 2) return pieces;
    const std::size_t room = size - pieces.length;
    pieces.step = std::max(pieces.length / 2, room / most_pieces + 1);
    pieces.count = room / pieces.step + 1;
    return pieces;
}

/// Phasors of neighbouring values that turn on together, so that none waits for the one before.
template <std::size_t lanes>
struct Phasors {
    std::array<double, lanes> real{}, imaginary{};

    /// At start, start + turn …; each step is as long as all lanes.
    Phasors(double start, double turn) : step_(std::polar(1.0, turn * static_cast<double>(lanes))) {
        for (std::size_t lane = 0; lane < lanes; ++lane) {
            real[lane] = std::cos(start + turn * static_cast<double>(lane));
            imaginary[lane] = std::sin(start + turn * static_cast<double>(lane));
        }
    }
    void advance() {
        for (std::size_t lane = 0; lane < lanes; ++lane) {
            const double next = real[lane] * step_.real() - imaginary[lane] * step_.imag();
            imaginary[lane] = real[lane] * step_.imag() + imaginary[lane] * step_.real();
            real[lane] = next;
        }
    }

  private:
    Complex step_;
};

/// Amplitude and phase (at the first value of the recording) of a line in one piece, under a Hann window.
Complex line_in(std::span<const double> values, std::size_t first, std::size_t length, double line) {
    constexpr std::size_t lanes = 8;
    const std::span<const double> piece = values.subspan(first, length);
    double mean = 0.0;
    for (const double value : piece) mean += value;
    mean /= static_cast<double>(length);
    const double turn = -2.0 * std::numbers::pi * line;
    Phasors<lanes> phasor(turn * static_cast<double>(first), turn);
    Phasors<lanes> window(0.0, 2.0 * std::numbers::pi / static_cast<double>(length));
    std::array<double, lanes> real{}, imaginary{};
    for (std::size_t k = 0; k < length; k += lanes, phasor.advance(), window.advance())
        for (std::size_t lane = 0; lane < std::min(lanes, length - k); ++lane) {
            const double weighted = (piece[k + lane] - mean) * (1.0 - window.real[lane]);
            real[lane] += weighted * phasor.real[lane];
            imaginary[lane] += weighted * phasor.imaginary[lane];
        }
    const Complex sum(std::accumulate(real.begin(), real.end(), 0.0),
                      std::accumulate(imaginary.begin(), imaginary.end(), 0.0));
    return 2.0 * sum / static_cast<double>(length);
}

std::vector<Complex> line_over(std::span<const double> values, const Pieces& pieces, double line) {
    std::vector<Complex> found(pieces.count);
    for (std::size_t i = 0; i < pieces.count; ++i)
        found[i] = line_in(values, i * pieces.step, pieces.length, line);
    return found;
}

double quantile_of(std::vector<double> values, double share) {
    const auto at =
        values.begin() + static_cast<std::ptrdiff_t>(share * static_cast<double>(values.size() - 1));
    std::nth_element(values.begin(), at, values.end());
    return *at;
}

std::vector<double> moduli(const std::vector<Complex>& lines) {
    std::vector<double> values;
    for (const Complex& line : lines) values.push_back(std::abs(line));
    return values;
}

/// Whether the amplitude is the same in most pieces, early and late alike.
bool steady(const std::vector<double>& amplitudes) {
    constexpr double even = 0.1;
    const auto half = amplitudes.begin() + static_cast<std::ptrdiff_t>(amplitudes.size() / 2);
    const double early = quantile_of({amplitudes.begin(), half}, 0.5);
    const double late = quantile_of({half, amplitudes.end()}, 0.5);
    const double middle = quantile_of(amplitudes, 0.5);
    const double low = quantile_of(amplitudes, 0.3), high = quantile_of(amplitudes, 0.7);
    return std::abs(early - late) < even * middle && high - low < 2.0 * even * middle;
}

/// Frequency offset in cycles a value: the median turn of the phase from piece to piece.
double offset_of(const std::vector<Complex>& lines, const Pieces& pieces) {
    std::vector<double> turns;
    for (std::size_t i = 1; i < lines.size(); ++i)
        turns.push_back(std::arg(lines[i] * std::conj(lines[i - 1])));
    return quantile_of(turns, 0.5) / (2.0 * std::numbers::pi * static_cast<double>(pieces.step));
}

/// The line as it is in most pieces: mean of those whose amplitude is near the median.
struct Line {
    double frequency = 0.0;  ///< cycles a value
    Complex amplitude;
    bool found = false;
};

Complex typical(const std::vector<Complex>& lines, double middle) {
    constexpr double near = 0.15;
    Complex sum = 0.0;
    double count = 0.0;
    for (const Complex& line : lines) {
        if (std::abs(std::abs(line) - middle) > near * middle) continue;
        sum += line, count += 1.0;
    }
    return count > 0.0 ? sum / count : Complex{};
}

Line find_line(std::span<const double> values, double rate_hz, double mains_hz) {
    constexpr double stands_out = 5.0, beside = 0.3, together = 0.9;
    Line line;
    line.frequency = mains_hz / rate_hz;
    if (line.frequency > highest) return line;
    const Pieces pieces = pieces_of(values.size(), line.frequency);
    if (pieces.count < fewest_pieces) return line;
    const std::vector<double> rough = moduli(line_over(values, pieces, line.frequency));
    const double middle = quantile_of(rough, 0.5);
    for (const double side : {1.0 - beside, 1.0 + beside}) {
        const std::vector<double> there = moduli(line_over(values, pieces, side * line.frequency));
        if (middle < stands_out * quantile_of(there, 0.5)) return line;
    }
    if (!steady(rough)) return line;
    // Twice: the first offset is as good as one piece, the second as the phase that is left over.
    for (int round = 0; round < 3; ++round)
        line.frequency += offset_of(line_over(values, pieces, line.frequency), pieces);
    if (std::abs(line.frequency * rate_hz - mains_hz) > off_line_hz) return line;
    const std::vector<Complex> fine = line_over(values, pieces, line.frequency);
    line.amplitude = typical(fine, middle);
    // A phase that wanders leaves little of the mean.
    line.found = std::abs(line.amplitude) > together * middle;
    return line;
}

void subtract(std::vector<double>& values, const Line& line) {
    constexpr std::size_t afresh = 4096;  // values after which the phase is computed anew
    const double turn = 2.0 * std::numbers::pi * line.frequency;
    const Complex step = std::polar(1.0, turn);
    Complex phasor;
    for (std::size_t k = 0; k < values.size(); ++k, phasor *= step) {
        if (k % afresh == 0) phasor = line.amplitude * std::polar(1.0, turn * static_cast<double>(k));
        values[k] -= phasor.real();
    }
}

}  // namespace

std::optional<Cleaned> without_hum(std::span<const double> values, double rate_hz, unsigned threads) {
    constexpr std::array mains_hz{50.0, 60.0};
    std::array<Line, mains_hz.size()> lines;
    for_each_index(lines.size(), threads,
                   [&](std::size_t i, unsigned) { lines[i] = find_line(values, rate_hz, mains_hz[i]); });
    std::optional<Cleaned> cleaned;
    for (const Line& line : lines) {
        if (!line.found) continue;
        if (!cleaned) cleaned = Cleaned{{values.begin(), values.end()}, {}};
        subtract(cleaned->values, line);
        cleaned->lines_hz.push_back(line.frequency * rate_hz);
    }
    return cleaned;
}

}  // namespace ringwright::event_search
