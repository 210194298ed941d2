#include "report/finding_text.hpp"

#include <fmt/format.h>

#include <algorithm>

#include "report/text_table.hpp"

namespace ringwright::report {

std::string numbered_places(const std::string& noun, const std::vector<std::size_t>& numbers) {
    std::string text = noun + (numbers.size() == 1 ? " " : "s ");
    for (std::size_t i = 0; i < numbers.size();) {
        std::size_t last = i;
        while (last + 1 < numbers.size() && numbers[last + 1] == numbers[last] + 1) ++last;
        if (i > 0) text += ", ";
        // Two neighbours read better apart than as a range.
        if (last > i + 1)
            text += fmt::format("{} to {}", numbers[i], numbers[last]);
        else
            last = i, text += std::to_string(numbers[i]);
        i = last + 1;
    }
    return text;
}

GatheredFindings::Entry& GatheredFindings::entry_of(const Finding& finding) {
    const auto same = std::ranges::find_if(entries_, [&](const Entry& entry) {
        return entry.finding.code == finding.code && entry.finding.message == finding.message;
    });
    if (same != entries_.end()) return *same;
    entries_.push_back({finding, {}, {}});
    return entries_.back();
}

void GatheredFindings::add(const Findings& findings, const std::string& place) {
    for (const Finding& finding : findings) {
        Entry& entry = entry_of(finding);
        if (!place.empty() && std::ranges::find(entry.places, place) == entry.places.end())
            entry.places.push_back(place);
    }
}

void GatheredFindings::add(const Findings& findings, std::size_t number) {
    for (const Finding& finding : findings) {
        Entry& entry = entry_of(finding);
        if (entry.numbers.empty() || entry.numbers.back() != number) entry.numbers.push_back(number);
    }
}

std::string GatheredFindings::places_of(const Entry& entry) const {
    // A line of a terminal holds half a dozen names; the JSON has every one.
    constexpr std::size_t most_names = 6;
    std::string text = entry.numbers.empty() ? std::string() : numbered_places(noun_, entry.numbers);
    for (std::size_t i = 0; i < std::min(entry.places.size(), most_names); ++i) {
        if (!text.empty()) text += ", ";
        text += entry.places[i];
    }
    if (entry.places.size() > most_names)
        text += fmt::format(" and {} more", entry.places.size() - most_names);
    if (!text.empty()) text += ": ";
    return text;
}

std::string GatheredFindings::text() const {
    if (entries_.empty()) return {};
    std::string text = "Findings\n";
    for (const Severity severity : {Severity::defect, Severity::caution, Severity::note})
        for (const Entry& entry : entries_)
            if (entry.finding.severity == severity)
                text += wrapped(fmt::format("  {:<8} ", to_text(severity)),
                                places_of(entry) + printable(entry.finding.message));
    return text;
}

}  // namespace ringwright::report
