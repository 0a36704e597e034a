// What the source would cost if every gate were lowered on its own, in the textbook way, to CNOTs: the
// "before" of every report. It is fixed by rule, so that two compilers, or two versions, have the same
// "before".
#pragma once

#include <cstddef>

#include "circuit/circuit.h"

namespace isinglass {

/// Of alternatives (the arms of an if or switch) the worse one counts, figure by figure; of a loop one round.
struct Before {
  std::size_t one_qubit = 0;
  std::size_t two_qubit = 0;
  std::size_t two_qubit_depth =
      0;  // longest chain of two-qubit gates; a gate of n wires is a block on all of them
};

/// Counts the circuit as the language room hands it over, controls included. CNOTs: cx, cy, cz, ch 1; swap 3;
/// controlled rotations, phases and u, and two-qubit rotations 2; two controls on x, y, z or h 6; a
/// controlled swap 8; more controls by Barenco et al., "Elementary gates for quantum computation", Phys. Rev.
/// A 52, 3457 (1995), lemma 7.5: CU(k) = 4 + 2 X(k-1) + CU(k-1), X(1) = 1, X(2) = 6, X(k) = CU(k). A gate
/// counts 10^12 at most.
Before before_of(const Circuit& source);

/// How many of these CNOTs one operation counts.
std::size_t two_qubit_gates(const Operation& op);

}  // namespace isinglass
