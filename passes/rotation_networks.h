// Synthesis from Pauli rotations.
//
//   h a; cx a, b; cx b, c; rz(t) c; cx b, c; cx a, b; h a;   four such ladders in a row, XXZ, XYY, ...
//   become a few interactions with the basis changes shared between all of them
//
// Idea: a straight-line piece is read as rotations about Pauli strings followed by a Clifford, which keeps
// its unitary exactly while all memory of how it was written is lost: only rotations that commute may change
// their order. Several candidates go back to gates: the piece as it stands, its commuting sets diagonalized
// one set after the other, and the greedy network of greedy_network.h with several parameters; the best is
// improved by the windows of window_search.h. The estimated error decides, since fewer interactions may mean
// far more angle. Commuting sets: Cowtan, Simmons, Duncan, "A generic compilation strategy for the unitary
// coupled cluster ansatz", arXiv:2007.10515.
#pragma once

#include "passes/pass.h"

namespace isinglass {

/// Never raises the estimated error of the circuit's interactions. Effort steady takes time in proportion to
/// the circuit; deep goes on until the deadline, or where there is none until a fixed number of windows was
/// tried. Effort quick returns the circuit as it is.
Circuit synthesize_rotation_networks(Circuit circuit, const PassContext& context);

}  // namespace isinglass
