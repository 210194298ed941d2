#pragma once
// Everything that an analysis of one article needs, from the command line and from a test sheet.

#include <optional>
#include <string>
#include <vector>

#include "app/answer_options.hpp"
#include "app/article_options.hpp"
#include "app/recording_options.hpp"
#include "ringwright/analysis.hpp"
#include "ringwright/ledger.hpp"
#include "ringwright/test_sheet.hpp"

namespace ringwright::app {

struct TestArguments {
    const CLI::App* command = nullptr;
    FileArguments files;
    RecordingArguments recording;
    ArticleArguments article;
    AnswerArguments answer;
    AnalysisArguments analysis;
};
/// All options of an analysis; FILE may be left out, as a sheet can name the recordings.
void add_test_options(CLI::App& command, TestArguments& arguments);

/// Takes from the sheet what the command line does not say. A mass or inertia on the command line stands for
/// both of the sheet's.
void fill_from_sheet(const TestSheet& sheet, RecordingArguments& recording, ArticleArguments& article);
/// The sheet's recordings, as if they stood on the command line.
[[nodiscard]] std::vector<LoadedFile> files_from(const TestSheet& sheet);

/// A test that is ready to run.
struct PreparedTest {
    std::vector<LoadedFile> files;
    ReadOptions read;
    AnalysisOptions options;
};
/// Throws UsageError when neither the command line nor the sheet names a recording.
[[nodiscard]] PreparedTest prepare(const TestArguments& arguments, const std::optional<TestSheet>& sheet);
[[nodiscard]] Identification run(const PreparedTest& test);

/// Sheet facts that go with a result into its JSON: file, hash, article, test, sensor.
[[nodiscard]] std::string sheet_facts_json(const TestSheet& sheet);

}  // namespace ringwright::app
