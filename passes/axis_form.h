// The axis form: a circuit without one-qubit gates, in which most passes of this room think.
//
//     r --- xx --- r --- xx          interactions about any two axes, and what remains
//           |            |     ==>   of the one-qubit gates at the end of each stretch
//     ----- xx -- rz --- xx          (a, A; b, B; theta)  (a, A'; b, B'; theta')  | frames
//
// On every wire all one-qubit gates between two fences are pulled to the right, through the interactions,
// which turns the interactions' axes: an xx after the gates U acts as exp(-i theta/2 (A.sigma)(x)(B.sigma))
// before them, with A = U^-1 n. The product of the gates, the frame, stands at the fence that closes the
// stretch. What commutes is seen at once (parallel axes), a one-qubit gate can no longer hide a pair of
// inverse interactions, and going back decides anew, and best, where pulses are needed: see "poles" in
// axis_form.cpp.
//
// Rotations by angles that depend on inputs stay as items of one wire. Everything that is not unitary is a
// fence: nothing moves across it on its wires.
#pragma once

#include <cstdint>
#include <vector>

#include "algebra/su2.h"
#include "circuit/circuit.h"
#include "passes/pass.h"

namespace isinglass {

/// Angles and angles between axes below this are rounding.
inline constexpr double rounding = 1e-11;

/// How many times pi must be taken from an interaction's angle to leave at most pi/2 either way. Each is a
/// half turn of both wires about the interaction's axes: exp(-i pi/2 A(x)B) = -i A(x)B. Stays 0 at +-pi/2
/// itself.
double half_turns(double angle);

/// Whether two unit vectors lie on one line, or span a right angle, up to rounding.
bool are_parallel(const Axis& a, const Axis& b);
bool are_perpendicular(const Axis& a, const Axis& b);

struct Item {
  enum class What : std::uint8_t {
    interaction,  // exp(-i angle/2 (axis[0].sigma)(x)(axis[1].sigma)) on wire[0], wire[1]
    rotation,     // exp(-i angle/2 axis[0].sigma) on wire[0]; its angle is symbolic
    fence,        // AxisBlock::fences[fence]
  };
  Axis axis[2];
  Angle angle;
  std::uint32_t wire[2] = {0, 0};
  std::uint32_t fence = 0;
  Origin origin;
  What what = What::interaction;

  bool is_interaction() const { return what == What::interaction; }
  /// 1, 2, or 0 for a fence (its wires stand in the Fence).
  int wire_count() const { return what == What::fence ? 0 : what == What::rotation ? 1 : 2; }
};

/// An operation that is not unitary. Wire wires[i] carries frames[i] right before it, and a new stretch
/// begins.
struct Fence {
  Operation operation;
  std::vector<std::uint32_t> wires;  // the operands, or all wires where control may leave the block
  std::vector<Su2> frames;
};

struct AxisBlock {
  std::vector<Item> items;
  std::vector<Fence> fences;
  std::vector<Su2> end_frames;  // one a wire, applied at the end of the block
  bool is_body = false;         // the program itself: its edges are known
  bool may_rename = false;      // wires may change their names: the body of a program with one end
};

struct AxisForm {
  Circuit shell;  // everything but the blocks, which are empty
  std::vector<AxisBlock> blocks;
};

/// Any circuit whose unitary operations touch at most two wires (controls included); throws std::logic_error
/// for one that touches more. Interaction angles that are known come out in [-pi/2, pi/2]; those below
/// 1e-13 are dropped. Global phases are dropped.
AxisForm axis_form(const Circuit& circuit);

/// Back to r, xx, rz in the normal form of optimize(), with the fewest r pulses that the axes allow: at most
/// one between two other operations of a wire. Frames that the promise does not keep are dropped.
Circuit native_form(AxisForm form, const Promise& promise);

/// `changed` where its estimated error is lower than that of `circuit`, else `circuit`: no pass makes worse.
Circuit better_of(Circuit circuit, Circuit changed, const Cost& cost);

/// Rewrites a block from left to right while one-qubit unitaries and renamings made on the way are pushed to
/// the end: give every item to arrive() in order, use what it has become, push what is left over.
class Pusher {
 public:
  explicit Pusher(std::uint32_t wires);

  /// Turns and renames the item for what was pushed so far. Angle signs are untouched.
  void arrive(Item& item) const;
  /// Takes the pushed unitaries into the fence's frames; they end here. Renames its wires and operands, and
  /// those of the blocks that it opens.
  void arrive(Fence& fence, AxisForm& form);
  /// U on `wire` (its present name), after all that has arrived, in the coordinates of the stretch's start.
  void push(std::uint32_t wire, const Su2& u);
  /// A SWAP after all that has arrived; what came for a goes to b from here on. Where the same step also
  /// pushes unitaries that come before the SWAP, exchange first.
  void exchange(std::uint32_t a, std::uint32_t b);
  /// Takes what is left into the end frames and, in the body, the renaming into the shell's end_wire.
  void finish(AxisBlock& block, AxisForm& form);

 private:
  std::vector<Su2> pushed_;          // by present wire
  std::vector<std::uint32_t> name_;  // present wire of an old one
  bool is_renaming_ = false;
};

}  // namespace isinglass
