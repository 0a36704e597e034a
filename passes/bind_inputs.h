// Numbers into the inputs of an already compiled program: one linear pass.
//
//     xx(2.0 * t, 0, 0.5)   t = 1.1       xx(0.94159, pi, 0.5)
//     r(0.7, 0.3) on both     ==>         r with its phase turned about, flips carried on
//
// Angles are substituted and brought into range: a pulse by a negative angle, or one above pi, is a pulse
// with its phase turned by pi; an interaction above pi/2 is a smaller one times a flip of both ions, since
// xx(pi, a, b) = -i A (x) B with A = cos a X + sin a Y. A flip is not performed: it moves on through later
// operations, whose phases it mirrors, and ends in the last pulse before the next fence, or as a pulse of its
// own.
#pragma once

#include <span>
#include <string>
#include <vector>

#include "circuit/circuit.h"

namespace isinglass {

/// A lowered circuit with inputs, bound again and again. Equals, up to a global phase and for every values,
/// the plan with the numbers put in; every one of its angles is known and in the range of the output.
class Binding {
 public:
  /// Throws std::logic_error if the plan holds operations that are not native.
  explicit Binding(const Circuit& plan);

  /// values[i] is the value of Circuit::inputs[i], derived ones included. The result is good until the next
  /// call.
  const Circuit& bind(std::span<const double> values);

 private:
  /// What waits on an ion, after everything that was put out: P = rz(turn) X^is_flipped.
  struct Ion {
    bool is_flipped = false;
    double turn = 0;
    std::uint32_t pulse = 0;  // 1 + index in the block of an r that nothing followed on this ion; 0: none
    Origin origin;            // of the flip
  };

  void bind_expressions();
  void bind_block(std::size_t block);
  void bind_pulse(const Operation& op);
  void bind_interaction(const Operation& op);
  void bind_fence(const Operation& op);
  double value(const Operation& op, int i) const { return op.value[i] + forms_[op.form[i]]; }
  static double seen_phase(const Ion& ion, double phi);
  void add_pulse(std::uint32_t wire, double theta, double phi, Origin origin);
  void settle_flip(std::uint32_t wire);
  void settle(std::uint32_t wire);

  const Circuit& plan_;
  Circuit bound_;
  std::span<const double> values_;
  std::vector<double> forms_;  // value of each linear form
  std::vector<Ion> ions_;
  Block* out_ = nullptr;
  bool has_classical_inputs_ = false;
  bool has_empty_pulse_ = false;  // in the block at hand
};

}  // namespace isinglass
