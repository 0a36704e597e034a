// The fewest interactions of any Clifford unitary on two, three or four wires, up to the names of the wires
// at the end.
//
// Idea: one-wire gates cost nothing, so only double cosets of the Clifford group by them need to be told
// apart, and there are few: 2, 6 and 111 with one, two and three wires, a few thousand with four. Going
// breadth first from the identity, a quarter turn a step, gives every class its distance. A circuit follows
// by walking downhill. On the way a class is the set of lines {V X_k V^-1, V Y_k V^-1, V Z_k V^-1}, one for
// each wire, with the letters of each wire renamed so that the description is the least one. The table is
// computed when it is first asked for. Compare Bravyi, Latone, Maslov, "6-qubit optimal Clifford circuits",
// arXiv:2012.06074.
#pragma once

#include <optional>
#include <span>

#include "passes/turns.h"

namespace isinglass {

inline constexpr unsigned most_tabled_wires = 4;

/// Fewest quarter turns of pairs that take the rows of a network (2 a wire, 2 to 4 wires) to single letters
/// on wires of their own.
int clifford_distance(std::span<const Row> rows, bool may_rename);

/// The next quarter turn of a shortest way home; nullopt when there. Rows as above.
std::optional<Turn> clifford_step(std::span<const Row> rows, bool may_rename);

/// Number of classes on that many wires, for tests and the curious.
std::size_t clifford_classes(unsigned wires, bool may_rename);

}  // namespace isinglass
