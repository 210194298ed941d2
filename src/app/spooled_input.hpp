#pragma once
// Standard input that is to be read twice.

#include <string>

namespace ringwright::app {

/// For "-" a copy of standard input in a temporary file that lives as long as this; for any other path the
/// path itself. Throws OutputError when the copy cannot be written.
class SpooledInput {
  public:
    explicit SpooledInput(const std::string& path);
    SpooledInput(const SpooledInput&) = delete;
    SpooledInput& operator=(const SpooledInput&) = delete;
    ~SpooledInput();
    [[nodiscard]] const std::string& path() const { return path_; }

  private:
    std::string path_;
    bool temporary_ = false;
};

}  // namespace ringwright::app
