#pragma once
// What a label says was measured, in the languages that loggers speak.

#include <optional>
#include <string>
#include <string_view>

#include "ringwright/recording.hpp"

namespace ringwright {

/// The quantity that the words of a label name ("acc_x", "Weg 1", "déplacement"); nothing when they name
/// none.
[[nodiscard]] std::optional<MeasuredQuantity> quantity_from_label(std::string_view label);
/// The quantity that a dimension stands for; nothing for voltage, force and the like.
[[nodiscard]] std::optional<MeasuredQuantity> quantity_from_dimension(Dimension dimension);
/// True when the label names a time: "time", "Zeit", "t", "timestamp" …
[[nodiscard]] bool label_names_time(std::string_view label);
/// True when the label names a running number: "index", "sample", "Nr" …
[[nodiscard]] bool label_names_counter(std::string_view label);
/// Lower case of ASCII and of the accented letters of Latin-1.
[[nodiscard]] std::string folded(std::string_view text);

}  // namespace ringwright
