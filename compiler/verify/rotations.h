// Comparing circuits too large for state vectors as Pauli rotations and a Clifford frame.
//
//   compiled^-1 after source   =   K  R_m ... R_2 R_1     R_i = exp(-i angle/2 P), K a Clifford
//
// Every gate is a product of Pauli rotations; quarter turns are pulled to the end into a tableau, which turns
// the axes of the others. Then rotations are cancelled: each moves back through what it commutes with until
// it meets its like (angles add), or something it does not commute with; small groups of those are multiplied
// out as sums of Pauli strings and so recognized when together they are nothing. If all cancels and K does
// nothing, the circuits are the same, exactly, on every input: no state vector is involved, and cost grows
// with gates, not 2^qubits. If something is left, nothing is known, except where a single rotation or K alone
// is left.
#pragma once

#include "verify/job.h"

namespace isinglass {

struct RotationResult {
  enum class State : std::uint8_t { cancelled, differs, stuck };
  State state = State::stuck;
  double distance = 0;        // bound on the norm of the difference from what was rounded to nothing
  std::size_t rotations = 0;  // of both circuits
  std::size_t left = 0;       // that did not cancel
};

/// Both circuits are fragments or measure only at the end, into the same bits; at most 16 controls a gate.
/// Throws Unsupported (see memory.h) at the deadline or on a gate with more controls.
RotationResult by_rotations(const Job& job, const InputValues& inputs);

}  // namespace isinglass
