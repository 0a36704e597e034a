// The canonical (Weyl-chamber) decomposition of two-qubit unitaries, and the Schmidt form of two-qubit
// states.
//
//     U = e^{i phase} (after[0] (x) after[1]) exp(-i(x XX + y YY + z ZZ)) (before[0] (x) before[1])
//
// Matrices are indexed first wire + 2 * second wire; [0] belongs to the first wire. Method: in the magic
// basis local unitaries are real and the middle is diagonal (Khaneja, Glaser, Chem. Phys. 267, 11 (2001);
// Kraus, Cirac, PRA 63, 062309 (2001)); the symmetric unitary V^T V is diagonalized by Jacobi rotations that
// treat its real and imaginary part together (Bunse-Gerstner, Byers, Mehrmann, SIAM J. Matrix Anal. Appl. 14,
// 927 (1993)), so that degenerate and nearly local unitaries lose no accuracy.
#pragma once

#include <Eigen/Core>

#include "algebra/su2.h"

namespace isinglass {

using State4 = Eigen::Vector4cd;

/// Canonical coordinates, radians. In the chamber pi/4 >= x >= y >= |z|, and z >= 0 where x = pi/4.
struct Chamber {
  double x = 0;
  double y = 0;
  double z = 0;

  /// Least total interaction in units of pi/2 of xx: Vidal, Hammerer, Cirac, PRL 88, 237902.
  double units() const;
  /// Fewest xx of free angles (0 to 3), coordinates below `tolerance` taken for 0 (computed from the Makhlin
  /// invariants; compare Peterson, Crooks, Smith, arXiv:1904.10541).
  int interactions(double tolerance = 1e-11) const;
};

/// The chamber point of U times SWAP (Cross et al., PRA 100, 032328).
Chamber mirror(const Chamber& point);

struct Canonical {
  Chamber point;
  Su2 before[2];
  Su2 after[2];
  double phase = 0;
};

/// U unitary up to rounding; the result reproduces it to about 1e-15 times a small factor.
Canonical canonical(const Matrix4& u);

/// The point alone.
Chamber chamber_of(const Matrix4& u);

/// after (x) middle (x) before, multiplied out.
Matrix4 matrix_of(const Canonical& form);

/// first (x) second with the index first + 2 * second.
Matrix4 kronecker(const Matrix2& first, const Matrix2& second);
Matrix4 kronecker(const Su2& first, const Su2& second);

/// exp(-i angle/2 (a.sigma)(x)(b.sigma)).
Matrix4 interaction_matrix(const Axis& a, const Axis& b, double angle);

/// The unitary that exchanges two qubits.
Matrix4 swap_matrix();

/// A normalised state of two qubits as e^{i phase} (local[0] (x) local[1]) exp(-i angle/2 X(x)Y) |00>, with
/// angle in [0, pi/2]: one interaction makes any state.
struct Schmidt {
  double angle = 0;
  Su2 local[2];
};
Schmidt schmidt(const State4& state);

}  // namespace isinglass
