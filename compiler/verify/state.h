// State vectors, many columns at once, with gates fused two qubits at a time.
//
// A Sweep is a straight-line list of operations turned into few dense matrices; a State holds 2^wires
// amplitudes for each of 2^batch columns. The columns are the lowest bits of the index, so that inner loops
// run over neighbours in memory; real and imaginary parts lie apart for the same reason.
#pragma once

#include <complex>
#include <cstdint>
#include <span>
#include <vector>

#include "circuit/circuit.h"

namespace isinglass {

using Amplitude = std::complex<double>;

/// A matrix on one or two targets (or none: a phase) under any number of controls, all 1. Row-major; index
/// bit j is target j.
struct Kernel {
  std::vector<std::uint32_t> controls;
  std::vector<std::uint32_t> targets;
  std::vector<Amplitude> matrix;
};

/// The unitary operations of `operations` as fused kernels; barriers and delays are skipped. inputs[i] is the
/// value of input i. Throws std::logic_error on any other operation that is not unitary.
std::vector<Kernel> fused(const Circuit& circuit, std::span<const Operation> operations,
                          std::span<const double> inputs);

class State {
 public:
  /// All amplitudes zero.
  State(unsigned wires, unsigned batch);

  unsigned wires() const { return wires_; }
  unsigned batch() const { return batch_; }
  std::uint64_t dimension() const { return std::uint64_t(1) << wires_; }
  std::uint64_t columns() const { return std::uint64_t(1) << batch_; }

  Amplitude get(std::uint64_t basis, std::uint64_t column = 0) const {
    const std::uint64_t k = basis << batch_ | column;
    return {re_[k], im_[k]};
  }
  void set(std::uint64_t basis, std::uint64_t column, Amplitude a) {
    const std::uint64_t k = basis << batch_ | column;
    re_[k] = a.real();
    im_[k] = a.imag();
  }

  void apply(const Kernel& kernel);
  void apply(std::span<const Kernel> kernels) {
    for (const Kernel& kernel : kernels) apply(kernel);
  }

  /// Squared norm of the part where `wire` is `value`, over all columns.
  double weight(std::uint32_t wire, bool value) const;
  /// Sets the part where `wire` is not `value` to zero; no normalization.
  void project(std::uint32_t wire, bool value);
  void flip(std::uint32_t wire);

 private:
  unsigned wires_;
  unsigned batch_;
  std::vector<double> re_;
  std::vector<double> im_;
};

}  // namespace isinglass
