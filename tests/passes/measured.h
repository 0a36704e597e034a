// What a small program with measurements and resets does, by following every outcome: for each value of the
// bits the density matrix of the kept qubits. Reads circuits as plain data, with the tests' own simulator.
#pragma once

#include <map>
#include <vector>

#include "circuit/circuit.h"
#include "support/simulator.h"

namespace isinglass::support {

/// Unnormalised density matrices by the values of all flat bits.
using Outcomes = std::map<std::vector<bool>, Matrix>;

/// The wires start in `start` (2^wires amplitudes; other wires in |0>). kept: the source qubits whose state
/// is looked at; the others are traced out. Branches are ifs; statements are ends of the program and
/// assignments of bits; expressions are made of bits, ~, &, ^.
Outcomes outcomes_of(const Circuit& circuit, const State& start, const std::vector<std::uint32_t>& kept);

/// Largest difference of any entry.
double distance(const Outcomes& a, const Outcomes& b);

/// Source qubits whose last operation in the body is not a measurement.
std::vector<std::uint32_t> unmeasured_at_end(const Circuit& source);

}  // namespace isinglass::support
