// The gates of the standard's stdgates.inc and its built-ins, as the tests see them: their own matrices.
#pragma once

#include <functional>
#include <string>
#include <vector>

#include "support/simulator.h"

namespace isinglass::support {

struct StandardGate {
  std::string name;
  int parameters;
  int qubits;
  std::function<Matrix(const std::vector<double>&)> matrix;
};

/// The 32 gates of stdgates.inc, U and gphase.
const std::vector<StandardGate>& standard_gates();

/// Throws std::runtime_error where the name or the number of parameters is wrong.
Matrix standard_gate(const std::string& name, const std::vector<double>& parameters);

/// diag(1, e^{il}).
Matrix diagonal_phase(double l);

/// Power of a unitary: integers by multiplication, fractions with eigenphases in (-pi, pi], as the standard's
/// own library needs it.
Matrix power(const Matrix& unitary, double exponent);

/// `negctrl`: acts where the new first operand is 0.
Matrix negatively_controlled(const Matrix& gate);

}  // namespace isinglass::support
