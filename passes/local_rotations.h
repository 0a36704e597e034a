// The common ground of the Pauli-rotation passes: a straight-line piece of circuit as rotations about Pauli
// strings of one or two wires.
//
//   cx a, b; rz(0.3) b; cx a, b;   is   Z(90) on a, X(90) on b, ZX(-90), Z(0.3) on b, Z(90) on a, X(90) on b,
//   ZX(-90)
//
// with Z(90) on a standing for exp(-i pi/4 Z). Every unitary with at most one control (and the phase with
// two) has such a form up to its global phase; Clifford gates are the rotations by multiples of pi/2.
#pragma once

#include <functional>
#include <optional>
#include <vector>

#include "algebra/pauli.h"
#include "circuit/circuit.h"

namespace isinglass {

/// exp(-i angle/2 letter[0] (x) letter[1]) on two different wires; letter[1] = I: on wire[0] alone.
struct LocalRotation {
  std::uint32_t wire[2] = {0, 0};
  Letter letter[2] = {Letter::I, Letter::I};
  Angle angle;
  Origin origin;

  bool is_pair() const { return letter[1] != Letter::I; }
};

/// angle / (pi/2) as 0 to 3 where the angle is a known multiple of pi/2 (up to 1e-12): a Clifford rotation.
std::optional<int> quarters_of(Angle angle);

/// Appends the rotations of `op` in time order, or appends nothing and returns false where it has no such
/// form (not unitary, or too many controls).
bool append_rotations(Circuit& circuit, const Operation& op, std::vector<LocalRotation>& rotations);

/// Appends r, xx and rz that perform the rotation; letters Z of a pair get their basis changes. Known angles
/// of xx come out in [-pi/2, pi/2].
void append_gates(Circuit& circuit, const LocalRotation& rotation, Block& block);

/// A piece rewritten: its new rotations, and where what was on a wire is afterwards (moved[i] = {from, to}).
struct RewrittenPiece {
  std::vector<LocalRotation> rotations;
  std::vector<std::pair<std::uint32_t, std::uint32_t>> moved;
};

/// Rewrites one piece; nullopt leaves it as it is. Only where `may_rename` may the result have moved wires.
using PieceRewriter =
    std::function<std::optional<RewrittenPiece>(Circuit&, std::vector<LocalRotation> piece, bool may_rename)>;

/// Cuts all blocks at the operations that have no form as local rotations, and has every piece between them
/// rewritten. Wires may be moved by pieces of the program's block, and what follows is renamed.
void rewrite_pieces(Circuit& circuit, const PieceRewriter& rewrite);

}  // namespace isinglass
