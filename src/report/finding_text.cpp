#include "report/finding_text.hpp"

#include <fmt/format.h>

#include <algorithm>

#include "report/text_table.hpp"

namespace ringwright::report {
namespace {

std::string places_text(const std::vector<std::string>& places) {
    std::string text;
    std::size_t shown = 0;
    for (const std::string& place : places) {
        if (place.empty()) continue;
        // A line of a terminal holds half a dozen places; the JSON has every one.
        if (shown == 6) return text + fmt::format(" and {} more: ", places.size() - shown);
        text += (shown == 0 ? "" : ", ") + place;
        ++shown;
    }
    return text.empty() ? text : text + ": ";
}

}  // namespace

void GatheredFindings::add(const Findings& findings, const std::string& place) {
    for (const Finding& finding : findings) {
        auto same = std::ranges::find_if(entries_, [&](const Entry& entry) {
            return entry.finding.code == finding.code && entry.finding.message == finding.message;
        });
        if (same == entries_.end()) {
            entries_.push_back({finding, {}});
            same = std::prev(entries_.end());
        }
        if (std::ranges::find(same->places, place) == same->places.end()) same->places.push_back(place);
    }
}

std::string GatheredFindings::text() const {
    if (entries_.empty()) return {};
    std::string text = "Findings\n";
    for (const Severity severity : {Severity::defect, Severity::caution, Severity::note})
        for (const Entry& entry : entries_)
            if (entry.finding.severity == severity)
                text += wrapped(fmt::format("  {:<8} ", to_text(severity)),
                                places_text(entry.places) + printable(entry.finding.message));
    return text;
}

}  // namespace ringwright::report
