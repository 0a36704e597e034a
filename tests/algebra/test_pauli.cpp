// Pauli strings and Clifford tableaus against dense matrices built here from the definitions.
#include <doctest/doctest.h>

#include <Eigen/Dense>
#include <complex>
#include <random>
#include <unsupported/Eigen/KroneckerProduct>

#include "algebra/pauli.h"
#include "algebra/tableau.h"

using namespace isinglass;

namespace {

using Matrix = Eigen::MatrixXcd;
const std::complex<double> i(0, 1);

Matrix dense(Letter letter) {
  Matrix m(2, 2);
  switch (letter) {
    case Letter::I:
      m << 1, 0, 0, 1;
      break;
    case Letter::X:
      m << 0, 1, 1, 0;
      break;
    case Letter::Y:
      m << 0, -i, i, 0;
      break;
    case Letter::Z:
      m << 1, 0, 0, -1;
      break;
  }
  return m;
}

Matrix dense(const PauliString& string) {
  Matrix m = Matrix::Identity(1, 1);
  for (std::size_t q = 0; q < string.qubits(); ++q)
    m = Eigen::kroneckerProduct(dense(string.letter(q)), m).eval();
  return string.negative ? Matrix(-m) : m;
}

/// exp(-i angle/2 axis)
Matrix turn(const PauliString& axis, double angle) {
  const Matrix m = dense(axis);
  return std::cos(angle / 2) * Matrix::Identity(m.rows(), m.cols()) - i * std::sin(angle / 2) * m;
}

PauliString random_string(std::size_t qubits, std::mt19937_64& random) {
  PauliString string(qubits);
  for (std::size_t q = 0; q < qubits; ++q) string.set(q, static_cast<Letter>(random() % 4));
  string.negative = random() % 2;
  return string;
}

}  // namespace

TEST_CASE("Pauli strings: text, letters, weight") {
  const PauliString string = PauliString::from_text("-XIYZ");
  CHECK(string.text() == "-XIYZ");
  CHECK(string.letter(2) == Letter::Y);
  CHECK(string.weight() == 3);
  CHECK(string.negative);
  CHECK_THROWS(PauliString::from_text("XQ"));
}

TEST_CASE("Pauli strings: products and commutation agree with matrices") {
  std::mt19937_64 random(1);
  for (int round = 0; round < 300; ++round) {
    const PauliString a = random_string(3, random), b = random_string(3, random);
    PauliString product = a;
    const int phase = product.multiply(b);
    const Matrix expected = dense(a) * dense(b);
    CHECK((std::pow(i, phase) * dense(product) - expected).norm() < 1e-12);
    CHECK(a.commutes_with(b) == ((expected - dense(b) * dense(a)).norm() < 1e-12));
  }
}

TEST_CASE("Pauli strings: conjugation by quarter turns agrees with matrices") {
  std::mt19937_64 random(2);
  for (int round = 0; round < 300; ++round) {
    const PauliString string = random_string(3, random), axis = random_string(3, random);
    const int quarters = static_cast<int>(random() % 7) - 3;
    PauliString turned = string;
    turned.conjugate(axis, quarters);
    const Matrix g = turn(axis, quarters * 3.14159265358979323846 / 2);
    CHECK((dense(turned) - g * dense(string) * g.adjoint()).norm() < 1e-12);
  }
}

TEST_CASE("Pauli strings: beyond one word") {
  std::mt19937_64 random(3);
  for (int round = 0; round < 50; ++round) {
    const PauliString a = random_string(150, random), b = random_string(150, random);
    int anticommuting = 0, phase = 0;
    PauliString product = a;
    const int k = product.multiply(b);
    for (std::size_t q = 0; q < 150; ++q) {
      anticommuting += !commute(a.letter(q), b.letter(q));
      phase += product_phase(a.letter(q), b.letter(q));
      CHECK(product.letter(q) == a.letter(q) * b.letter(q));
    }
    CHECK(a.commutes_with(b) == (anticommuting % 2 == 0));
    CHECK(k == ((phase % 4) + 4) % 4);
  }
}

TEST_CASE("tableaus: images, inverse and composition agree with matrices") {
  std::mt19937_64 random(4);
  for (int round = 0; round < 40; ++round) {
    Tableau tableau(3), other(3);
    Matrix v = Matrix::Identity(8, 8), w = v;
    for (int step = 0; step < 12; ++step) {
      const PauliString axis = random_string(3, random);
      const int quarters = static_cast<int>(random() % 4);
      const Matrix g = turn(axis, quarters * 3.14159265358979323846 / 2);
      switch (random() % 3) {
        case 0:
          tableau.append(axis, quarters);
          v = g * v;
          break;
        case 1:
          tableau.prepend(axis, quarters);
          v = v * g;
          break;
        default:
          other.append(axis, quarters);
          w = g * w;
      }
    }
    const PauliString string = random_string(3, random);
    CHECK((dense(tableau.image(string)) - v * dense(string) * v.adjoint()).norm() < 1e-10);
    CHECK((dense(tableau.inverse().image(string)) - v.adjoint() * dense(string) * v).norm() < 1e-10);
    CHECK((dense(tableau.then(other).image(string)) - w * v * dense(string) * v.adjoint() * w.adjoint())
              .norm() < 1e-10);
    CHECK((dense(tableau.image(1, Letter::Y, 2, Letter::X)) -
           v * dense(PauliString::from_text("IYX")) * v.adjoint())
              .norm() < 1e-10);
    CHECK(tableau.then(tableau.inverse()) == Tableau(3));
  }
}
