// From a sequence of turns back to rotations on wires: every stretch as the fewest interactions that it
// needs.
//
//   XX(a) YY(90) ZZ(90) on one pair   becomes   XX(a - 90), and the two wires exchange names
//
// A stretch whose turns commute keeps its axes, and angles that are not known stay as they are; any other is
// written by its canonical decomposition. Where the stretch times SWAP is cheaper and wires may be renamed,
// that is performed and what follows is renamed.
#pragma once

#include "circuit/cost.h"
#include "passes/local_rotations.h"
#include "passes/pair_stretches.h"

namespace isinglass {

/// Rotations on wires 0 to wires - 1. home as in Sequence.
struct WrittenSequence {
  std::vector<LocalRotation> rotations;
  std::vector<std::uint32_t> home;
};

WrittenSequence written(const Sequence& sequence, unsigned wires, bool may_rename, const Cost& cost,
                        Circuit& circuit);

}  // namespace isinglass
