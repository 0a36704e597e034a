// Physical qubits: the source's `$k` is ion k of the machine, from start to end.
//
// Such a wire is a register of its own whose name is the source's, `$k`. It is never renamed and never moved.
#pragma once

#include <cstdint>
#include <vector>

#include "circuit/circuit.h"

namespace isinglass {

inline constexpr std::uint32_t no_ion = 0xffffffffu;

/// ion[w]: the ion that wire w must stay on, or no_ion where the compiler is free to choose.
std::vector<std::uint32_t> pinned_ions(const Circuit& circuit);

/// Whether the source names any physical qubit.
bool has_pinned(const Circuit& circuit);

/// The fewest ions that a machine may have on which the source fits: one a qubit, and ion k for `$k`.
std::uint32_t ions_wanted(const Circuit& circuit);

}  // namespace isinglass
