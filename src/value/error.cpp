#include "ringwright/error.hpp"

#include <utility>

namespace ringwright {

std::string to_text(const Problem& problem) {
    std::string text;
    for (const std::string* part : {&problem.file, &problem.place})
        if (!part->empty()) text += *part + ": ";
    text += problem.found;
    if (!problem.remedy.empty()) text += ". " + problem.remedy;
    return text;
}

InputError::InputError(Problem problem)
    : std::runtime_error(to_text(problem)), problem_(std::move(problem)) {}
UsageError::UsageError(Problem problem)
    : std::runtime_error(to_text(problem)), problem_(std::move(problem)) {}
OutputError::OutputError(Problem problem)
    : std::runtime_error(to_text(problem)), problem_(std::move(problem)) {}

}  // namespace ringwright
