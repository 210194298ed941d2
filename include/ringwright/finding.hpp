#pragma once
// What the tool noticed about a recording, an event or a result, in words a technician understands.

#include <string>
#include <string_view>
#include <vector>

namespace ringwright {

/// How much a finding weighs. `note`: an assumption or a harmless fact; `caution`: the answer may be
/// affected; `defect`: the answer is affected, or could not be given.
enum class Severity { note, caution, defect };

/// "note", "caution" or "defect".
[[nodiscard]] std::string_view to_text(Severity severity);

/// One thing noticed. `code` is a stable snake_case name for programs; `message` is one or two sentences for
/// people that say what was seen, where, and what to do about it.
struct Finding {
    std::string code;
    Severity severity = Severity::note;
    std::string message;
};

using Findings = std::vector<Finding>;

}  // namespace ringwright
