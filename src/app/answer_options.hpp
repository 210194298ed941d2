#pragma once
// Options about the answer, and the options of the analysis that all of them make together.

#include <string>
#include <vector>

#include "app/article_options.hpp"
#include "app/recording_options.hpp"
#include "ringwright/analysis.hpp"

namespace CLI {
class App;
}

namespace ringwright::app {

struct AnswerArguments {
    std::string confidence = "0.95", format = "text", output;
};
void add_answer_options(CLI::App& command, AnswerArguments& arguments);

enum class Format { text, json, csv };
/// Throw UsageError naming the option.
[[nodiscard]] Format format_from(const AnswerArguments& arguments);
[[nodiscard]] double confidence_from(const AnswerArguments& arguments);

/// What enters the uncertainty beside the record itself, and how the analysis runs.
struct AnalysisArguments {
    std::string time_base, sensor_gain, at_amplitude, seed, jobs;
};
void add_analysis_options(CLI::App& command, AnalysisArguments& arguments);
[[nodiscard]] AnalysisOptions analysis_options(const RecordingArguments& recording,
                                               const ArticleArguments& article, const AnswerArguments& answer,
                                               const AnalysisArguments& analysis);

[[nodiscard]] RecordingInput input_of(OpenedRecording opened, const std::optional<MeasuredValue>& added_mass);
/// Reads every file and hands it on with its added mass.
[[nodiscard]] std::vector<RecordingInput> read_all(const std::vector<LoadedFile>& files,
                                                   const ReadOptions& options);

}  // namespace ringwright::app
