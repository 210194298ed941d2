#pragma once
// What the ledger and its statistics say, as text for a terminal, and the statistics as JSON.

#include <nlohmann/json_fwd.hpp>
#include <optional>
#include <string>
#include <vector>

#include "ringwright/ledger.hpp"
#include "ringwright/quality_statistics.hpp"

namespace ringwright {

/// One line an entry.
[[nodiscard]] std::string list_text(const std::vector<EntrySummary>& entries);
/// The whole entry but its result, which is long: what it is of, how it was run, its figures, its hashes.
[[nodiscard]] std::string entry_text(const LedgerEntry& entry);

/// A chart over entries: the values with where they stand, the patterns seen, and the trend over days where
/// one was asked for.
struct LedgerChart {
    Quantity quantity = Quantity::damping_ratio;
    std::vector<LedgerValue> values;
    IndividualsChart chart;
    std::vector<RunSignal> signals;
    std::vector<RunRule> rules;
    std::optional<LinearTrend> trend;  ///< slope per year
    /// What the article has to keep, drawn beside the control limits; in the unit of the values.
    std::optional<double> lower_specification, upper_specification;
    double confidence_level = 0.95;
};
/// Drawn in characters, at most `width` values wide (the last ones), with center and limits.
[[nodiscard]] std::string to_text(const LedgerChart& chart, std::size_t width = 72);
[[nodiscard]] nlohmann::ordered_json to_json(const LedgerChart& chart);

[[nodiscard]] std::string capability_text(const Capability& capability, Quantity quantity,
                                          std::string_view unit, std::optional<double> lower,
                                          std::optional<double> upper, double confidence_level);
[[nodiscard]] nlohmann::ordered_json to_json(const Capability& capability);

[[nodiscard]] std::string gauge_text(const GaugeStudy& study, Quantity quantity, std::string_view unit,
                                     double confidence_level);
[[nodiscard]] nlohmann::ordered_json to_json(const GaugeStudy& study);

}  // namespace ringwright
