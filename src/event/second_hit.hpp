#pragma once
// A second hit or release while the answer to the first still rings.

#include <optional>

#include "event/start.hpp"

namespace ringwright::event_search {

/// Block after the last disturbance within a few cycles from `first` on: where half a cycle turns out unlike
/// what the cycle before it foretells, and what follows is again foretold well. Nothing when there is none,
/// or when the shape does not ring several times. `shape` is per block.
[[nodiscard]] std::optional<std::size_t> after_second_hit(std::span<const double> means, std::size_t first,
                                                          const DecayShape& shape);

/// Whether a free decay of the shape of this one, and not a plateau or a single blow, comes just before it.
[[nodiscard]] bool rings_before(const Pyramid& pyramid, const Start& start);

/// Whether the recording moves for a third of a cycle or longer before the start; no plateau, no single blow.
[[nodiscard]] bool moves_before(const Pyramid& pyramid, const Start& start);

}  // namespace ringwright::event_search
