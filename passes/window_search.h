// Window search: parts of a sequence of turns are cut out, synthesized again and put back when that is no
// worse.
//
//   ... t1 [t2 t3 t4 t5 t6] t7 ...   becomes   ... t1 [s2 s3 s4] t7' ...
//
// Idea: a window is a run of consecutive turns, or all turns that stay on a few wires until others interfere.
// As a network of rotations and a Clifford it is solved by the greedy synthesis with parameters drawn at
// random. If its Clifford ends in a permutation, what follows is renamed. Results as good as before are taken
// too, and slightly worse ones with a probability that falls to zero: simulated annealing, Kirkpatrick,
// Gelatt, Vecchi, Science 220, 671.
#pragma once

#include <chrono>

#include "passes/greedy_network.h"

namespace isinglass {

struct SearchPlan {
  Cost cost;
  bool may_rename = true;
  std::uint64_t tries = 0;  // windows at most
  std::chrono::steady_clock::time_point deadline = std::chrono::steady_clock::time_point::max();
  double heat = 0.2;  // at the start: how much worse is often taken, in errors of one full interaction
};

/// Improves a sequence on wires 0 to wires - 1 and returns its price. The result is never dearer.
Price search_windows(Sequence& sequence, unsigned wires, const SearchPlan& plan, Dice& dice);

}  // namespace isinglass
