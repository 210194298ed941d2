#pragma once
// Whether the lines of a resume file are answers of the run that is to be continued.

#include <cstddef>
#include <vector>

#include "app/batch_files.hpp"
#include "app/identify_answers.hpp"
#include "app/resume_file.hpp"
#include "ringwright/result_json.hpp"

namespace ringwright::app {

/// The line for a FILE that cannot be used: file, place, cause, remedy and exit status.
[[nodiscard]] nlohmann::ordered_json error_document(const std::string& file, const Problem& problem,
                                                    int status, const IdentifyArguments& arguments);

/// Holds every line against `files`, position by position: same file name and added mass, same options, test
/// sheet and version of the program, and the bytes of the recording still those that were analysed. Cuts
/// what a killed writer left half-written at the end and says so. Returns the exit status of each line that
/// is kept. Throws UsageError, which names the first difference, where the file belongs to another run or is
/// no resume file; then it is left as it is.
[[nodiscard]] std::vector<int> check_kept_answers(ResumeFile& file, const std::vector<BatchFile>& files,
                                                  const IdentifyArguments& arguments, unsigned jobs);

}  // namespace ringwright::app
