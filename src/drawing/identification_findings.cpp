// What was noticed, said once however often it was noticed.

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "drawing/document.hpp"
#include "drawing/document_parts.hpp"
#include "drawing/identification_parts.hpp"
#include "drawing/result_reading.hpp"

namespace ringwright::drawing {
namespace {

/// Findings that several places share are said once.
struct GatheredNote {
    Note note;
    std::vector<std::string> places;
};

void gather(std::vector<GatheredNote>& notes, const Json& holder, const std::string& place) {
    for (const Json& finding : list_at(holder, {"findings"})) {
        const Note note = note_of(finding);
        auto same = std::ranges::find_if(notes, [&](const GatheredNote& other) {
            return other.note.text == note.text && other.note.severity == note.severity;
        });
        if (same == notes.end()) same = notes.insert(notes.end(), {note, {}});
        if (!place.empty()) same->places.push_back(place);
    }
}

std::string places_text(const std::vector<std::string>& places) {
    constexpr std::size_t shown = 6;
    std::string text;
    for (std::size_t i = 0; i < std::min(places.size(), shown); ++i)
        text.append(i == 0 ? "" : ", ").append(places[i]);
    if (places.size() > shown) text += fmt::format(" and {} more", places.size() - shown);
    return text.empty() ? "" : text + ": ";
}

}  // namespace

Notes findings_of(const Json& result, const std::vector<std::string>& differences) {
    std::vector<GatheredNote> gathered;
    const auto& recordings = list_at(result, {"recordings"});
    std::size_t number = 0;
    for (const Json& recording : recordings) {
        gather(gathered, recording, recordings.size() > 1 ? text_at(recording, {"file"}) : "");
        for (const Json& event : list_at(recording, {"events"}))
            gather(gathered, event, fmt::format("release {}", ++number));
    }
    gather(gathered, at(result, {"result"}), "");
    gather(gathered, at(result, {"verdict"}), "");
    Notes notes;
    for (const std::string& difference : differences) notes.notes.push_back({"caution", difference});
    for (const char* severity : {"defect", "caution", "note"})
        for (const GatheredNote& entry : gathered)
            if (entry.note.severity == severity)
                notes.notes.push_back({severity, places_text(entry.places) + entry.note.text});
    return notes;
}

}  // namespace ringwright::drawing
