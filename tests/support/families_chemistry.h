// Circuits of quantum chemistry from first principles: unitary coupled cluster with singles and doubles.
#pragma once

#include "circuit/circuit.h"

namespace isinglass::support {

/// exp(T - T^+) for all spin-conserving single and double excitations, one after another (singles first),
/// each as its commuting Pauli rotations under the Jordan-Wigner transformation, each rotation as a textbook
/// ladder of CNOTs. Spin orbital 2i + s is qubit 2i + s (s = 0, 1 the spin); electrons/2 orbitals of each
/// spin are occupied. Amplitudes are small invented numbers, or one input each when `symbolic`. No
/// preparation of the reference state.
Circuit unitary_coupled_cluster(unsigned qubits, unsigned electrons, bool symbolic, std::uint64_t seed);

}  // namespace isinglass::support
