// The whole line, from a source file to a checked, placed and timed program, as one function.
#pragma once

#include <functional>
#include <optional>
#include <string>
#include <utility>
#include <vector>

#include "command/progress.h"
#include "command/reading.h"
#include "command/settings.h"
#include "output/timeline.h"
#include "passes/optimize.h"
#include "targets/schedule.h"
#include "verify/equivalence.h"

namespace isinglass {

/// Seconds by stage, in the order of the stages.
using StageSeconds = std::vector<std::pair<std::string, double>>;

/// Everything known of one compiled source.
struct Result {
  SourceFile source;
  Target target;
  Before before;
  Trace trace;
  Placed placed;
  Timed timed;
  std::string native;  // the text of the native program: what was checked is what is written
  Verdict verdict;
  bool is_checked = false;  // false with --no-verify: then verdict says nothing
  std::optional<Rehearsal> rehearsal;
  StageSeconds seconds;

  /// What the output room needs; refers to this object.
  Compiled facts() const;
};

/// The target named by the settings, or a typical one of `ions` ions.
Target target_for(const Settings& settings, std::uint32_t ions,
                  const std::function<void(double)>& progress = {});

/// Runs the compiled program in simulation with the target's errors; see targets/rehearse.h.
void rehearse(Result& result, std::size_t shots, const Settings& settings, Progress& progress);

/// Compiles and checks. Throws Failure where the source, the target or isinglass itself is at fault.
Result compile(const std::string& path, const Settings& settings, Progress& progress);

}  // namespace isinglass
