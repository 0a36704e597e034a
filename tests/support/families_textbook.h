// Circuits that every textbook has, and random ones of two qubits; and circuits as networks of rotations.
#pragma once

#include <optional>

#include "circuit/circuit.h"
#include "passes/turns.h"
#include "support/random_circuits.h"

namespace isinglass::support {

/// Textbook QFT: h, controlled phases of pi/2^k, final swaps.
Circuit fourier(std::uint32_t n);

/// Any two-qubit unitary as the random words of a source: three interactions and locals are not assumed.
Circuit random_pair(Random& random);

/// A circuit of at most 64 wires as rotations and a Clifford; empty where an operation is no product of
/// rotations.
std::optional<Network> network_of_circuit(const Circuit& circuit);

}  // namespace isinglass::support
