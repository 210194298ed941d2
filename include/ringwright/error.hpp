#pragma once
// The exceptions of the library. Each carries what the user needs to mend the cause.

#include <stdexcept>
#include <string>

namespace ringwright {

/// What is wrong with something the user gave: where it stands, what was found there, what to do about it.
struct Problem {
    std::string file;    ///< file, option or "standard input"; may be empty
    std::string place;   ///< "line 12, column 3", "sample 400", "key limits.damping_ratio"; may be empty
    std::string found;   ///< what is wrong, as a clause
    std::string remedy;  ///< what to do about it, as a sentence
};

/// `file: place: found. remedy` with the empty parts left out.
[[nodiscard]] std::string to_text(const Problem& problem);

/// An input cannot be read or used (exit status 3).
class InputError : public std::runtime_error {
  public:
    explicit InputError(Problem problem);
    [[nodiscard]] const Problem& problem() const { return problem_; }

  private:
    Problem problem_;
};

/// An option or argument has no usable meaning (exit status 2).
class UsageError : public std::runtime_error {
  public:
    explicit UsageError(Problem problem);
    [[nodiscard]] const Problem& problem() const { return problem_; }

  private:
    Problem problem_;
};

/// An output or the ledger cannot be written (exit status 6).
class OutputError : public std::runtime_error {
  public:
    explicit OutputError(Problem problem);
    [[nodiscard]] const Problem& problem() const { return problem_; }

  private:
    Problem problem_;
};

}  // namespace ringwright
