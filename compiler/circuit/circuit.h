// The vocabulary everybody speaks: a circuit as flat arrays of operations on numbered wires.
//
// The same type carries a circuit from the language (gates of the standard library with any number of
// controls) to the machine (only r, xx, rz). Straight-line code is a Block; classical control is an operation
// of kind `branch` that names child blocks, so passes work on one block at a time and treat every operation
// that is not unitary as a fence on the wires it touches (see fences()).
#pragma once

#include <complex>
#include <cstdint>
#include <span>
#include <string>
#include <string_view>
#include <vector>

#include "circuit/angle.h"
#include "circuit/classical.h"
#include "circuit/origin.h"

namespace isinglass {

/// What an operation does to its targets. Matrices in the standard's order and phases (first operand = low
/// bit); any unitary kind may carry controls (all must be 1). Angles in radians.
enum class Kind : std::uint8_t {
  // unitary, no target
  phase,  // (g)            e^{ig}; with controls a relative phase
  // unitary, one target
  x,
  y,
  z,
  h,
  p,   // (l)            diag(1, e^{il})
  rz,  // (f)            exp(-i f/2 Z)
  r,   // (t, f)         exp(-i t/2 (cos f X + sin f Y))
  u,   // (t, f, l)      OpenQASM 3's U, its phase e^{it/2} included
  // unitary, two targets
  swap,
  zz,  // (t)            exp(-i t/2 Z(x)Z)
  xx,  // (t, fa, fb)    exp(-i t/2 (cos fa X + sin fa Y)(x)(cos fb X + sin fb Y))
  // not unitary
  measure,    // one operand; payload = flat bit, or no_bit
  reset,      // one operand
  barrier,    // operands
  delay,      // operands; value[0] = length in microseconds
  classical,  // payload = index into Circuit::statements; no operands
  branch,     // payload = index into Circuit::branches; operands = all wires that any arm touches
};

inline constexpr std::uint32_t no_bit = 0xffffffffu;

bool is_unitary(Kind kind);
/// Number of target wires of a unitary kind: 0, 1 or 2.
int target_count(Kind kind);
/// Number of angles of a unitary kind: 0 to 3.
int angle_count(Kind kind);
std::string_view name(Kind kind);

/// One operation, 64 bytes. Operands are controls first, then targets; up to three are stored in place, more
/// in the circuit's pool: read and write them through Circuit. Angles likewise through angle()/set_angle().
struct Operation {
  double value[3] = {0, 0, 0};           // constants of the angles
  std::uint32_t form[3] = {0, 0, 0};     // linear forms of the angles
  std::uint32_t operand[3] = {0, 0, 0};  // in place; with more than three, operand[0] = offset in the pool
  std::uint32_t operand_count = 0;
  std::uint32_t payload = 0;  // measure: bit; classical, branch: index
  Origin origin;              // the source lines it came from
  Kind kind = Kind::phase;

  Angle angle(int i) const { return {value[i], form[i]}; }
  void set_angle(int i, Angle a) {
    value[i] = a.constant;
    form[i] = a.form;
  }
  bool has_known_angles() const { return (form[0] | form[1] | form[2]) == 0; }
  bool is_unitary() const { return isinglass::is_unitary(kind); }
  int control_count() const { return static_cast<int>(operand_count) - target_count(kind); }
  /// r, rz or xx without controls.
  bool is_native() const {
    return (kind == Kind::r || kind == Kind::rz || kind == Kind::xx) && control_count() == 0;
  }
};
static_assert(sizeof(Operation) <= 64);

using Block = std::vector<Operation>;

/// A register of the source: `qubit[size] name`. Its qubit k is wire first + k.
struct Register {
  std::string name;
  std::uint32_t first = 0;
  std::uint32_t size = 0;
  bool is_scalar = false;  // `qubit q` rather than `qubit[1] q`
};

/// A value that is given when the program is bound. A derived input has an expression in declared inputs.
struct Input {
  std::string name;  // in the native program
  std::string type;  // "float", "angle[32]", "uint[8]", ...
  bool is_derived = false;
  Expression expression;    // of a derived input
  std::string source = {};  // its name in the source; empty: the same
};

/// Where a program starts and what of it must be kept: INTERFACE "What a compiled program promises".
struct Promise {
  bool zero_start = false;  // all wires start in |0>; else any input state must work
  bool keep_bits_only = false;
};

struct Circuit {
  std::vector<Register> registers;
  std::uint32_t wires = 0;  // the source's qubits come first; more are ancillas that start and end in |0>
  std::uint32_t source_qubits = 0;
  /// end_wire[q]: the wire that holds source qubit q at the end (swaps are renamed, not performed).
  std::vector<std::uint32_t> end_wire;

  std::vector<Input> inputs;
  Forms forms;
  std::vector<Variable> variables;
  std::uint32_t bits = 0;  // flat classical bits of all bit variables

  std::vector<Block> blocks = std::vector<Block>(1);  // blocks[0] is the program
  std::vector<ClassicalStatement> statements;
  std::vector<Branch> branches;
  std::vector<std::uint32_t> pool;  // operand lists longer than three
  Origins origins;
  std::vector<std::string> pragmas;  // of the source, kept: each line after the word `pragma`
  std::vector<std::string>
      externs;  // declarations that calls in expressions need: "extern f(int[8]) -> bit;"

  Block& body() { return blocks[0]; }
  const Block& body() const { return blocks[0]; }

  std::span<const std::uint32_t> operands(const Operation& op) const;
  std::span<const std::uint32_t> controls(const Operation& op) const;
  std::span<const std::uint32_t> targets(const Operation& op) const;
  /// Replaces the operands of `op` (controls first, then targets).
  void set_operands(Operation& op, std::span<const std::uint32_t> operands);

  /// Makes an operation that belongs to this circuit; it is not appended to any block.
  Operation make(Kind kind, std::span<const std::uint32_t> operands, std::span<const Angle> angles = {},
                 Origin origin = {});
  Operation make(Kind kind, std::initializer_list<std::uint32_t> operands,
                 std::initializer_list<Angle> angles = {}, Origin origin = {});

  /// Whether any block measures.
  bool measures() const;
  /// Name of wire q as the source writes it: "q[3]", "a", or "ancilla 2".
  std::string wire_name(std::uint32_t wire) const;
};

/// Adds `qubits` source wires as one register and returns it. Keeps end_wire the identity on them.
const Register& add_register(Circuit& circuit, std::string name, std::uint32_t qubits,
                             bool is_scalar = false);

/// Declares a bit variable of `bits` flat bits and returns its index in Circuit::variables.
std::uint32_t add_bits(Circuit& circuit, std::string name, std::uint32_t bits, bool is_scalar = false);

/// Throws std::logic_error that names the broken rule: operand ranges and repeats, counts, forms, payloads,
/// blocks. Passes are checked with it between each other in tests and debug builds.
void check_invariants(const Circuit& circuit);

/// Human-readable listing, an operation a line; for tests, traces and debugging.
std::string listed(const Circuit& circuit);

/// Matrix of the targets of a unitary operation without its controls, all angles known, row-major, 1, 2x2 or
/// 4x4 entries. Two targets: index = first + 2 * second.
std::vector<std::complex<double>> matrix_of(const Operation& op);

}  // namespace isinglass
