// The canonical decomposition by simultaneous diagonalization in the magic basis; see canonical.h.
#include "algebra/canonical.h"

#include <Eigen/SVD>
#include <algorithm>
#include <array>
#include <cmath>
#include <numbers>

namespace isinglass {

namespace {

using Real4 = Eigen::Matrix4d;

constexpr double pi = std::numbers::pi;
const Complex i_unit(0, 1);

const Matrix4& magic() {
  static const Matrix4 basis = [] {
    const double s = std::sqrt(0.5);
    Matrix4 m;
    m << s, 0, 0, s * i_unit,  //
        0, s * i_unit, s, 0,   //
        0, s * i_unit, -s, 0,  //
        s, 0, 0, -s * i_unit;
    return m;
  }();
  return basis;
}

// Eigenvalues of XX, YY and ZZ on the columns of the magic basis.
constexpr double xx_sign[4] = {1, 1, -1, -1};
constexpr double yy_sign[4] = {-1, 1, -1, 1};
constexpr double zz_sign[4] = {1, -1, -1, 1};

/// One Jacobi rotation in the plane (p, q): a and b become as diagonal as they can be together. Returns the
/// sine of its angle.
double rotate(Real4& a, Real4& b, Real4& vectors, int p, int q) {
  const double difference_a = a(p, p) - a(q, q);
  const double difference_b = b(p, p) - b(q, q);
  const double on = difference_a * difference_a + difference_b * difference_b - 4 * a(p, q) * a(p, q) -
                    4 * b(p, q) * b(p, q);
  const double off = 4 * (difference_a * a(p, q) + difference_b * b(p, q));
  const double angle = 0.25 * std::atan2(off, on);
  const double c = std::cos(angle);
  const double s = std::sin(angle);
  const auto turn = [&](Real4& m) {
    for (int k = 0; k < 4; ++k) {
      const double left = m(k, p);
      const double right = m(k, q);
      m(k, p) = c * left + s * right;
      m(k, q) = c * right - s * left;
    }
  };
  const auto conjugate = [&](Real4& m) {
    turn(m);
    for (int k = 0; k < 4; ++k) {
      const double upper = m(p, k);
      const double lower = m(q, k);
      m(p, k) = c * upper + s * lower;
      m(q, k) = c * lower - s * upper;
    }
  };
  conjugate(a);
  conjugate(b);
  turn(vectors);
  return s;
}

/// Orthogonal P with P^T m P diagonal, for a symmetric unitary m.
Real4 diagonalizer(const Matrix4& m) {
  Real4 a = m.real();
  Real4 b = m.imag();
  Real4 vectors = Real4::Identity();
  for (int sweep = 0; sweep < 30; ++sweep) {
    double largest = 0;
    for (int p = 0; p < 3; ++p) {
      for (int q = p + 1; q < 4; ++q) {
        if (std::abs(a(p, q)) + std::abs(b(p, q)) < 1e-17) continue;
        largest = std::max(largest, std::abs(rotate(a, b, vectors, p, q)));
      }
    }
    if (largest < 1e-9) break;  // converges quadratically: the next sweep would change nothing
  }
  return vectors;
}

/// first (x) second = k up to a phase, which is dropped.
void split(const Matrix4& k, Su2& first, Su2& second) {
  // k(r + 2 R, c + 2 C) = first(r, c) second(R, C): the largest block shows `first`.
  int best_row = 0;
  int best_column = 0;
  double best = -1;
  for (int row = 0; row < 2; ++row) {
    for (int column = 0; column < 2; ++column) {
      const double size = k.block<2, 2>(2 * row, 2 * column).squaredNorm();
      if (size > best) {
        best = size;
        best_row = row;
        best_column = column;
      }
    }
  }
  Matrix2 block = k.block<2, 2>(2 * best_row, 2 * best_column);
  block /= std::sqrt(block.squaredNorm() / 2);
  first = su2_of(block).q;
  const Matrix2 inverse = matrix_of(first).adjoint();
  Matrix2 other;
  for (int row = 0; row < 2; ++row) {
    for (int column = 0; column < 2; ++column) {
      other(row, column) = (inverse * k.block<2, 2>(2 * row, 2 * column)).trace() / 2.0;
    }
  }
  second = su2_of(other).q;
}

Axis unit(int axis) {
  Axis n = Axis::Zero();
  n(axis) = 1;
  return n;
}

/// Moves the coordinates c into the chamber, keeping the product of locals and middle.
class ChamberMoves {
 public:
  ChamberMoves(std::array<double, 3> c, Canonical& form) : c_(c), form_(form) {}

  void run() {
    for (int k = 0; k < 3; ++k) shift(k, std::round(c_[k] / (pi / 2)));
    order(0, 1);
    order(1, 2);
    order(0, 1);
    if (c_[0] < 0) flip(0, 2);
    if (c_[1] < 0) flip(1, 2);
    if (c_[2] < 0 && c_[0] > pi / 4 - 1e-13) {  // the two ends of this edge are one class
      shift(0, 1);
      flip(0, 2);
    }
    form_.point = {c_[0], c_[1], c_[2]};
  }

 private:
  /// exp(-i pi/2 PP) is P on both wires: takes `halves` of them out of the middle.
  void shift(int k, double halves) {
    c_[k] -= halves * (pi / 2);
    if (std::fmod(halves, 2.0) == 0) return;
    for (Su2& local : form_.before) local = rotation(unit(k), pi) * local;
  }

  /// Larger coordinate first; a half turn about the axis between exchanges the two.
  void order(int j, int k) {
    if (std::abs(c_[j]) >= std::abs(c_[k])) return;
    std::swap(c_[j], c_[k]);
    const Su2 turn = rotation((unit(j) + unit(k)) * std::sqrt(0.5), pi);
    for (Su2& local : form_.before) local = turn * local;
    for (Su2& local : form_.after) local = local * turn.conjugate();
  }

  /// A half turn of the first wire about the third axis changes two signs.
  void flip(int j, int k) {
    c_[j] = -c_[j];
    c_[k] = -c_[k];
    const Su2 turn = rotation(unit(3 - j - k), pi);
    form_.before[0] = turn * form_.before[0];
    form_.after[0] = form_.after[0] * turn.conjugate();
  }

  std::array<double, 3> c_;
  Canonical& form_;
};

Matrix4 middle_matrix(const Chamber& point) {
  Matrix4 diagonal = Matrix4::Zero();
  for (int k = 0; k < 4; ++k) {
    diagonal(k, k) = std::polar(1.0, -(point.x * xx_sign[k] + point.y * yy_sign[k] + point.z * zz_sign[k]));
  }
  return magic() * diagonal * magic().adjoint();
}

}  // namespace

double Chamber::units() const {
  return (x + y + std::abs(z)) / (pi / 4);
}

int Chamber::interactions(double tolerance) const {
  if (std::abs(z) > tolerance) return 3;
  if (y > tolerance) return 2;
  return x > tolerance ? 1 : 0;
}

Chamber mirror(const Chamber& point) {
  if (point.z >= 0) return {pi / 4 - point.z, pi / 4 - point.y, point.x - pi / 4};
  return {pi / 4 + point.z, pi / 4 - point.y, pi / 4 - point.x};
}

Canonical canonical(const Matrix4& u) {
  const Matrix4 v = magic().adjoint() * u * magic();
  Real4 p = diagonalizer(v.transpose() * v);
  if (p.determinant() < 0) p.col(0) = -p.col(0);
  // v p = o diag(e^{i angle}) with o real orthogonal; a column's sign may go into its angle.
  const Matrix4 turned = v * p.cast<Complex>();
  std::array<double, 4> angle;
  Real4 o;
  for (int k = 0; k < 4; ++k) {
    const Complex square = (turned.col(k).transpose() * turned.col(k))(0, 0);
    angle[k] = std::arg(square) / 2;
    o.col(k) = (turned.col(k) * std::polar(1.0, -angle[k])).real();
    o.col(k).normalize();
  }
  if (o.determinant() < 0) {
    o.col(0) = -o.col(0);
    angle[0] += pi;
  }
  Canonical form;
  split(magic() * o.cast<Complex>() * magic().adjoint(), form.after[0], form.after[1]);
  split(magic() * p.transpose().cast<Complex>() * magic().adjoint(), form.before[0], form.before[1]);
  // angle[k] = mean - (x xx_sign + y yy_sign + z zz_sign)[k], signs orthogonal to each other and to 1.
  std::array<double, 3> c = {0, 0, 0};
  for (int k = 0; k < 4; ++k) {
    c[0] -= xx_sign[k] * angle[k] / 4;
    c[1] -= yy_sign[k] * angle[k] / 4;
    c[2] -= zz_sign[k] * angle[k] / 4;
  }
  ChamberMoves(c, form).run();
  const Matrix4 product = matrix_of(form);
  form.phase = std::arg((product.adjoint() * u).trace());
  return form;
}

Chamber chamber_of(const Matrix4& u) {
  return canonical(u).point;
}

Matrix4 matrix_of(const Canonical& form) {
  return std::polar(1.0, form.phase) * kronecker(form.after[0], form.after[1]) * middle_matrix(form.point) *
         kronecker(form.before[0], form.before[1]);
}

Matrix4 kronecker(const Matrix2& first, const Matrix2& second) {
  Matrix4 m;
  for (int row = 0; row < 2; ++row) {
    for (int column = 0; column < 2; ++column) {
      m.block<2, 2>(2 * row, 2 * column) = second(row, column) * first;
    }
  }
  return m;
}

Matrix4 kronecker(const Su2& first, const Su2& second) {
  return kronecker(matrix_of(first), matrix_of(second));
}

Matrix4 interaction_matrix(const Axis& a, const Axis& b, double angle) {
  const auto sigma = [](const Axis& n) {
    Matrix2 m;
    m << n.z(), Complex(n.x(), -n.y()), Complex(n.x(), n.y()), -n.z();
    return m;
  };
  return std::cos(angle / 2) * Matrix4::Identity() -
         i_unit * std::sin(angle / 2) * kronecker(sigma(a), sigma(b));
}

Matrix4 swap_matrix() {
  Matrix4 m = Matrix4::Zero();
  m(0, 0) = m(1, 2) = m(2, 1) = m(3, 3) = 1;
  return m;
}

// exp(-i t/2 X(x)Y) |00> = cos(t/2) |00> + sin(t/2) |11>.
Schmidt schmidt(const State4& state) {
  Matrix2 amplitude;  // row = first wire, column = second
  amplitude << state(0), state(2), state(1), state(3);
  const Eigen::JacobiSVD<Matrix2, Eigen::NoQRPreconditioner> svd(amplitude,
                                                                 Eigen::ComputeFullU | Eigen::ComputeFullV);
  Schmidt form;
  form.angle = 2 * std::atan2(svd.singularValues()(1), svd.singularValues()(0));
  // amplitude = U diag V^+, so the locals are U and the conjugate of V; their phases act on |00> and |11>
  // differently unless both have determinant 1 together.
  const PhasedSu2 first = su2_of(svd.matrixU());
  const PhasedSu2 second = su2_of(svd.matrixV().conjugate());
  form.local[0] = first.q;
  form.local[1] = second.q;
  return form;
}

}  // namespace isinglass
