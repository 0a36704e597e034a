// The figures of a compiled program for people (text tables) and for programs (JSON).
#pragma once

#include <nlohmann/json.hpp>
#include <string>

#include "output/timeline.h"

namespace isinglass {

/// The keys of "totals", "before", "source", "target" as in the timed list; success_interval only where the
/// machine states deviations.
nlohmann::ordered_json json_of(const Totals& totals);
nlohmann::ordered_json json_of(const Before& before);
/// method, shots, estimate, no_error, fidelity (where there is one), distance, outcomes, left_out.
nlohmann::ordered_json json_of(const Rehearsal& rehearsal);
/// {"source": ..., "target": ..., "totals": ..., "before": ..., and "rehearsal" if there was one}
nlohmann::ordered_json json_of(const Compiled& compiled);

/// The tally before and after, errors by source, time and success, as lines of text for a terminal.
std::string text_of(const Compiled& compiled);

/// The likeliest outcomes with and without noise, and the estimate beside what was found.
std::string text_of(const Rehearsal& rehearsal);

/// A table in columns: the first row is the heading; cells that look like numbers are set to the right.
std::string table(const std::vector<std::vector<std::string>>& rows);

}  // namespace isinglass
