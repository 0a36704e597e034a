// Merging of rotations across distance.
//
//   rz(a) q0; cx q0, q1; rz(b) q1; cx q0, q1; h q1; rz(c) q0      becomes
//   rz(a + c) q0; cx q0, q1; rz(b) q1; cx q0, q1; h q1
//
// Idea: seen through the Clifford gates before it, every other rotation is a rotation about some Pauli
// string. Two about the same string merge when everything between them commutes with it, however far apart
// they stand and whatever the gates between them look like. The later one's angle, which may depend on
// inputs, is added to the earlier one; no gate moves. A sum that is a multiple of pi/2 is Clifford and is
// looked through in the next round. Compare Zhang, Chen, "Optimizing T gates in Clifford+T circuit as pi/4
// rotations around Paulis", arXiv:1903.12456.
#pragma once

#include "passes/pass.h"

namespace isinglass {

/// Never adds an interaction. Linear in the gates: a rotation looks back over a bounded number of others.
Circuit merge_distant_rotations(Circuit circuit, const PassContext& context);

}  // namespace isinglass
