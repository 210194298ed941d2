#pragma once
// Whether a decay that was found is a plateau and a later, faster decay taken together.

#include <vector>

#include "event/found.hpp"
#include "event/onset.hpp"

namespace ringwright::event_search {

/// Whether one of the onsets within the found decay explains it better: level until there, a decay from there
/// on. In noise a slow decay can stand in for the edge between a held plateau and the answer to the release.
[[nodiscard]] bool is_plateau_and_decay(const Pyramid& pyramid, const Found& found,
                                        const std::vector<Onset>& onsets);

}  // namespace ringwright::event_search
