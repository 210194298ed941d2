#pragma once
// From what was written to SI: unit, sensitivity, quantity.

#include <optional>
#include <string>

#include "ringwright/recording.hpp"

namespace ringwright {

/// A transducer's sensitivity: volts for each SI unit of what it measures.
struct Sensitivity {
    double volts_per_si_unit = 1.0;
    Unit unit;  ///< of what it measures, as written
};

/// Reads "100 mV/g", "50 mV/mm", "0.1 V/(m/s²)", "100 mV per g", "20 mm/V". Throws UsageError.
[[nodiscard]] Sensitivity parse_sensitivity(std::string_view text);

/// What is known of one channel before scaling.
struct RawChannel {
    std::string label;      ///< the words of its header
    std::string unit_text;  ///< as written; empty when there is none
    std::optional<Unit> unit;
};

/// Unit, quantity and factor for a channel; the findings say what was assumed.
struct ChannelScale {
    Unit unit;
    double factor = 1.0;  ///< recorded value times this is the sample
    bool scaled = false;
    MeasuredQuantity quantity = MeasuredQuantity::displacement;
    bool quantity_known = false;
    Findings findings;
};

/// Options win over the header. A channel in volts becomes SI by `--sensitivity`.
[[nodiscard]] ChannelScale scale_channel(const RawChannel& channel, const ReadOptions& options);

}  // namespace ringwright
