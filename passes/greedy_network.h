// Greedy synthesis of a network of Pauli rotations by two-wire turns.
//
//   exp(-i a/2 ZZI) exp(-i b/2 XXI) exp(-i c/2 ZIZ) C   becomes   a turn a pair at a time until nothing is
//   left
//
// Idea: a turn about a two-letter string P(x)Q can perform a rotation that is ready and has become P(x)Q, or
// change what remains (a quarter turn conjugates all remaining rotations and the Clifford), or both, as the
// two merge into one interaction. The turn is taken that lowers a potential most: the sum of gamma^layer
// (weight - 1)^power over the rotations, where layers are those of the graph of anticommuting predecessors,
// plus kappa times the weights of the rows of the Clifford that is to be brought home. Per pair a histogram
// of the two-letter strings tells the gain of all nine turns at once. A turn that does not raise the
// interactions of the stretch it joins is free and is taken whenever it gains. Where nothing gains, the
// lightest ready rotation is worked off first. Compare Paykin et al., "PCOAST: a Pauli-based quantum circuit
// optimization framework", arXiv:2305.10966, and Schmitz et al., "Graph optimization perspective for
// low-depth Trotter-Suzuki decomposition", arXiv:2103.08602.
#pragma once

#include <cstdint>
#include <limits>
#include <optional>

#include "passes/dice.h"
#include "passes/pair_stretches.h"
#include "passes/turns.h"

namespace isinglass {

/// The parameters of the potential.
struct Taste {
  double power = 0.6;
  double gamma = 0.4;
  double kappa = 0.05;
  double clifford_power = 1;
  bool uses_tables = true;    // the last few wires of the Clifford go home the shortest way
  double noise = 0;           // gains are multiplied by up to 1 + noise at random
  unsigned layers = 6;        // deeper layers do not count
  std::size_t active = 1500;  // rotations looked at together
};

/// Good settings, drawn at random.
Taste random_taste(Dice& dice);

struct Limits {
  int interactions = std::numeric_limits<int>::max();
  bool may_rename = true;
  unsigned tabled_wires = 3;  // Clifford tables are used up to here; see clifford_table.h
};

/// A sequence for the network, or nullopt as soon as it takes more interactions than the limit. Without leave
/// to rename, the sequence ends with every wire at home.
std::optional<Sequence> greedy_sequence(const Network& network, const Taste& taste, const Limits& limits,
                                        Dice& dice);

}  // namespace isinglass
