// The tests' own simulator of circuits. It shares no code with the compiler: it reads a Circuit as plain data
// and uses its own matrices and state vectors, so that an error in the compiler cannot hide itself here.
//
// Amplitude index: bit w of the index is wire w. Gate matrices: bit j of the index is target j.
#pragma once

#include <Eigen/Dense>
#include <complex>
#include <cstdint>
#include <map>
#include <span>
#include <string>
#include <vector>

#include "circuit/circuit.h"

namespace isinglass::support {

using Complex = std::complex<double>;
using Matrix = Eigen::MatrixXcd;

/// Pauli matrices and the rotations that everything here is made of.
Matrix identity(int qubits = 1);
Matrix pauli_x();
Matrix pauli_y();
Matrix pauli_z();
/// exp(-i theta/2 A) for an A with A*A = 1.
Matrix rotation(double theta, const Matrix& axis);
/// The operator with `low` on target 0 and `high` on target 1.
Matrix product(const Matrix& low, const Matrix& high);
/// gate with `controls` further qubits in front (low bits), all of which must be 1.
Matrix controlled(const Matrix& gate, int controls = 1);
/// cos(phi) X + sin(phi) Y.
Matrix equator(double phi);

/// Matrix of a gate kind on its targets, without controls; a, b, c are its angles.
Matrix gate_matrix(Kind kind, double a = 0, double b = 0, double c = 0);

/// 2^wires amplitudes.
struct State {
  explicit State(unsigned wires = 0, std::uint64_t basis = 0);
  unsigned wires = 0;
  std::vector<Complex> amplitudes;

  void apply(const Matrix& gate, std::span<const std::uint32_t> targets,
             std::span<const std::uint32_t> controls = {});
  double norm2() const;
  /// Leaves the part of the state where `wire` is `value`, without normalizing; returns its weight.
  double project(std::uint32_t wire, bool value);
};

/// Applies one unitary operation of the circuit; inputs[i] is the value of input i.
void apply(State& state, const Circuit& circuit, const Operation& op, std::span<const double> inputs = {});

/// Unitary of a straight-line circuit without measurements on all its wires, renaming not applied.
Matrix wire_unitary(const Circuit& circuit, std::span<const double> inputs = {});

/// What the circuit does to the source's qubits: ancillas start in |0>, end wires are followed, and only the
/// part where every other wire ends in |0> is returned (so a circuit that leaves an ancilla dirty has no
/// unitary here).
Matrix unitary(const Circuit& circuit, std::span<const double> inputs = {});

/// Largest difference of two entries after the best global phase is taken out. Infinite when the shapes
/// differ.
double distance(const Matrix& a, const Matrix& b);

/// Distance of the unitaries of two circuits without measurements.
double distance(const Circuit& a, const Circuit& b, std::span<const double> inputs = {});

/// Whether the circuit, applied to |0...0>, gives the same state as the other, up to global phase.
double distance_from_zero(const Circuit& a, const Circuit& b, std::span<const double> inputs = {});

}  // namespace isinglass::support
