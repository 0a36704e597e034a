// Matrices and state vectors of the tests; see simulator.h.
#include "support/simulator.h"

#include <cmath>
#include <limits>
#include <stdexcept>

namespace isinglass::support {

namespace {
const Complex i(0, 1);
}

Matrix identity(int qubits) {
  return Matrix::Identity(1 << qubits, 1 << qubits);
}

Matrix pauli_x() {
  Matrix m(2, 2);
  m << 0, 1, 1, 0;
  return m;
}

Matrix pauli_y() {
  Matrix m(2, 2);
  m << 0, -i, i, 0;
  return m;
}

Matrix pauli_z() {
  Matrix m(2, 2);
  m << 1, 0, 0, -1;
  return m;
}

Matrix rotation(double theta, const Matrix& axis) {
  const Matrix one = Matrix::Identity(axis.rows(), axis.cols());
  return std::cos(theta / 2) * one - i * std::sin(theta / 2) * axis;
}

Matrix product(const Matrix& low, const Matrix& high) {
  Matrix m(low.rows() * high.rows(), low.cols() * high.cols());
  for (Eigen::Index r = 0; r < high.rows(); ++r) {
    for (Eigen::Index c = 0; c < high.cols(); ++c) {
      m.block(r * low.rows(), c * low.cols(), low.rows(), low.cols()) = high(r, c) * low;
    }
  }
  return m;
}

Matrix controlled(const Matrix& gate, int controls) {
  const Eigen::Index stride = Eigen::Index(1) << controls;
  Matrix m = Matrix::Identity(gate.rows() * stride, gate.cols() * stride);
  for (Eigen::Index r = 0; r < gate.rows(); ++r) {
    for (Eigen::Index c = 0; c < gate.cols(); ++c) {
      m(r * stride + stride - 1, c * stride + stride - 1) = gate(r, c);
    }
  }
  return m;
}

Matrix equator(double phi) {
  return std::cos(phi) * pauli_x() + std::sin(phi) * pauli_y();
}

Matrix gate_matrix(Kind kind, double a, double b, double c) {
  switch (kind) {
    case Kind::phase:
      return std::exp(i * a) * Matrix::Identity(1, 1);
    case Kind::x:
      return pauli_x();
    case Kind::y:
      return pauli_y();
    case Kind::z:
      return pauli_z();
    case Kind::h:
      return (pauli_x() + pauli_z()) / std::sqrt(2.0);
    case Kind::p:
      return std::exp(i * a / 2.0) * rotation(a, pauli_z());
    case Kind::rz:
      return rotation(a, pauli_z());
    case Kind::r:
      return rotation(a, equator(b));
    case Kind::u:
      // The standard's definition, read off its formula: rz, ry, rz and a phase that makes it 2 pi periodic.
      return std::exp(i * (a + b + c) / 2.0) * rotation(b, pauli_z()) * rotation(a, pauli_y()) *
             rotation(c, pauli_z());
    case Kind::swap:
      return (identity(2) + product(pauli_x(), pauli_x()) + product(pauli_y(), pauli_y()) +
              product(pauli_z(), pauli_z())) /
             2.0;
    case Kind::zz:
      return rotation(a, product(pauli_z(), pauli_z()));
    case Kind::xx:
      return rotation(a, product(equator(b), equator(c)));
    default:
      throw std::logic_error("the tests' simulator was given an operation that is not a gate");
  }
}

State::State(unsigned wire_count, std::uint64_t basis)
    : wires(wire_count), amplitudes(std::size_t(1) << wire_count) {
  amplitudes[basis] = 1;
}

void State::apply(const Matrix& gate, std::span<const std::uint32_t> targets,
                  std::span<const std::uint32_t> controls) {
  std::uint64_t control_mask = 0;
  std::uint64_t target_mask = 0;
  for (const auto w : controls) control_mask |= std::uint64_t(1) << w;
  for (const auto w : targets) target_mask |= std::uint64_t(1) << w;
  const std::size_t dimension = std::size_t(1) << targets.size();
  std::vector<std::uint64_t> offset(dimension, 0);
  for (std::size_t k = 0; k < dimension; ++k) {
    for (std::size_t t = 0; t < targets.size(); ++t) {
      if (k >> t & 1) offset[k] |= std::uint64_t(1) << targets[t];
    }
  }
  std::vector<Complex> old(dimension);
  for (std::uint64_t base = 0; base < amplitudes.size(); ++base) {
    if ((base & target_mask) != 0 || (base & control_mask) != control_mask) continue;
    for (std::size_t k = 0; k < dimension; ++k) old[k] = amplitudes[base | offset[k]];
    for (std::size_t r = 0; r < dimension; ++r) {
      Complex sum = 0;
      for (std::size_t c = 0; c < dimension; ++c) {
        sum += gate(static_cast<Eigen::Index>(r), static_cast<Eigen::Index>(c)) * old[c];
      }
      amplitudes[base | offset[r]] = sum;
    }
  }
}

double State::norm2() const {
  double sum = 0;
  for (const Complex& a : amplitudes) sum += std::norm(a);
  return sum;
}

double State::project(std::uint32_t wire, bool value) {
  for (std::uint64_t k = 0; k < amplitudes.size(); ++k) {
    if ((k >> wire & 1) != static_cast<std::uint64_t>(value)) amplitudes[k] = 0;
  }
  return norm2();
}

void apply(State& state, const Circuit& circuit, const Operation& op, std::span<const double> inputs) {
  double value[3];
  for (int a = 0; a < 3; ++a) {
    value[a] = op.value[a];
    for (const Term& term : circuit.forms.terms(op.form[a]))
      value[a] += term.coefficient * inputs[term.input];
  }
  state.apply(gate_matrix(op.kind, value[0], value[1], value[2]), circuit.targets(op), circuit.controls(op));
}

namespace {

State run_straight(const Circuit& circuit, std::uint64_t basis, std::span<const double> inputs) {
  State state(circuit.wires, basis);
  for (const Operation& op : circuit.body()) {
    if (op.kind == Kind::barrier || op.kind == Kind::delay) continue;
    apply(state, circuit, op, inputs);
  }
  return state;
}

/// Where the amplitude of source basis state k is after the circuit: its qubits on their end wires, all else
/// 0.
std::uint64_t at_end(const Circuit& circuit, std::uint64_t k) {
  std::uint64_t index = 0;
  for (std::size_t q = 0; q < circuit.end_wire.size(); ++q) {
    if (k >> q & 1) index |= std::uint64_t(1) << circuit.end_wire[q];
  }
  return index;
}

}  // namespace

Matrix wire_unitary(const Circuit& circuit, std::span<const double> inputs) {
  const auto size = Eigen::Index(1) << circuit.wires;
  Matrix m(size, size);
  for (Eigen::Index column = 0; column < size; ++column) {
    const State state = run_straight(circuit, static_cast<std::uint64_t>(column), inputs);
    m.col(column) = Eigen::Map<const Eigen::VectorXcd>(state.amplitudes.data(), size);
  }
  return m;
}

Matrix unitary(const Circuit& circuit, std::span<const double> inputs) {
  const auto size = Eigen::Index(1) << circuit.source_qubits;
  Matrix m(size, size);
  for (Eigen::Index column = 0; column < size; ++column) {
    const State state = run_straight(circuit, static_cast<std::uint64_t>(column), inputs);
    for (Eigen::Index row = 0; row < size; ++row) {
      m(row, column) = state.amplitudes[at_end(circuit, static_cast<std::uint64_t>(row))];
    }
  }
  return m;
}

double distance(const Matrix& a, const Matrix& b) {
  if (a.rows() != b.rows() || a.cols() != b.cols()) return std::numeric_limits<double>::infinity();
  const Complex overlap = (a.adjoint() * b).trace();
  const Complex phase = std::abs(overlap) < 1e-12 ? Complex(1) : overlap / std::abs(overlap);
  return (phase * a - b).cwiseAbs().maxCoeff();
}

double distance(const Circuit& a, const Circuit& b, std::span<const double> inputs) {
  if (a.source_qubits != b.source_qubits) return std::numeric_limits<double>::infinity();
  return distance(unitary(a, inputs), unitary(b, inputs));
}

double distance_from_zero(const Circuit& a, const Circuit& b, std::span<const double> inputs) {
  if (a.source_qubits != b.source_qubits) return std::numeric_limits<double>::infinity();
  const auto column = [&](const Circuit& circuit) {
    const State state = run_straight(circuit, 0, inputs);
    const auto size = Eigen::Index(1) << circuit.source_qubits;
    Matrix m(size, 1);
    for (Eigen::Index row = 0; row < size; ++row) {
      m(row, 0) = state.amplitudes[at_end(circuit, static_cast<std::uint64_t>(row))];
    }
    return m;
  };
  return distance(column(a), column(b));
}

}  // namespace isinglass::support
