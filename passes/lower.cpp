// Gates to the machine's own: r, xx, rz.
//
//     --*--            --r-- xx --rz--
//       |      ==>           |
//     --X--            ----- xx --r---
//
// A controlled one-qubit gate is a controlled rotation about some axis, hence one interaction of half its
// angle and rotations; the axis form takes gates in and gives pulses out, and this pass is no more than the
// way there and back. (Common practice; the poles that make the pulses few stand in axis_form.cpp.)
#include "passes/lower.h"

#include "passes/axis_form.h"

namespace isinglass {

Circuit lower(Circuit circuit, const PassContext& context) {
  return native_form(axis_form(circuit), context.promise);
}

}  // namespace isinglass
