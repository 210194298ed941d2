#pragma once
// Findings of many places, gathered so that one that recurs is said once.

#include <string>
#include <vector>

#include "ringwright/finding.hpp"

namespace ringwright::report {

class GatheredFindings {
  public:
    /// `place` names the recording or release; empty for the result as a whole.
    void add(const Findings& findings, const std::string& place);
    /// Defects first, then cautions, then notes; nothing when there are none.
    [[nodiscard]] std::string text() const;

  private:
    struct Entry {
        Finding finding;
        std::vector<std::string> places;
    };
    std::vector<Entry> entries_;
};

}  // namespace ringwright::report
