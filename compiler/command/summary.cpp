// Summaries; see summary.h.
#include "command/summary.h"

#include "output/summary.h"

namespace isinglass {

nlohmann::ordered_json summary_of(const Result& result) {
  nlohmann::ordered_json summary = json_of(result.facts());
  summary["check"] = {{"answer", result.is_checked ? name(result.verdict.answer) : "not checked"},
                      {"method", result.verdict.method},
                      {"explanation", result.verdict.explanation},
                      {"distance", result.verdict.distance}};
  nlohmann::ordered_json seconds;
  for (const auto& [stage, spent] : result.seconds) seconds[stage] = spent;
  summary["seconds"] = seconds;
  return summary;
}

}  // namespace isinglass
