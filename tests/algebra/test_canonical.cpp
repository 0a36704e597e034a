// Euler forms, the canonical decomposition and the Schmidt form, against their definitions and published
// facts.
#include <doctest/doctest.h>

#include <Eigen/QR>
#include <cmath>
#include <numbers>
#include <random>

#include "algebra/canonical.h"

using namespace isinglass;

namespace {

constexpr double pi = std::numbers::pi;

/// Haar-random unitary: QR of a Gaussian matrix with the phases of R taken out (common practice).
template <int N>
Eigen::Matrix<Complex, N, N> haar(std::mt19937_64& random) {
  std::normal_distribution<double> normal;
  Eigen::Matrix<Complex, N, N> g;
  for (int i = 0; i < N; ++i) {
    for (int j = 0; j < N; ++j) g(i, j) = Complex(normal(random), normal(random));
  }
  Eigen::HouseholderQR<Eigen::Matrix<Complex, N, N>> qr(g);
  Eigen::Matrix<Complex, N, N> q = qr.householderQ();
  for (int j = 0; j < N; ++j) q.col(j) *= qr.matrixQR()(j, j) / std::abs(qr.matrixQR()(j, j));
  return q;
}

Matrix4 local(std::mt19937_64& random) {
  return kronecker(Matrix2(haar<2>(random)), Matrix2(haar<2>(random)));
}

Matrix4 middle(double x, double y, double z) {
  return interaction_matrix(Axis::UnitX(), Axis::UnitX(), 2 * x) *
         interaction_matrix(Axis::UnitY(), Axis::UnitY(), 2 * y) *
         interaction_matrix(Axis::UnitZ(), Axis::UnitZ(), 2 * z);
}

void check_form(const Matrix4& u) {
  const Canonical form = canonical(u);
  CHECK((matrix_of(form) - u).norm() < 2e-14);
  const Chamber& p = form.point;
  CHECK(p.x <= pi / 4 + 1e-14);
  CHECK(p.x >= p.y);
  CHECK(p.y >= std::abs(p.z));
}

/// Distance of two matrices up to a global phase.
template <typename M>
double apart(const M& a, const M& b) {
  const Complex overlap = (a.adjoint() * b).trace();
  return (a * (overlap / std::abs(overlap)) - b).norm();
}

}  // namespace

TEST_CASE("pulse forms reproduce any one-qubit unitary") {
  std::mt19937_64 random(1);
  const auto check = [](const Matrix2& u) {
    const PhasedSu2 split = su2_of(u);
    CHECK((std::polar(1.0, split.phase) * matrix_of(split.q) - u).norm() < 1e-14);
    const PulseForm form = pulse_form(split.q);
    CHECK(form.theta >= 0);
    CHECK(form.theta <= pi);
    CHECK(std::abs(form.phi) <= pi);
    CHECK(std::abs(form.alpha) <= pi);
    const Matrix2 back = matrix_of(Su2(rotation_z(form.alpha) * rotation_xy(form.theta, form.phi)));
    CHECK(apart(back, u) < 1e-14);
    const AxisAngle turn = axis_angle(split.q);
    CHECK((matrix_of(rotation(turn.axis, turn.angle)) - matrix_of(split.q)).norm() < 1e-14);
  };
  for (int i = 0; i < 1000; ++i) check(haar<2>(random));
  for (const double tiny : {0.0, 1e-17, 1e-15, 1e-12, 1e-9, 1e-6}) {
    for (const Axis& n : {Axis::UnitX().eval(), Axis::UnitY().eval(), Axis::UnitZ().eval()}) {
      for (const Axis& m : {Axis::UnitX().eval(), Axis::UnitY().eval(), Axis::UnitZ().eval()}) {
        for (const double big : {0.0, pi / 2, pi, -pi, 2 * pi}) {
          check(matrix_of(Su2(rotation(n, big) * rotation(m, tiny))));
        }
      }
    }
  }
}

TEST_CASE("matrices are those of the conventions") {
  const Complex i(0, 1);
  Matrix2 x, y, z;
  x << 0, 1, 1, 0;
  y << 0, -i, i, 0;
  z << 1, 0, 0, -1;
  const auto power = [&](const Matrix2& p, double t) -> Matrix2 {
    return std::cos(t / 2) * Matrix2::Identity() - i * std::sin(t / 2) * p;
  };
  CHECK((matrix_of(rotation_x(0.7)) - power(x, 0.7)).norm() < 1e-15);
  CHECK((matrix_of(rotation_y(0.7)) - power(y, 0.7)).norm() < 1e-15);
  CHECK((matrix_of(rotation_z(0.7)) - power(z, 0.7)).norm() < 1e-15);
  const Matrix2 tilted = std::cos(0.3) * x + std::sin(0.3) * y;
  CHECK((matrix_of(rotation_xy(0.7, 0.3)) - power(tilted, 0.7)).norm() < 1e-15);
  CHECK((matrix_of(rotation(equatorial(0.3), 0.7)) - power(tilted, 0.7)).norm() < 1e-15);
  // Products of quaternions are products of matrices.
  const Su2 product = rotation_x(0.4) * rotation_y(1.1);
  CHECK((matrix_of(product) - matrix_of(rotation_x(0.4)) * matrix_of(rotation_y(1.1))).norm() < 1e-15);
  // The first wire is the low bit.
  CHECK(std::abs(kronecker(x, Matrix2(Matrix2::Identity()))(1, 0) - 1.0) < 1e-15);
}

TEST_CASE("canonical form of Haar-random unitaries; averages") {
  std::mt19937_64 random(2);
  double x = 0, y = 0, z = 0, mirrored = 0;
  int perfect = 0;
  constexpr int samples = 40000;
  for (int i = 0; i < samples; ++i) {
    const Matrix4 u = haar<4>(random);
    const Chamber p = canonical(u).point;
    if (i < 2000) check_form(u);
    x += p.x / (pi / 4);
    y += p.y / (pi / 4);
    z += std::abs(p.z) / (pi / 4);
    mirrored += std::min(p.units(), mirror(p).units());
    // Perfect entanglers in this chamber: x + y >= pi/4 and y + |z| <= pi/4.
    if (p.x + p.y >= pi / 4 && p.y + std::abs(p.z) <= pi / 4) ++perfect;
    CHECK(p.interactions() == 3);
  }
  // Watts, O'Connor, Vala, Entropy 2013 (from memory); computed.
  CHECK(x / samples == doctest::Approx(0.8401).epsilon(0.01));
  CHECK(y / samples == doctest::Approx(0.5000).epsilon(0.01));
  CHECK(z / samples == doctest::Approx(0.1599).epsilon(0.02));
  CHECK((x + y + z) / samples == doctest::Approx(1.5000).epsilon(0.005));
  CHECK(mirrored / samples == doctest::Approx(1.2722).epsilon(0.005));
  CHECK(double(perfect) / samples == doctest::Approx(8 / (3 * pi)).epsilon(0.01));
}

TEST_CASE("degenerate and nearly local unitaries lose no accuracy") {
  std::mt19937_64 random(3);
  const double values[] = {0,   1e-15,  1e-12,         1e-10,  1e-8,   1e-5,
                           0.1, pi / 8, pi / 4 - 1e-9, pi / 4, pi / 2, -0.3};
  for (const double a : values) {
    for (const double b : values) {
      for (const double c : values) {
        check_form(middle(a, b, c));
        check_form(local(random) * middle(a, b, c) * local(random));
      }
    }
  }
}

TEST_CASE("coordinates are found to 1e-12, small ones too") {
  std::mt19937_64 random(4);
  for (const double small : {1e-3, 1e-6, 1e-9, 1e-10}) {
    for (const double x : {0.2, 0.7, 10 * small}) {
      const Chamber p = canonical(local(random) * middle(x, 2 * small, small) * local(random)).point;
      CHECK(std::abs(p.x - x) < 1e-14);
      CHECK(std::abs(p.y - 2 * small) < 1e-14);
      CHECK(std::abs(p.z - small) < 1e-14);
      CHECK(p.interactions() == 3);
    }
  }
}

TEST_CASE("known points of the chamber") {
  const auto point = [](const Matrix4& u) { return canonical(u).point; };
  Matrix4 cnot = Matrix4::Zero();
  cnot(0, 0) = cnot(2, 2) = cnot(3, 1) = cnot(1, 3) = 1;
  // Least total interaction (Vidal, Hammerer, Cirac, PRL 88, 237902): CNOT 1, iSWAP 2, SWAP 3, controlled
  // sqrt(X) 1/2.
  CHECK(point(cnot).units() == doctest::Approx(1));
  CHECK(point(cnot).interactions() == 1);
  CHECK(point(swap_matrix()).units() == doctest::Approx(3));
  CHECK(point(swap_matrix()).interactions() == 3);
  CHECK(point(middle(pi / 4, pi / 4, 0)).units() == doctest::Approx(2));
  CHECK(point(middle(pi / 4, pi / 4, 0)).interactions() == 2);
  Matrix4 root = Matrix4::Identity();
  const Complex i(0, 1);
  root(1, 1) = root(3, 3) = (1.0 + i) / 2.0;
  root(1, 3) = root(3, 1) = (1.0 - i) / 2.0;
  CHECK(point(root).units() == doctest::Approx(0.5));
  CHECK(point(Matrix4::Identity()).interactions() == 0);
}

TEST_CASE("equivalent points and mirrors") {
  std::mt19937_64 random(5);
  std::uniform_real_distribution<double> uniform(0, pi / 4);
  for (int i = 0; i < 500; ++i) {
    const Matrix4 u = haar<4>(random);
    const Chamber p = canonical(u).point;
    // (x, y, z) ~ (pi/2 - x, y, -z): Hammerer, Vidal, Cirac, quant-ph/0205100 (from memory); computed.
    const Chamber q = canonical(middle(pi / 2 - p.x, p.y, -p.z)).point;
    CHECK(std::abs(p.x - q.x) + std::abs(p.y - q.y) + std::abs(p.z - q.z) < 1e-13);
    // Cross et al., PRA 100, 032328 (from memory); computed.
    const Chamber m = mirror(p);
    const Chamber s = canonical(u * swap_matrix()).point;
    CHECK(std::abs(m.x - s.x) + std::abs(m.y - s.y) + std::abs(m.z - s.z) < 1e-13);
  }
}

TEST_CASE("any state of two qubits is one interaction away from |00>") {
  std::mt19937_64 random(6);
  const auto check = [](const State4& state) {
    const Schmidt form = schmidt(state);
    CHECK(form.angle >= 0);
    CHECK(form.angle <= pi / 2 + 1e-14);
    const State4 made = kronecker(form.local[0], form.local[1]) *
                        interaction_matrix(Axis::UnitX(), Axis::UnitY(), form.angle).col(0);
    CHECK(std::abs(made.dot(state)) == doctest::Approx(1).epsilon(1e-14));
  };
  for (int i = 0; i < 1000; ++i) check(haar<4>(random).col(0));
  for (int i = 0; i < 100; ++i) check(local(random).col(i % 4));
  State4 bell(std::sqrt(0.5), 0, 0, std::sqrt(0.5));
  check(bell);
  CHECK(schmidt(bell).angle == doctest::Approx(pi / 2));
}
