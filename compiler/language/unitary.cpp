// Powers and synthesis of small unitaries; see unitary.h.
#include "language/unitary.h"

#include <Eigen/Eigenvalues>
#include <Eigen/QR>
#include <Eigen/SVD>
#include <cmath>
#include <complex>

#include "language/value.h"

namespace isinglass {

namespace {

using Complex = std::complex<double>;
using Matrix = Eigen::MatrixXcd;
using Wires = std::span<const std::uint32_t>;

constexpr double tiny = 1e-12;

/// Applies one act to all columns: rows are mixed within the subspace where the controls are 1.
void apply(const Act& act, Matrix& matrix, Wires wires) {
  if (act.kind == Kind::barrier) return;
  Operation op;
  op.kind = act.kind;
  for (int i = 0; i < 3; ++i) {
    const Angle angle = act.angles[static_cast<std::size_t>(i)];
    if (!angle.is_known()) throw Fault{"this power needs angles that are known while compiling", {}};
    op.set_angle(i, angle);
  }
  const auto small = matrix_of(op);
  std::vector<std::size_t> places;
  for (const std::uint32_t wire : act.wires) {
    std::size_t place = 0;
    while (wires[place] != wire) ++place;
    places.push_back(place);
  }
  const std::size_t controls = act.control_count();
  std::size_t control_mask = 0;
  for (std::size_t i = 0; i < controls; ++i) control_mask |= std::size_t(1) << places[i];
  const std::size_t targets = places.size() - controls;
  const std::size_t dimension = std::size_t(1) << targets;
  std::size_t target_mask = 0;
  std::vector<std::size_t> offset(dimension, 0);
  for (std::size_t i = 0; i < targets; ++i) {
    const std::size_t bit = std::size_t(1) << places[controls + i];
    target_mask |= bit;
    for (std::size_t j = 0; j < dimension; ++j) {
      if (j >> i & 1) offset[j] |= bit;
    }
  }
  Matrix rows(dimension, matrix.cols());
  for (std::size_t base = 0; base < static_cast<std::size_t>(matrix.rows()); ++base) {
    if ((base & control_mask) != control_mask || (base & target_mask) != 0) continue;
    for (std::size_t j = 0; j < dimension; ++j) {
      rows.row(static_cast<Eigen::Index>(j)) = matrix.row(static_cast<Eigen::Index>(base | offset[j]));
    }
    for (std::size_t i = 0; i < dimension; ++i) {
      auto row = matrix.row(static_cast<Eigen::Index>(base | offset[i]));
      row.setZero();
      for (std::size_t j = 0; j < dimension; ++j) {
        row += small[i * dimension + j] * rows.row(static_cast<Eigen::Index>(j));
      }
    }
  }
}

struct Normal {
  Matrix vectors;
  Eigen::VectorXcd values;
};

/// A unitary is normal, so its Schur form is diagonal up to rounding.
Normal diagonalized(const Matrix& unitary) {
  const Eigen::ComplexSchur<Matrix> schur(unitary);
  return {schur.matrixU(), schur.matrixT().diagonal()};
}

void add(Acts& acts, Kind kind, std::initializer_list<std::uint32_t> wires,
         std::initializer_list<double> angles = {}) {
  Act act;
  act.kind = kind;
  act.wires = wires;
  std::size_t i = 0;
  for (const double angle : angles) act.angles[i++] = {angle, 0};
  acts.push_back(std::move(act));
}

void add_one_qubit(Acts& acts, const Matrix& v, std::uint32_t wire) {
  const double theta = 2 * std::atan2(std::abs(v(1, 0)), std::abs(v(0, 0)));
  double phi = 0;
  double lambda = 0;
  double phase = 0;
  if (std::abs(v(0, 0)) > tiny) {
    phase = std::arg(v(0, 0)) - theta / 2;
    const double both = std::arg(v(1, 1)) - std::arg(v(0, 0));
    phi = std::abs(v(1, 0)) > tiny ? std::arg(v(1, 0)) - std::arg(v(0, 0)) : 0;
    lambda = both - phi;
  } else {
    phase = std::arg(-v(0, 1)) - theta / 2;
    phi = std::arg(v(1, 0)) - theta / 2 - phase;
  }
  if (std::abs(wrapped(phase)) > 1e-15) add(acts, Kind::phase, {}, {wrapped(phase)});
  if (theta <= tiny) {
    if (std::abs(wrapped(phi + lambda)) > 1e-15) add(acts, Kind::p, {wire}, {wrapped(phi + lambda)});
  } else {
    add(acts, Kind::u, {wire}, {theta, wrapped(phi), wrapped(lambda)});
  }
}

/// A rotation of `target` about z or y by angles[j], where j is the number that the controls hold.
void add_multiplexed(Acts& acts, Kind kind, std::vector<double> angles, Wires controls,
                     std::uint32_t target) {
  if (controls.empty()) {
    if (std::abs(angles[0]) <= 1e-15) return;
    if (kind == Kind::rz) {
      add(acts, Kind::rz, {target}, {angles[0]});
    } else {
      add(acts, Kind::r, {target}, {angles[0], pi / 2});
    }
    return;
  }
  const std::size_t half = angles.size() / 2;
  std::vector<double> mean(half);
  std::vector<double> difference(half);
  double largest = 0;
  for (std::size_t j = 0; j < half; ++j) {
    mean[j] = (angles[j] + angles[j + half]) / 2;
    difference[j] = (angles[j] - angles[j + half]) / 2;
    largest = std::max(largest, std::abs(difference[j]));
  }
  const Wires rest = controls.first(controls.size() - 1);
  add_multiplexed(acts, kind, std::move(mean), rest, target);
  if (largest <= 1e-15) return;
  add(acts, Kind::x, {controls.back(), target});
  add_multiplexed(acts, kind, std::move(difference), rest, target);
  add(acts, Kind::x, {controls.back(), target});
}

void add_unitary(Acts& acts, const Matrix& u, Wires wires);

/// diag(a, b) on the last wire: a where it is 0, b where it is 1.
void add_multiplexer(Acts& acts, const Matrix& a, const Matrix& b, Wires wires) {
  const Wires rest = wires.first(wires.size() - 1);
  if ((a - b).norm() < tiny) return add_unitary(acts, a, rest);
  const Normal normal = diagonalized(a * b.adjoint());
  Eigen::VectorXcd root(a.rows());
  std::vector<double> angles;
  for (Eigen::Index j = 0; j < a.rows(); ++j) {
    const double half = std::arg(normal.values(j)) / 2;
    root(j) = std::polar(1.0, half);
    angles.push_back(-2 * half);
  }
  const Matrix inverse_root = root.conjugate().asDiagonal();
  add_unitary(acts, inverse_root * normal.vectors.adjoint() * a, rest);
  add_multiplexed(acts, Kind::rz, std::move(angles), rest, wires.back());
  add_unitary(acts, normal.vectors, rest);
}

/// The cosine-sine decomposition u = diag(v1, v2) [c -s; s c] diag(w1, w2) in halves.
struct CosineSine {
  Matrix v1, v2, w1, w2;
  std::vector<double> angle;  // cos(angle/2) = c
};

CosineSine cosine_sine(const Matrix& u) {
  const Eigen::Index h = u.rows() / 2;
  const Eigen::JacobiSVD<Matrix> svd(u.topLeftCorner(h, h), Eigen::ComputeFullU | Eigen::ComputeFullV);
  // Ascending cosines put the largest sines first, so that the QR below meets its well-defined columns first.
  CosineSine result;
  result.v1 = svd.matrixU().rowwise().reverse();
  const Matrix w = svd.matrixV().rowwise().reverse();
  result.w1 = w.adjoint();
  const Matrix below = u.bottomLeftCorner(h, h) * w;
  const Eigen::HouseholderQR<Matrix> qr(below);
  result.v2 = qr.householderQ();
  Eigen::VectorXd c = svd.singularValues().reverse();
  Eigen::VectorXd s(h);
  for (Eigen::Index j = 0; j < h; ++j) {
    const Complex diagonal = qr.matrixQR()(j, j);
    s(j) = std::abs(diagonal);
    if (s(j) > tiny) result.v2.col(j) *= diagonal / s(j);
    const double length = std::hypot(c(j), s(j));
    c(j) /= length;
    s(j) /= length;
    result.angle.push_back(2 * std::atan2(s(j), c(j)));
  }
  result.w2 = -(s.asDiagonal() * (result.v1.adjoint() * u.topRightCorner(h, h))) +
              c.asDiagonal() * (result.v2.adjoint() * u.bottomRightCorner(h, h));
  return result;
}

void add_unitary(Acts& acts, const Matrix& u, Wires wires) {
  if (wires.empty()) {
    if (std::abs(std::arg(u(0, 0))) > 1e-15) add(acts, Kind::phase, {}, {std::arg(u(0, 0))});
    return;
  }
  if (wires.size() == 1) return add_one_qubit(acts, u, wires[0]);
  const Eigen::Index h = u.rows() / 2;
  if (u.topRightCorner(h, h).norm() < tiny && u.bottomLeftCorner(h, h).norm() < tiny) {
    return add_multiplexer(acts, u.topLeftCorner(h, h), u.bottomRightCorner(h, h), wires);
  }
  CosineSine parts = cosine_sine(u);
  add_multiplexer(acts, parts.w1, parts.w2, wires);
  add_multiplexed(acts, Kind::r, std::move(parts.angle), wires.first(wires.size() - 1), wires.back());
  add_multiplexer(acts, parts.v1, parts.v2, wires);
}

}  // namespace

Matrix matrix_of(const Acts& acts, Wires wires) {
  const Eigen::Index dimension = Eigen::Index(1) << wires.size();
  Matrix matrix = Matrix::Identity(dimension, dimension);
  for (const Act& act : acts) apply(act, matrix, wires);
  return matrix;
}

Matrix principal_power(const Matrix& unitary, double exponent) {
  const Normal normal = diagonalized(unitary);
  Eigen::VectorXcd powers(unitary.rows());
  for (Eigen::Index j = 0; j < unitary.rows(); ++j) {
    double phase = std::arg(normal.values(j));
    if (phase < -pi + 1e-9) phase = pi;
    powers(j) = std::polar(1.0, phase * exponent);
  }
  return normal.vectors * powers.asDiagonal() * normal.vectors.adjoint();
}

Acts synthesized(const Matrix& unitary, Wires wires) {
  Acts acts;
  add_unitary(acts, unitary, wires);
  return acts;
}

}  // namespace isinglass
