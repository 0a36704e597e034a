// Comparing programs that measure on the way, through all outcomes.
#pragma once

#include <string>

#include "verify/job.h"

namespace isinglass {

/// The compiled circuit with its variables and bits numbered as the source's; its own follow. A variable that
/// it does not declare was never written there, so it is zero. `mismatch` names a variable of another type.
struct Renumbered {
  Circuit circuit;
  std::string mismatch;
};

Renumbered with_variables_of(const Circuit& source, Circuit compiled);

struct ProgramCheck {
  Deviation deviation;
  std::size_t runs = 0;          // paths through the measurements
  std::size_t endings = 0;       // different values of the bits
  bool with_references = false;  // so that every input was covered at once
  int states = 1;                // else: this many random product states
};

/// Both circuits have the source's variables under the same numbers. Throws Unsupported (see memory.h) where
/// a limit is reached or the classical code is beyond it.
ProgramCheck by_branches(const Job& job, const InputValues& inputs);

}  // namespace isinglass
