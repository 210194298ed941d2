#include "recording/csv_piece.hpp"

#include <cmath>

namespace ringwright {
namespace {

/// Row numbers of the kept rows.
std::vector<std::size_t> kept_rows(const Rows& rows) {
    std::vector<std::size_t> kept;
    kept.reserve(rows.values.size());
    for (std::size_t r = 0; r < rows.values.size(); ++r)
        if (!std::isnan(rows.values[r])) kept.push_back(r);
    return kept;
}

Rows counts_of(const Rows& rows) {
    Rows counts;
    counts.lines = rows.lines;
    counts.empty = rows.empty;
    counts.not_a_number = rows.not_a_number;
    counts.overflow = rows.overflow;
    counts.text = rows.text;
    counts.unreadable_time = rows.unreadable_time;
    counts.unreadable_row = rows.unreadable_row;
    counts.first_text = rows.first_text;
    return counts;
}

template <typename TimeOf>
LostTime lost_time(std::size_t count, double usual, double rounding, TimeOf time_of) {
    LostTime lost;
    for (std::size_t i = 1; i < count; ++i) {
        const double from = time_of(i - 1), to = time_of(i);
        if (!is_gap(from, to, usual, rounding)) continue;
        lost.before.push_back(i);
        add_gap(lost.steps, from, to, usual);
    }
    return lost;
}

void digest_times(const Rows& rows, const std::vector<std::size_t>& kept, const TimeScale& scale,
                  CsvPiece& piece) {
    const std::vector<double>& t = rows.times;
    piece.course = course_of(t);
    for (std::size_t i = 1; i < t.size(); ++i) add_scatter(piece.scatter, t[i - 1], t[i], scale.usual_s);
    piece.median_step_s = median_forward_step(t);
    if (kept.empty()) return;
    piece.first_s = t[kept.front()];
    piece.last_s = t[kept.back()];
    piece.by_stamp =
        lost_time(kept.size(), scale.usual_s, scale.rounding_s, [&](std::size_t i) { return t[kept[i]]; });
}

SignalDigest digest_of_kept(const Rows& rows, const std::vector<std::size_t>& kept, double factor) {
    std::vector<double> samples;
    samples.reserve(kept.size());
    for (const std::size_t r : kept)
        samples.push_back(factor == 1.0 ? rows.values[r] : rows.values[r] * factor);
    return digest_of(samples);
}

}  // namespace

void to_seconds(std::vector<double>& times, const TimeScale& scale) {
    if (scale.without_date) unwrap_midnight(times);
    if (scale.zero != 0.0)
        for (double& t : times) t -= scale.zero;
    if (scale.number) scale_times(times, scale.seconds_per_unit);
}

void digest_rows(Rows& rows, const TimeScale& scale, double factor, CsvPiece& piece) {
    piece.absences = counts_of(rows);
    const std::vector<std::size_t> kept = kept_rows(rows);
    piece.rows = rows.values.size();
    piece.kept = kept.size();
    piece.leading = kept.empty() ? piece.rows : kept.front();
    piece.trailing = kept.empty() ? 0 : piece.rows - 1 - kept.back();
    piece.by_row =
        lost_time(kept.size(), 1.0, 0.0, [&](std::size_t i) { return static_cast<double>(kept[i]); });
    if (!rows.times.empty()) {
        piece.last_raw_s = rows.times.back();
        to_seconds(rows.times, scale);
        digest_times(rows, kept, scale, piece);
    }
    piece.digest = digest_of_kept(rows, kept, factor);
}

void shift(CsvPiece& piece, double seconds) {
    piece.days_s += seconds;
    for (double* time : {&piece.first_s, &piece.last_s, &piece.course.first, &piece.course.last,
                         &piece.by_stamp.steps.longest_at_s})
        *time += seconds;
    for (auto* hull : {&piece.course.upper, &piece.course.lower})
        for (StampCourse::Corner& corner : *hull) corner.time += seconds;
}

}  // namespace ringwright
