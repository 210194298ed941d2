#include "app/identify_batch.hpp"

#include <fmt/format.h>
#include <unistd.h>

#include <CLI/App.hpp>
#include <CLI/Config.hpp>
#include <CLI/Formatter.hpp>
#include <algorithm>
#include <exception>
#include <functional>
#include <mutex>
#include <new>
#include <nlohmann/json.hpp>

#include "app/batch_files.hpp"
#include "app/batch_progress.hpp"
#include "app/command.hpp"
#include "app/filing.hpp"
#include "app/in_order.hpp"
#include "app/interruption.hpp"
#include "app/kept_answers.hpp"
#include "app/messages.hpp"
#include "app/no_answer.hpp"
#include "app/resume_file.hpp"
#include "ringwright/each_index.hpp"
#include "ringwright/error.hpp"
#include "ringwright/result_csv.hpp"
#include "ringwright/result_json.hpp"
#include "ringwright/result_text.hpp"
#include "ringwright/safe_file.hpp"

namespace ringwright::app {
namespace {

/// The answer for one FILE.
struct SeparateAnswer {
    std::string text;
    int status = done;
    Problem problem;
    std::string to_file = {};  ///< for the ledger; empty without an answer
    std::vector<LedgerRecording> recordings = {};
    [[nodiscard]] std::size_t bytes() const { return sizeof(SeparateAnswer) + text.size() + to_file.size(); }
};

/// What all threads look at.
struct Batch {
    const IdentifyArguments& arguments;
    ReadOptions read;
    AnalysisOptions options;
    Format format = Format::text;
};

std::string text_without_header(const std::string& csv) {
    return csv.substr(csv.find('\n') + 1);
}

SeparateAnswer failed(const Batch& batch, const std::string& file, const Problem& problem, int status) {
    SeparateAnswer answer{{}, status, problem};
    if (batch.format == Format::json)
        answer.text = to_text(error_document(file, problem, status, batch.arguments), -1);
    if (batch.format == Format::csv)
        answer.text =
            csv_row_of_unusable(file, to_text(Problem{"", problem.place, problem.found, problem.remedy}),
                                batch.options.identify.confidence_level);
    return answer;
}

SeparateAnswer identify_file(const Batch& batch, const LoadedFile& file) {
    std::vector<RecordingInput> input;
    input.push_back(input_of(open_recording(file.file, batch.read), file.added_mass));
    // Of those that do not fit into memory one at a time.
    static std::mutex one_long_recording;
    std::unique_lock lock(one_long_recording, std::defer_lock);
    if (input.front().stretches) lock.lock();
    const Identification identification = identify(std::move(input), batch.options);
    if (lock) lock.unlock();
    SeparateAnswer answer;
    switch (batch.format) {
        case Format::json:
            answer.text = filed_text(identification, batch.arguments);
            break;
        case Format::csv:
            answer.text = text_without_header(to_csv(identification));
            break;
        case Format::text:
            answer.text = to_text(identification);
    }
    if (!identification.answered()) {
        answer.status = no_answer;
        answer.problem = why_no_answer_after(identification, batch.format, batch.arguments.answer.output);
    } else if (!batch.arguments.ledger.empty()) {
        answer.to_file = filed_text(identification, batch.arguments);
        answer.recordings = recordings_of(identification);
    }
    return answer;
}

/// Whatever happens to one FILE, the others are answered.
SeparateAnswer identify_one(const Batch& batch, const BatchFile& file) {
    const std::string& name = file.loaded.file;
    try {
        if (file.problem) return failed(batch, name, *file.problem, unusable_input);
        return identify_file(batch, file.loaded);
    } catch (const InputError& error) {
        return failed(batch, name, error.problem(), unusable_input);
    } catch (const UsageError& error) {
        return failed(batch, name, error.problem(), wrong_usage);
    } catch (const std::bad_alloc&) {
        return failed(batch, name,
                      {name, "", "the machine has not enough memory for this", "Use fewer --jobs"},
                      unusable_input);
    } catch (const std::exception& error) {
        return failed(
            batch, name,
            {name, "", without_period(error.what()), "This is a fault of the program; please report it"},
            unusable_input);
    }
}

/// An unreadable FILE (3) weighs more than one without an answer (4); a usage error (2) most.
int graver(int first, int second) {
    const auto weight = [](int status) { return status == done ? 0 : 10 - status; };
    return weight(first) >= weight(second) ? first : second;
}

/// Thrown where nobody reads standard output any more.
struct ReaderGone {};

/// One run over a list: takes the answers in their order, says what there is to say.
class BatchRun {
  public:
    BatchRun(const Batch& batch, std::vector<BatchFile> files, Shard shard, ResumeFile* kept)
        : batch_(batch),
          files_(std::move(files)),
          shard_(shard),
          kept_(kept),
          kept_statuses_(kept == nullptr
                             ? std::vector<int>{}
                             : check_kept_answers(*kept, files_, batch.arguments, batch.options.jobs)),
          progress_(files_.size(), kept_statuses_.size()) {}

    /// Hands the pieces of the whole answer to `take`; what was finished before comes first.
    int run(const PieceTaker& take) {
        if (batch_.format == Format::csv && shard_.part == 1) take(to_csv(Identification{}));
        const std::size_t kept_count = kept_statuses_.size();
        for (std::size_t i = 0; i < kept_count; ++i) {
            take(kept_->line(i));
            finish(kept_statuses_[i]);
        }
        AnalysisOptions options = batch_.options;
        const std::size_t left = files_.size() - kept_count;
        const unsigned threads = threads_for(options.jobs);
        // The threads go to the files; those that are left over, to the releases within them.
        options.jobs =
            std::max(1U, threads / static_cast<unsigned>(std::clamp<std::size_t>(left, 1, threads)));
        const Batch work{batch_.arguments, batch_.read, options, batch_.format};
        in_order<SeparateAnswer>(
            {kept_count, files_.size(), threads},
            [&](std::size_t i) { return identify_one(work, files_[i]); },
            [&](std::size_t i, const SeparateAnswer& answer) { take_new(take, i, answer); }, [&] { wait(); });
        if (kept_ != nullptr) kept_->sync();
        progress_.clear();
        return status_;
    }

  private:
    void take_new(const PieceTaker& take, std::size_t i, const SeparateAnswer& answer) {
        // Kept first: what was said to be finished is never lost.
        if (kept_ != nullptr) kept_->append(answer.text);
        const bool apart = batch_.format == Format::text && i > 0 && !answer.text.empty();
        take((apart ? "\n" : "") + answer.text);
        if (!answer.to_file.empty()) {
            progress_.clear();
            file_result(batch_.arguments.ledger, answer.to_file, batch_.arguments.read_sheet,
                        given_options(*batch_.arguments.command), answer.recordings);
        }
        if (answer.status != done) {
            progress_.clear();
            say(answer.problem);
        }
        finish(answer.status);
    }

    void finish(int status) {
        status_ = graver(status_, status);
        progress_.count(status == done);
        if (InterruptionWatch::interrupted()) end();
        if (standard_output_is_closed()) throw ReaderGone{};
    }

    void wait() {
        if (InterruptionWatch::interrupted()) end();
        if (kept_ != nullptr) kept_->sync_when_due();
        progress_.show();
    }

    [[noreturn]] void end() {
        progress_.clear();
        const std::string& output = batch_.arguments.answer.output;
        std::string found =
            fmt::format("interrupted with {} of {} recordings finished", progress_.done(), files_.size());
        std::string remedy = "Give --resume FILE to a long run, so that it can be continued";
        if (kept_ != nullptr) {
            kept_->sync();
            remedy = "Run the same command again to go on; they are kept in " + kept_->path();
        }
        if (!output.empty() && output != "-") found += fmt::format("; {} was not written", output);
        say({"", "", found, remedy});
        end_as_interrupted();
    }

    const Batch& batch_;
    std::vector<BatchFile> files_;
    Shard shard_;
    ResumeFile* kept_;
    std::vector<int> kept_statuses_;
    BatchProgress progress_;
    int status_ = done;
};

std::vector<BatchFile> files_of(const Shard& shard, BatchList list) {
    for (const Problem& passed_over : list.passed_over) say(passed_over);
    const std::size_t count = list.files.size(), begin = shard.begin(count), end = shard.end(count);
    if (shard.parts > 1)
        say({"", "",
             fmt::format("shard {}/{}: recordings {} to {} of {}", shard.part, shard.parts, begin + 1, end,
                         count),
             ""});
    const auto first = list.files.begin();
    return {first + static_cast<std::ptrdiff_t>(begin), first + static_cast<std::ptrdiff_t>(end)};
}

std::vector<std::string> names_of(const std::vector<BatchFile>& files) {
    std::vector<std::string> names;
    for (const BatchFile& file : files) names.push_back(file.loaded.file);
    return names;
}

void refuse_standard_input(const std::vector<BatchFile>& files) {
    for (const BatchFile& file : files)
        if (file.loaded.file == "-")
            throw UsageError(
                {"--resume", "", "standard input cannot be read again", "Give the recording as a file"});
}

}  // namespace

void check_batch_options(IdentifyArguments& arguments) {
    const auto given = [&](const char* option) { return arguments.command->count(option) > 0; };
    for (const char* option : {"--resume", "--shard"})
        if (given(option) && !arguments.separate)
            throw UsageError({option, "", "this is for recordings that are answered one by one",
                              "Give --separate with it"});
    if (!given("--resume")) return;
    if (arguments.resume.empty())
        throw UsageError({"--resume", "", "names no file", "Example: --resume run.jsonl"});
    if (given("--format") && arguments.answer.format != "json")
        throw UsageError({"--resume", "", "the file holds the answers as JSON",
                          "Leave --format out, or give --format json"});
    if (given("--ledger"))
        throw UsageError({"--resume", "", "a run that is continued could file a result twice",
                          "Leave --ledger out; file the answers later with ringwright ledger add"});
    arguments.answer.format = "json";
}

int identify_separately(const IdentifyArguments& arguments, const std::vector<LoadedFile>& files,
                        AnalysisOptions options) {
    const InterruptionWatch watch;
    const Shard shard = shard_from(arguments.shard);
    std::vector<BatchFile> list = files_of(shard, batch_list(files));
    const std::vector<std::string> names = names_of(list);
    refuse_overwriting(arguments.answer.output, names);
    std::optional<ResumeFile> kept;
    if (!arguments.resume.empty()) {
        refuse_standard_input(list);
        refuse_overwriting(arguments.resume, names);
        kept.emplace(arguments.resume);
        refuse_overwriting(arguments.answer.output, {arguments.resume});
    }
    options.event.progress = {};  // the run shows its own
    const Batch batch{arguments, read_options(arguments.recording), options, format_from(arguments.answer)};
    BatchRun run(batch, std::move(list), shard, kept ? &*kept : nullptr);
    const std::string& output = arguments.answer.output;
    int status = done;
    try {
        if (output.empty() || output == "-")
            status = run.run([](std::string_view piece) { write_answer(piece, ""); });
        else
            write_pieces_safely(output, [&](const PieceTaker& take) { status = run.run(take); });
    } catch (const ReaderGone&) {
        return done;
    }
    return status;
}

}  // namespace ringwright::app
