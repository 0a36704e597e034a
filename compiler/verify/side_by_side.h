// Following two large circuits side by side, gate by gate, and keeping only what they differ in.
//
//   source so far   =   D  compiled so far          D = D_1 (x) D_2 (x) ...   on few wires each
//
// A gate of the source multiplies D from the left, one of the compiled circuit its inverse from the right.
// Where a pass rewrote a stretch, D grows over the wires of the stretch and falls apart again behind it, into
// one-qubit factors (frames that have moved on) and exchanged wires (swaps that were renamed). If D is
// nothing at the end, the circuits are the same, exactly, whatever their size; cost is linear in the gates as
// long as D stays narrow. If it has to grow over too many wires the method gives up, which proves nothing.
#pragma once

#include "verify/job.h"

namespace isinglass {

struct SideBySide {
  enum class State : std::uint8_t { same, differs, too_wide };
  State state = State::too_wide;
  double distance = 0;       // bound on the norm of the difference from what was rounded to nothing
  std::size_t gates = 0;     // fused gates of both circuits
  std::size_t followed = 0;  // of them, until the end or until D became too wide
  std::size_t widest = 0;    // wires of the widest factor
};

/// Both circuits are fragments or measure only at the end, into the same bits. Throws Unsupported (see
/// memory.h) at the deadline. `differs` is found only where no start and no measurement forgives a
/// difference.
SideBySide by_following(const Job& job, const InputValues& inputs);

}  // namespace isinglass
