// Where pulses are needed on one wire between two fences.
//
//     axes   x  z  x  y  ...  end           pulses so few that every axis finds a pole it can live with
//     pole   y  y  y  x       frame's own
//
// On one wire the machine needs every interaction's axis on the equator of the frame it has reached by pulses
// so far: the direction p that this frame calls "up", the pole, in coordinates of the stretch's start, must
// be perpendicular to the axis. A pulse moves p anywhere; rz leaves it alone. At the start p = z, at the end
// it must be the frame's own. So the fewest pulses are the fewest runs of consecutive axes that share a
// perpendicular, i.e. lie in a plane, which a greedy walk finds. (Derived here; the special cases, rotations
// about the interaction's axis and pi pulses that pass through it, are common practice.)
//
// A rotation by an unknown angle t is nothing where p lies along its axis n (a change of frame) and one pulse
// where p is perpendicular to n. Such a pulse takes a change of p in the plane perpendicular to n along, just
// before it or just after: it is a rotation about n too, by a known angle b, and the pulse turns by t + b.
#pragma once

#include <cstdint>
#include <span>
#include <vector>

#include "algebra/su2.h"

namespace isinglass {

/// One thing that a wire's pole must suit: an item's axis, or the end of the stretch.
struct Need {
  enum class What : std::uint8_t { interaction, rotation, end };
  Axis axis;                // of the item; at the end the pole itself
  std::uint32_t place = 0;  // index into the table of poles that the answer goes to
  What what = What::interaction;
  bool is_free = false;  // an end that takes any pole
};

/// Chooses the poles of one stretch of one wire, which begins at z and whose last need is an end:
/// poles[need.place] is what the need finds.
void choose_poles(std::span<const Need> needs, std::vector<Axis>& poles);

/// Whether the pulse of a rotation about that axis can take the change from one pole to the other along.
bool joins(const Axis& rotation, const Axis& from, const Axis& to);

}  // namespace isinglass
