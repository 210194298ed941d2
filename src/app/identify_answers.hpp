#pragma once
// What identify was asked for, and the forms in which it answers.

#include <nlohmann/json_fwd.hpp>
#include <optional>
#include <string>

#include "app/answer_options.hpp"
#include "app/article_options.hpp"
#include "app/drawing.hpp"
#include "app/recording_options.hpp"
#include "ringwright/analysis.hpp"
#include "ringwright/test_sheet.hpp"

namespace ringwright::app {

struct IdentifyArguments {
    const CLI::App* command = nullptr;
    FileArguments files;
    RecordingArguments recording;
    ArticleArguments article;
    AnswerArguments answer;
    AnalysisArguments analysis;
    DrawingArguments drawing;
    bool separate = false;
    std::string sheet, ledger, resume, shard;
    std::optional<TestSheet> read_sheet;
};

/// The result with what the sheet says of article and test, and the options that give it again.
[[nodiscard]] nlohmann::ordered_json document_of(const Identification& identification,
                                                 const IdentifyArguments& arguments);
/// The same on one line, as the ledger keeps it.
[[nodiscard]] std::string filed_text(const Identification& identification,
                                     const IdentifyArguments& arguments);
/// The answer in the form asked for.
[[nodiscard]] std::string answer_text(const Identification& identification,
                                      const IdentifyArguments& arguments, Format format);

}  // namespace ringwright::app
