// The summary of one compiled source as JSON: the one form that compile, tally and guard share.
#pragma once

#include <nlohmann/json.hpp>

#include "command/pipeline.h"

namespace isinglass {

/// source, target, totals, before, check, seconds.
nlohmann::ordered_json summary_of(const Result& result);

}  // namespace isinglass
