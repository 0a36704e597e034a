// Matrices of the standard gate library; see standard_gates.h.
#include "support/standard_gates.h"

#include <Eigen/Eigenvalues>
#include <cmath>
#include <stdexcept>

namespace isinglass::support {

namespace {

using Values = std::vector<double>;

const Complex i(0, 1);

/// The standard's U from its formula, phase included.
Matrix standard_u(double t, double f, double l) {
  Matrix m(2, 2);
  m << 1.0 + std::exp(i * t), -i * std::exp(i * l) * (1.0 - std::exp(i * t)),
      i * std::exp(i * f) * (1.0 - std::exp(i * t)), std::exp(i * (f + l)) * (1.0 + std::exp(i * t));
  return m / 2.0;
}

Matrix euler(double t, double f, double l) {
  return std::exp(-i * (t + f + l) / 2.0) * standard_u(t, f, l);
}

const Matrix hadamard = (pauli_x() + pauli_z()) / std::sqrt(2.0);

Matrix root_of_x() {
  Matrix m(2, 2);
  m << 1.0 + i, 1.0 - i, 1.0 - i, 1.0 + i;
  return m / 2.0;
}

Matrix swapped() {
  Matrix m = Matrix::Zero(4, 4);
  m(0, 0) = m(1, 2) = m(2, 1) = m(3, 3) = 1;
  return m;
}

}  // namespace

Matrix diagonal_phase(double l) {
  Matrix m = Matrix::Identity(2, 2);
  m(1, 1) = std::exp(i * l);
  return m;
}

const std::vector<StandardGate>& standard_gates() {
  static const std::vector<StandardGate> gates = {
      {"p", 1, 1, [](const Values& v) { return diagonal_phase(v[0]); }},
      {"x", 0, 1, [](const Values&) { return pauli_x(); }},
      {"y", 0, 1, [](const Values&) { return pauli_y(); }},
      {"z", 0, 1, [](const Values&) { return pauli_z(); }},
      {"h", 0, 1, [](const Values&) { return hadamard; }},
      {"s", 0, 1, [](const Values&) { return diagonal_phase(pi / 2); }},
      {"sdg", 0, 1, [](const Values&) { return diagonal_phase(-pi / 2); }},
      {"t", 0, 1, [](const Values&) { return diagonal_phase(pi / 4); }},
      {"tdg", 0, 1, [](const Values&) { return diagonal_phase(-pi / 4); }},
      {"sx", 0, 1, [](const Values&) { return root_of_x(); }},
      {"rx", 1, 1, [](const Values& v) { return rotation(v[0], pauli_x()); }},
      {"ry", 1, 1, [](const Values& v) { return rotation(v[0], pauli_y()); }},
      {"rz", 1, 1, [](const Values& v) { return rotation(v[0], pauli_z()); }},
      {"cx", 0, 2, [](const Values&) { return controlled(pauli_x()); }},
      {"cy", 0, 2, [](const Values&) { return controlled(pauli_y()); }},
      {"cz", 0, 2, [](const Values&) { return controlled(pauli_z()); }},
      {"cp", 1, 2, [](const Values& v) { return controlled(diagonal_phase(v[0])); }},
      {"crx", 1, 2, [](const Values& v) { return controlled(rotation(v[0], pauli_x())); }},
      {"cry", 1, 2, [](const Values& v) { return controlled(rotation(v[0], pauli_y())); }},
      {"crz", 1, 2, [](const Values& v) { return controlled(rotation(v[0], pauli_z())); }},
      {"ch", 0, 2, [](const Values&) { return controlled(hadamard); }},
      {"swap", 0, 2, [](const Values&) { return swapped(); }},
      {"ccx", 0, 3, [](const Values&) { return controlled(pauli_x(), 2); }},
      {"cswap", 0, 3, [](const Values&) { return controlled(swapped()); }},
      // The definition in the file: the phase of the control is gamma - theta/2.
      {"cu", 4, 2,
       [](const Values& v) {
         return controlled(std::exp(i * (v[3] - v[0] / 2)) * standard_u(v[0], v[1], v[2]));
       }},
      {"CX", 0, 2, [](const Values&) { return controlled(pauli_x()); }},
      {"phase", 1, 1, [](const Values& v) { return diagonal_phase(v[0]); }},
      {"cphase", 1, 2, [](const Values& v) { return controlled(diagonal_phase(v[0])); }},
      {"id", 0, 1, [](const Values&) { return identity(); }},
      {"u1", 1, 1, [](const Values& v) { return diagonal_phase(v[0]); }},
      {"u2", 2, 1, [](const Values& v) { return euler(pi / 2, v[0], v[1]); }},
      {"u3", 3, 1, [](const Values& v) { return euler(v[0], v[1], v[2]); }},
      {"U", 3, 1, [](const Values& v) { return standard_u(v[0], v[1], v[2]); }},
      {"gphase", 1, 0, [](const Values& v) { return std::exp(i * v[0]) * Matrix::Identity(1, 1); }},
  };
  return gates;
}

Matrix standard_gate(const std::string& name, const std::vector<double>& parameters) {
  for (const StandardGate& gate : standard_gates()) {
    if (gate.name == name && gate.parameters == static_cast<int>(parameters.size()))
      return gate.matrix(parameters);
  }
  throw std::runtime_error("no standard gate " + name);
}

Matrix power(const Matrix& m, double exponent) {
  if (exponent == std::nearbyint(exponent)) {
    Matrix result = Matrix::Identity(m.rows(), m.cols());
    for (int n = 0; n < std::abs(static_cast<int>(exponent)); ++n) result = result * m;
    return exponent < 0 ? Matrix(result.adjoint()) : result;
  }
  const Eigen::ComplexSchur<Matrix> schur(m);  // of a normal matrix: the triangle is diagonal
  Matrix d = Matrix::Zero(m.rows(), m.cols());
  for (Eigen::Index k = 0; k < m.rows(); ++k) {
    double angle = std::arg(schur.matrixT()(k, k));
    if (angle < -pi + 1e-7) angle += 2 * pi;
    d(k, k) = std::exp(i * angle * exponent);
  }
  return schur.matrixU() * d * schur.matrixU().adjoint();
}

Matrix negatively_controlled(const Matrix& m) {
  Matrix flip = Matrix::Identity(2 * m.rows(), 2 * m.cols());
  for (Eigen::Index k = 0; k < flip.rows(); k += 2) flip.block(k, k, 2, 2) = pauli_x();
  return flip * controlled(m) * flip;
}

}  // namespace isinglass::support
