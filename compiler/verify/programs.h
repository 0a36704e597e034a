// Comparing programs that measure on the way, through all outcomes.
#pragma once

#include <string>

#include "verify/job.h"

namespace isinglass {

/// Variables whose values the promise is about, by their index in both circuits; missing: one that the
/// compiled program lacks.
struct Shown {
  std::vector<std::uint32_t> source;
  std::vector<std::uint32_t> compiled;
  std::string missing;
};

Shown shown_variables(const Circuit& source, const Circuit& compiled);

struct ProgramCheck {
  Deviation deviation;
  std::size_t runs = 0;          // paths through the measurements
  std::size_t endings = 0;       // different values of the bits
  bool with_references = false;  // so that every input was covered at once
  int states = 1;                // else: this many random product states
};

/// Throws Unsupported (see memory.h) where a limit is reached or the classical code is beyond it.
ProgramCheck by_branches(const Job& job, const Shown& shown, const InputValues& inputs);

}  // namespace isinglass
