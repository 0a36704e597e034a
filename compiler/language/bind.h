// Numbers put into the inputs of a compiled program: one linear pass, and no compiling.
//
// A plan (r, xx, rz with angles affine in the inputs) and a set of values give a native program with known
// angles. What leaves the emitted ranges is brought back: r(-t, f) = r(t, f + pi), and an xx beyond pi/2 is
// the shorter one and a flip of both ions, which the next r pulse on either absorbs; what is left of a flip
// is a change of frame that later phases carry.
#pragma once

#include <cstdint>
#include <span>
#include <string>
#include <vector>

#include "circuit/circuit.h"

namespace isinglass {

/// An input that a set of values must give.
struct DeclaredInput {
  std::string name;
  std::string type;         // as declared: "float", "angle[32]", "array[float[64], 2, 3]"
  std::size_t count = 1;    // numbers it takes: the cells of an array, row by row
  std::uint32_t index = 0;  // in Circuit::inputs
};

/// The declared inputs of a circuit, in the order of their declaration.
std::vector<DeclaredInput> declared_inputs(const Circuit& circuit);

/// Puts values into a plan, again and again; the circuit is built once and its arrays are used again.
class Binder {
 public:
  /// Keeps a copy of the plan, all of whose unitary operations must be native.
  explicit Binder(Circuit plan);

  const std::vector<DeclaredInput>& inputs() const { return declared_; }

  /// values[i] are the numbers of inputs()[i], in radians for angles; an angle[n] is rounded to its grid, the
  /// other types take the numbers they can hold. Throws Failure (Exit::source_at_fault) that names the input
  /// whose numbers are missing or wrong, or the expression that has no value. The result holds until the next
  /// call.
  const Circuit& bind(std::span<const std::vector<double>> values);

 private:
  struct Frame {
    double turn = 0;  // a pending rz, after
    double axis = 0;  // the pending flip r(pi, axis)
    bool flip = false;
  };
  void set_inputs(std::span<const std::vector<double>> values);
  void bind_block(const Block& from, Block& to);
  void bind_r(const Operation& op, Block& to);
  void bind_xx(const Operation& op, Block& to);
  void add_flip(Frame& frame, double axis);
  void settle_flip(std::uint32_t wire, Block& to);
  void settle(std::uint32_t wire, Block& to);
  double value(const Operation& op, int angle) const { return op.value[angle] + form_value_[op.form[angle]]; }

  Circuit plan_;
  Circuit bound_;
  std::vector<DeclaredInput> declared_;
  std::vector<double> number_;      // of every input
  std::vector<double> form_value_;  // of every form
  std::vector<Frame> frame_;        // of every wire
};

}  // namespace isinglass
