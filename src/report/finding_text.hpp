#pragma once
// Findings of many places, gathered so that one that recurs is said once.

#include <cstddef>
#include <string>
#include <utility>
#include <vector>

#include "ringwright/finding.hpp"

namespace ringwright::report {

/// "release 3", "releases 1 to 4, 6"; the numbers ascend.
[[nodiscard]] std::string numbered_places(const std::string& noun, const std::vector<std::size_t>& numbers);

class GatheredFindings {
  public:
    /// `noun` is what the numbered places are called: "release", "event".
    explicit GatheredFindings(std::string noun = "release") : noun_(std::move(noun)) {}
    /// `place` names the recording; empty for the result as a whole.
    void add(const Findings& findings, const std::string& place);
    /// The place is the release or event of this number, from 1; numbers come in ascending order.
    void add(const Findings& findings, std::size_t number);
    /// Defects first, then cautions, then notes; nothing when there are none.
    [[nodiscard]] std::string text() const;

  private:
    struct Entry {
        Finding finding;
        std::vector<std::string> places;
        std::vector<std::size_t> numbers;
    };
    Entry& entry_of(const Finding& finding);
    [[nodiscard]] std::string places_of(const Entry& entry) const;

    std::string noun_;
    std::vector<Entry> entries_;
};

}  // namespace ringwright::report
