// Multi-controlled operations written with the fewest interactions: the constructions the passes choose from.
//
// Two steps, usable apart. simplify() turns any controlled source operation into operations with at most one
// control and one target (each worth one interaction); lower_single() turns one of those into r, xx and rz.
#pragma once

#include <cstdint>
#include <vector>

#include "circuit/circuit.h"
#include "circuit/cost.h"
#include "passes/pass.h"

namespace isinglass {

/// Wires that a construction may borrow; none of them an operand of the operation.
struct IdleWires {
  std::vector<std::uint32_t> clean;  // known to be |0>, and |0> again afterwards
  std::vector<std::uint32_t> dirty;  // in any state, and in the same state afterwards
};

/// Appends to `out` operations with the same effect as the unitary `op` up to a global phase: with one control
/// x, z, p, rz, r, h, y, u; without a control any one-target kind. Operations with two targets and no control
/// are passed on as they are. Known angles take the closed forms, symbolic ones the constructions that are
/// affine in the angle; a u with symbolic angles becomes rz and r.
void simplify(Circuit& circuit, const Operation& op, const IdleWires& idle, const Cost& cost, Block& out);

/// Appends r, xx and rz with the same effect as `op` up to a global phase. `op` has at most one control, and one
/// target (or is a `phase`): one xx if it has a control, in any angle range (|theta| <= pi/2 if known).
void lower_single(Circuit& circuit, const Operation& op, Block& out);

/// Both steps: appends r, xx and rz with the same effect as the controlled `op` up to a global phase.
void construct(Circuit& circuit, const Operation& op, const IdleWires& idle, const Cost& cost, Block& out);

/// The pass that replaces every operation with two or more controls, and every controlled one with two targets,
/// by simplify(), borrowing the wires that are idle where it stands: clean ones are wires that are still in
/// the |0> of the start and the target's spare ions, dirty ones all others.
Circuit choose_constructions(Circuit circuit, const PassContext& context);

/// How a Toffoli is written. The phases are those the form leaves besides the Toffoli itself.
enum class Toffoli : std::uint8_t {
  exact_minus,  // 5 interactions: minus_i, then its phase undone
  exact_plus,   // 5 interactions: plus_i, then its phase undone
  minus_i,      // 4 interactions: (-i)^{ab} on the controls a, b
  plus_i,       // 4 interactions: i^{ab}
  relative,     // 3 interactions: -1 where first = 0, second = 1, target = 1; its own inverse
};

/// Appends a Toffoli in that form: operations with one control, and r. The first controlled rotation of the
/// target is by the control `first`, the last by `second` (relative: both by `first`). A minus form that ends
/// with a control and a plus form that begins with it cancel there: the two rotations are inverse.
void append_toffoli(Circuit& circuit, Toffoli form, std::uint32_t first, std::uint32_t second,
                    std::uint32_t target, Origin origin, Block& out);

}  // namespace isinglass
