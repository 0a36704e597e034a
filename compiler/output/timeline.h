// The timed gate list as JSON and as CSV, streamed.
#pragma once

#include <ostream>
#include <string>

#include "circuit/before.h"
#include "targets/rehearse.h"
#include "targets/schedule.h"
#include "targets/target.h"

namespace isinglass {

/// Everything that the outputs tell of one compiled program.
struct Compiled {
  std::string source_file;
  std::string source_sha256;
  const Target& target;
  const Placed& placed;
  const Timed& timed;
  Before before;
  std::string check;                     // how the result was checked and what that proves; may be empty
  const Rehearsal* rehearsal = nullptr;  // if one was asked for
};

void write_timeline_json(std::ostream& out, const Compiled& compiled);
/// One row an operation, nested ones too; the columns are the keys of the JSON.
void write_timeline_csv(std::ostream& out, const Compiled& compiled);

}  // namespace isinglass
