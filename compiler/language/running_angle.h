// Angles that are sums over bits which only the running program knows.
//
//     rz(k * pi / 8) q;    k a uint[3]     ==>     if (k[0]) rz(pi/8) q;
//                                                  if (k[1]) rz(pi/4) q;
//                                                  if (k[2]) rz(pi/2) q;
//
// A gate that is a rotation in one of its angles, G(a) G(b) = G(a + b), takes such a sum bit by bit: n gates
// under a condition each, where a branch over all values would have 2^n arms. (Semiclassical Fourier
// transform: R. B. Griffiths and C.-S. Niu, Phys. Rev. Lett. 76, 3228 (1996), from memory.)
#pragma once

#include <optional>
#include <span>
#include <utility>
#include <vector>

#include "language/gate.h"
#include "language/value.h"

namespace isinglass {

/// fixed + sum of weight * bit, in radians; each bit is an expression of type bit.
struct RunningAngle {
  Angle fixed;
  std::vector<std::pair<Expression, double>> bits;
  /// The language reduces the sum modulo 2 pi, as it does for sums and multiples of angle[n].
  bool wraps = false;
};

/// The angle as a sum over bits of the circuit's variables; nothing where it is no such sum.
std::optional<RunningAngle> running_angle(const Expression& expression, const Circuit& circuit,
                                          const Rules& rules);

/// Whether the gate with these angles, all but that of `which` known, is a rotation in that one.
struct RotationTest {
  bool is_rotation = false;
  bool has_period_2pi = false;
};
RotationTest rotation_in(const GateTemplate& gate, std::span<const Angle> angles, std::size_t which);

}  // namespace isinglass
