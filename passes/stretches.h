// Two-qubit stretches: interactions on one pair of wires that stand together, or can be brought together
// through what they commute with.
#pragma once

#include <cstdint>
#include <span>
#include <vector>

#include "algebra/canonical.h"
#include "passes/axis_form.h"

namespace isinglass {

/// Items of a block that act as one: interactions with known angles on one pair, or any other item alone.
struct Stretch {
  std::uint32_t first = 0;  // range of Stretches::members
  std::uint32_t count = 0;
  bool is_numeric = false;  // interactions with known angles
};

/// The items of a block in an order that means the same, grouped. Every item occurs once.
struct Stretches {
  std::vector<Stretch> list;
  std::vector<std::uint32_t> members;  // indices of items

  std::span<const std::uint32_t> items(const Stretch& stretch) const {
    return std::span(members).subspan(stretch.first, stretch.count);
  }
};

enum class Direction : std::uint8_t {
  to_the_left,   // an interaction joins an earlier stretch if it commutes with all that came in between
  to_the_right,  // the same in the mirror of time
};

Stretches gathered(const AxisBlock& block, Direction direction);

/// Unitary of interactions on one pair, in order; index = wires[0] + 2 * wires[1].
Matrix4 unitary_of(std::span<const Item> items, std::uint32_t first_wire);

/// Interactions that make `form` on the two wires, largest first, those below `rounding` left out; what is
/// local of it goes to the pusher.
void write_canonical(const Canonical& form, const std::uint32_t wire[2], Origin origin,
                     std::vector<Item>& out, Pusher& pusher);

}  // namespace isinglass
