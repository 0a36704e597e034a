// Which ion holds which wire: good pairs for those that interact much; and movement where pairs are not
// reachable.
#pragma once

#include <cstdint>
#include <vector>

#include "circuit/circuit.h"
#include "targets/target.h"

namespace isinglass {

struct PlaceOptions {
  std::uint64_t seed = 1;  // same seed, same result
  unsigned starts = 8;     // searches from different beginnings; the best result wins
};

/// A circuit whose wires are the ions of the target.
struct Placed {
  Circuit circuit;  // operand i is ion i; circuit.wires = ions; end_wire[q] = where source qubit q ends
  std::vector<std::uint32_t> start;  // start[q]: the ion that holds source qubit q at the start
  std::vector<bool> in_use;          // an ion that holds a source qubit or an ancilla at some time
  std::size_t moves = 0;             // swaps that were inserted, three interactions each
};

/// Places a lowered circuit (r, xx, rz and what is not unitary); on a machine whose ions and pairs are all
/// alike every qubit stays where the source has it. A physical qubit of the source, `$k`, sits on ion k and
/// stays there. Throws Failure(target_cannot) that says what is missing: ions, pairs that no movement
/// connects, reset, feed-forward.
Placed place(Circuit circuit, const Target& target, const PlaceOptions& options = {});

}  // namespace isinglass
