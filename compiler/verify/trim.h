// Leaving out of a comparison the wires on which nothing happens.
#pragma once

#include <utility>

#include "circuit/circuit.h"

namespace isinglass {

/// Both circuits without the source qubits that neither touches nor moves, and without idle ancillas. What is
/// left is the same program exactly if the whole was. Registers are dropped: wires have no names in the
/// result.
std::pair<Circuit, Circuit> without_idle_wires(const Circuit& source, const Circuit& compiled);

}  // namespace isinglass
