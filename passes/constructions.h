// Multi-controlled operations written with the fewest interactions: the constructions the passes choose from.
//
// The result is made of operations on at most two wires, which the lowering turns into one xx each.
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

/// Appends to `out` operations on at most two wires, controls included, with the same effect as the unitary
/// `op` up to a global phase; each with a control is worth one interaction, swaps and a u with a control and
/// symbolic angles apart. An `op` on at most two wires is passed on as it is. Known angles take the closed
/// forms, symbolic ones the constructions that are affine in the angle. Where two constructions of equal
/// count differ in their angles, the cost decides.
void simplify(Circuit& circuit, const Operation& op, const IdleWires& idle, const Cost& cost, Block& out);

/// The pass that replaces every operation on three or more wires by simplify(), borrowing the wires that are
/// idle where it stands: clean ones are wires that are still in the |0> of the start and the target's spare
/// ions, dirty ones all others.
Circuit choose_constructions(Circuit circuit, const PassContext& context);
std::optional<Circuit> choose_constructions_beside(const Circuit& circuit, const PassContext& context);

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
