// Gates as short lists of circuit operations: templates with parameters, and the modifiers inv, pow, ctrl.
//
// A gate definition is expanded once into a template whose angles are affine in its parameters; a call copies
// the template with numbers and wires put in. Modifiers work on the copied list, global phases included.
#pragma once

#include <array>
#include <cstdint>
#include <functional>
#include <span>
#include <string>
#include <string_view>
#include <vector>

#include "circuit/circuit.h"

namespace isinglass {

/// One unitary operation (or a barrier) of a gate's body. Wires are controls first, then targets, as in
/// Operation.
struct Act {
  Kind kind = Kind::phase;
  std::array<Angle, 3> angles{};
  std::vector<std::uint32_t> wires;

  std::size_t control_count() const {
    return kind == Kind::barrier ? 0 : wires.size() - static_cast<std::size_t>(target_count(kind));
  }
};
using Acts = std::vector<Act>;

/// A gate whose body is known: wires are numbered by operand, angle forms are linear in the parameters.
struct GateTemplate {
  std::uint32_t parameters = 0;
  std::uint32_t operands = 0;
  Forms forms;  // input i = parameter i
  Acts acts;
};

/// The angle of a template with the arguments put in for its parameters; `forms` is where they live.
Angle substituted(const GateTemplate& gate, Angle angle, std::span<const Angle> arguments, Forms& forms);

/// The template's acts on these wires.
Acts instance(const GateTemplate& gate, std::span<const Angle> arguments,
              std::span<const std::uint32_t> wires, Forms& forms);

/// Which gates a name belongs to: those that need no include, those of the two library files.
enum class Library : std::uint8_t { built_in3, stdgates, built_in2, qelib1 };

struct LibraryGate {
  std::string_view name;
  const GateTemplate* gate;
};

/// The gates of one library, made once.
std::span<const LibraryGate> library(Library which);

// Modifiers. Each takes the list of what it modifies and gives the list of the modified gate, exactly.

Acts inverted(Acts acts, Forms& forms);

/// All acts under further controls, which come first in the order given; those in `negated` are for 0.
Acts controlled(Acts acts, std::span<const std::uint32_t> controls, bool negated);

/// acts repeated `count` times; negative counts repeat the inverse. Throws Fault beyond `most` acts.
Acts repeated(Acts acts, std::int64_t count, Forms& forms, std::size_t most);

/// The principal power: every eigenvalue e^{ia}, a in (-pi, pi], becomes e^{ia exponent}; -1 counts as +pi.
/// `wrap` gives an angle equal to its argument modulo 2 pi in (-pi, pi], for angles that are not known.
/// Throws Fault where the gate is too large or its angles are unknown.
Acts powered(Acts acts, double exponent, Forms& forms, const std::function<Angle(Angle)>& wrap);

}  // namespace isinglass
