#pragma once
// identify --separate: one answer for each of many FILEs.

#include <vector>

#include "app/identify_answers.hpp"

namespace ringwright::app {

/// Throws UsageError for options that do not go together (--resume with --format text …).
void check_batch_options(IdentifyArguments& arguments);

/// Answers FILE by FILE, in their order, on standard output or in the file asked for; a FILE that cannot be
/// used is an answer with its error. Returns the gravest exit status of any: 2 before 3 before 4 before 0.
/// Ends the process by its signal on Ctrl-C or SIGTERM, after saying what was finished.
[[nodiscard]] int identify_separately(const IdentifyArguments& arguments,
                                      const std::vector<LoadedFile>& files, AnalysisOptions options);

}  // namespace ringwright::app
