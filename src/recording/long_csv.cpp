#include "recording/long_csv.hpp"

#include <algorithm>
#include <atomic>
#include <cmath>
#include <optional>
#include <utility>

#include "recording/csv_open.hpp"
#include "recording/csv_piece.hpp"
#include "recording/health.hpp"
#include "recording/in_pieces.hpp"
#include "recording/signal_digest.hpp"
#include "ringwright/each_index.hpp"
#include "ringwright/error.hpp"

namespace ringwright {
namespace {

constexpr std::size_t piece_bytes = std::size_t{1} << 20;
constexpr double day_s = 86400.0;

class LongCsv final : public LongRecording {
  public:
    LongCsv(std::shared_ptr<const InputBytes> input, const ReadOptions& options, Recording facts,
            const LongLimits& limits)
        : input_(std::move(input)), options_(options) {
        facts_ = std::move(facts);
        limits_ = limits;
    }

    /// False when the table has to be read whole.
    [[nodiscard]] bool open() {
        chosen_.emplace(choose_columns(input_->view(), options_, facts_));
        if (!chosen_->open.decoded.owned.empty()) return false;
        scale_ = scale_of(*chosen_, options_);
        if (!find_time_scale()) return false;
        digest_all();
        place_pieces();
        return place_in_time() && finish();
    }

    [[nodiscard]] Recording stretch(SampleRange range) const override {
        Recording part = like_facts(range);
        const std::size_t first = piece_of(range.begin), last = piece_of(range.end - 1);
        const bool stamped = needs_times(first, last);
        part.samples.resize(range.end - range.begin);
        if (stamped) part.clock.times_s.resize(range.end - range.begin);
        std::vector<Rows> buffers(threads_for(0));
        for_each_index(last - first + 1, threads_for(0), [&](std::size_t i, unsigned thread) {
            copy_piece(pieces_[first + i], buffers[thread], range, part);
        });
        if (stamped)
            part.clock.start_s = part.clock.times_s.front();
        else
            part.clock.start_s = row_time(row_of(range.begin, first));
        return part;
    }

    [[nodiscard]] std::size_t sample_at(double time_s) const override {
        if (equal_steps_) return LongRecording::sample_at(time_s);
        const auto piece = std::partition_point(pieces_.begin(), pieces_.end(), [&](const CsvPiece& p) {
            return p.kept == 0 || p.last_s < time_s;
        });
        if (piece == pieces_.end()) return size_;
        const Recording part = stretch({piece->kept_begin, piece->kept_begin + piece->kept});
        std::size_t i = 0;
        while (i + 1 < part.size() && part.clock.time_of(i) < time_s) ++i;
        return piece->kept_begin + i;
    }

  private:
    [[nodiscard]] const TimeChoice& time() const { return chosen_->time; }
    [[nodiscard]] std::string_view rows() const { return chosen_->open.rows(); }

    [[nodiscard]] std::size_t line_start(std::size_t at) const {
        if (at == 0 || at >= rows().size()) return std::min(at, rows().size());
        const std::size_t end = rows().find(chosen_->open.table.end_of_line, at - 1);
        return end == std::string_view::npos ? rows().size() : end + 1;
    }

    [[nodiscard]] std::string_view text_of(const CsvPiece& piece) const {
        return rows().substr(piece.begin, piece.end - piece.begin);
    }

    /// From the first piece: where the time begins, and about how long a step is.
    bool find_time_scale() {
        times_.timed = chosen_->plan.time_source != TimeSource::none;
        if (!times_.timed) return true;
        times_.number = time().source == TimeSource::number;
        times_.without_date = time().source == TimeSource::stamp && time().without_date;
        times_.seconds_per_unit = time().seconds_per_unit;
        times_.rounding_s = time().rounding_s;
        Rows first;
        read_piece(rows().substr(0, line_start(piece_bytes)), chosen_->plan, first);
        if (first.times.size() < 3 || std::isnan(first.times.front())) return false;
        if (time().from_zero) times_.zero = first.times.front();
        to_seconds(first.times, times_);
        times_.usual_s = median_forward_step(first.times);
        return times_.usual_s > 0.0;
    }

    void digest_all() {
        pieces_.resize((rows().size() + piece_bytes - 1) / piece_bytes);
        std::vector<Rows> buffers(threads_for(0));
        std::atomic<bool> hopeless{false};
        for_each_index(pieces_.size(), threads_for(0), [&](std::size_t i, unsigned thread) {
            if (hopeless) return;
            CsvPiece& piece = pieces_[i];
            piece.begin = line_start(i * piece_bytes);
            piece.end = line_start((i + 1) * piece_bytes);
            read_piece(text_of(piece), chosen_->plan, buffers[thread]);
            digest_rows(buffers[thread], times_, scale_.factor, piece);
            if (times_.timed && piece.rows > 0 && !piece.course.forward) hopeless = true;
            if (thread == 0 && options_.progress)
                options_.progress(static_cast<double>(i + 1) / static_cast<double>(pieces_.size()));
        });
        forward_ = !hopeless;
    }

    void place_pieces() {
        std::erase_if(pieces_,
                      [](const CsvPiece& piece) { return piece.rows == 0 && piece.absences.lines == 0; });
        for (CsvPiece& piece : pieces_) {
            piece.row_begin = row_count_;
            piece.kept_begin = size_;
            row_count_ += piece.rows;
            size_ += piece.kept;
            merge_counts(absences_, piece.absences);
        }
    }

    bool place_in_time() {
        if (!forward_ || size_ < 16) return false;
        report_absences(absences_, row_count_, chosen_->open.table, facts_.origin.channel, facts_.findings);
        if (!times_.timed) {
            row_clock_.sample_rate_hz = rate_without_times(chosen_->open, options_, facts_);
            return true;
        }
        return steady_or_stamped();
    }

    /// One steady clock, else the stamps as they are, which then only have to go forward.
    bool steady_or_stamped() {
        StampCourse course;
        double days = 0.0, last_raw = 0.0;
        for (CsvPiece& piece : pieces_) {
            if (piece.rows == 0) continue;
            const double first_raw = piece.course.first + times_.zero;
            if (times_.without_date && course.count > 0 && first_raw < last_raw - 0.5 * day_s) days += day_s;
            const double wraps =
                times_.without_date ? std::round((piece.course.last + times_.zero - piece.last_raw_s) / day_s)
                                    : 0.0;
            shift(piece, days);
            days += wraps * day_s;
            last_raw = piece.last_raw_s;
            append(course, piece.course);
        }
        if (!course.forward) return false;
        const auto clock = steady_clock(course, times_.rounding_s);
        stamped_ = !clock;
        if (clock) row_clock_ = *clock;
        return true;
    }

    /// Row number → time, of a table whose clock is steady.
    [[nodiscard]] double row_time(std::size_t row) const { return row_clock_.time_of(row); }

    bool finish() {
        double usual = 1.0 / row_clock_.sample_rate_hz;
        if (stamped_) {
            usual = median_step();
            report_jitter(scatter(usual), usual, times_.rounding_s, facts_.findings);
        } else {
            time_kept_rows();
        }
        facts_.clock.sample_rate_hz = 1.0 / usual;
        if (!stamped_) facts_.clock.sample_rate_hz = row_clock_.sample_rate_hz;
        gather_gaps(usual);
        take_scale(scale_, facts_);
        gather_health();
        return true;
    }

    [[nodiscard]] double median_step() const {
        std::vector<double> medians;
        for (const CsvPiece& piece : pieces_)
            if (piece.rows > 2) medians.push_back(piece.median_step_s);
        const auto middle = medians.begin() + static_cast<std::ptrdiff_t>(medians.size() / 2);
        std::nth_element(medians.begin(), middle, medians.end());
        return *middle;
    }

    [[nodiscard]] StepCourse scatter(double usual) const {
        StepCourse steps;
        const CsvPiece* before = nullptr;
        for (const CsvPiece& piece : pieces_) {
            if (piece.rows == 0) continue;
            if (before != nullptr) add_scatter(steps, before->course.last, piece.course.first, usual);
            ringwright::append(steps, piece.scatter);
            before = &piece;
        }
        return steps;
    }

    /// On a steady clock the row says the time better than its stamp.
    void time_kept_rows() {
        for (CsvPiece& piece : pieces_) {
            if (piece.kept == 0) continue;
            piece.first_s = row_time(piece.row_begin + piece.leading);
            piece.last_s = row_time(piece.row_begin + piece.rows - 1 - piece.trailing);
        }
    }

    void gather_gaps(double usual) {
        StepCourse steps;
        const CsvPiece* before = nullptr;
        const double rounding = stamped_ ? times_.rounding_s : 0.0;
        for (const CsvPiece& piece : pieces_) {
            if (piece.kept == 0) continue;
            if (before != nullptr && is_gap(before->last_s, piece.first_s, usual, rounding)) {
                add_gap(steps, before->last_s, piece.first_s, usual);
                facts_.gaps.push_back({piece.kept_begin - 1, piece.kept_begin});
            }
            add_gaps_within(piece, usual, steps);
            before = &piece;
        }
        equal_steps_ = !stamped_ && facts_.gaps.empty();
        report_gaps(steps, facts_.findings);
        const auto has_samples = [](const CsvPiece& piece) { return piece.kept > 0; };
        facts_.clock.start_s = std::ranges::find_if(pieces_, has_samples)->first_s;
        last_s_ = before->last_s;
    }

    void add_gaps_within(const CsvPiece& piece, double usual, StepCourse& steps) {
        const LostTime& lost = stamped_ ? piece.by_stamp : piece.by_row;
        StepCourse within = lost.steps;
        if (!stamped_) {  // in rows
            within.lost_s *= usual;
            within.longest_s *= usual;
            within.longest_at_s = row_time(piece.row_begin) + within.longest_at_s * usual;
        }
        ringwright::append(steps, within);
        for (const std::size_t i : lost.before)
            facts_.gaps.push_back({piece.kept_begin + i - 1, piece.kept_begin + i});
    }

    void gather_health() {
        std::vector<DigestedPart> parts;
        SignalDigest whole;
        overview_ = like_facts({0, 0});
        for (CsvPiece& piece : pieces_) {
            if (piece.kept == 0) continue;
            append(whole, piece.digest);
            add_overview(piece.digest, piece.first_s, piece.last_s, overview_);
            piece.digest.blocks = {};
            parts.push_back({piece.kept_begin, std::move(piece.digest)});
        }
        overview_.clock.start_s = overview_.clock.times_s.front();
        if (whole.low != whole.high) facts_.resolution = whole.smallest_step;
        facts_.clipped = ringwright::clipped_runs(*this, parts, whole);
        const double clipped_s =
            facts_.clipped.empty()
                ? 0.0
                : stretch({facts_.clipped.front().begin, facts_.clipped.front().begin + 1}).clock.start_s;
        report_health(facts_, whole.low, whole.high, clipped_s);
    }

    [[nodiscard]] std::size_t piece_of(std::size_t sample) const {
        const auto behind = std::partition_point(pieces_.begin(), pieces_.end(), [&](const CsvPiece& piece) {
            return piece.kept_begin + piece.kept <= sample;
        });
        return static_cast<std::size_t>(behind - pieces_.begin());
    }

    /// Whether some of the rows from the first to the last sample of these pieces lack a value, or are not on
    /// a steady clock.
    [[nodiscard]] bool needs_times(std::size_t first, std::size_t last) const {
        if (stamped_) return true;
        if (equal_steps_) return false;
        for (std::size_t i = first; i <= last; ++i)
            if (pieces_[i].kept != pieces_[i].rows) return true;
        return false;
    }

    /// Of a sample in a piece in which every row up to it has a value, but for those at its start.
    [[nodiscard]] std::size_t row_of(std::size_t sample, std::size_t piece) const {
        return pieces_[piece].row_begin + pieces_[piece].leading + sample - pieces_[piece].kept_begin;
    }

    void copy_piece(const CsvPiece& piece, Rows& buffer, SampleRange range, Recording& part) const {
        read_piece(text_of(piece), chosen_->plan, buffer);
        const bool stamped = !part.clock.times_s.empty();
        if (stamped_) {
            to_seconds(buffer.times, times_);
            for (double& t : buffer.times) t += piece.days_s;
        }
        std::size_t at = piece.kept_begin;
        for (std::size_t r = 0; r < buffer.values.size(); ++r) {
            if (std::isnan(buffer.values[r])) continue;
            if (at >= range.begin && at < range.end) {
                part.samples[at - range.begin] = buffer.values[r] * scale_.factor;
                if (stamped)
                    part.clock.times_s[at - range.begin] =
                        stamped_ ? buffer.times[r] : row_time(piece.row_begin + r);
            }
            ++at;
        }
    }

    std::shared_ptr<const InputBytes> input_;
    ReadOptions options_;
    std::optional<ChosenTable> chosen_;
    ChannelScale scale_;
    TimeScale times_;
    std::vector<CsvPiece> pieces_;
    Rows absences_;
    std::size_t row_count_ = 0;
    bool forward_ = true, stamped_ = false;
    SampleClock row_clock_;  ///< of the rows, where it is steady
};

}  // namespace

std::size_t rows_estimate(std::string_view text) {
    constexpr std::size_t looks = std::size_t{1} << 16;
    const std::string_view middle = text.substr(text.size() / 2, looks);
    std::size_t ends = 0;
    for (const char c : middle) ends += c == '\n' ? 1 : 0;
    if (ends == 0)
        for (const char c : middle) ends += c == '\r' ? 1 : 0;
    const double share =
        static_cast<double>(ends) / static_cast<double>(std::max<std::size_t>(middle.size(), 1));
    return static_cast<std::size_t>(share * static_cast<double>(text.size()));
}

std::unique_ptr<LongRecording> open_long_csv(std::shared_ptr<const InputBytes> input,
                                             const ReadOptions& options, Recording facts,
                                             const LongLimits& limits) {
    auto recording = std::make_unique<LongCsv>(std::move(input), options, std::move(facts), limits);
    if (!recording->open()) return nullptr;
    return recording;
}

}  // namespace ringwright
