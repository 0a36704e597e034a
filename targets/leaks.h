// Where the light of an operation goes besides the ions that are meant.
#pragma once

#include <array>
#include <cstdint>
#include <span>

#include "targets/place.h"
#include "targets/target.h"

namespace isinglass {

/// `ion` is lit by accident. With a partner the two interact; without one the ion is turned. Each leak turns
/// by crosstalk * theta about the axis that is meant for the ion next to it (`meant`: first or second
/// operand).
struct Leak {
  std::uint32_t ion = 0;
  std::uint32_t partner = 0;
  bool has_partner = false;
  int meant = 0;
};

struct Leaks {
  std::array<Leak, 4> list{};
  unsigned count = 0;
  std::span<const Leak> all() const { return {list.data(), count}; }
};

/// Of an r or xx of a placed circuit. A pulse disturbs the next ions that hold something; an interaction of a
/// and b couples b to the neighbours of a, and a to those of b, whether they hold something or not.
inline Leaks leaks_of(const Operation& op, const Placed& placed, const Target& target) {
  Leaks leaks;
  const auto add_beside = [&](int meant) {
    const std::uint32_t lit = op.operand[meant];
    const bool couples = op.kind == Kind::xx;
    const std::uint32_t partner = couples ? op.operand[1 - meant] : 0;
    const auto add = [&](std::uint32_t ion) {
      if (couples ? ion == partner : !placed.in_use[ion]) return;
      leaks.list[leaks.count++] = {ion, partner, couples, meant};
    };
    if (lit > 0) add(lit - 1);
    if (lit + 1 < target.ions) add(lit + 1);
  };
  add_beside(0);
  if (op.kind == Kind::xx) add_beside(1);
  return leaks;
}

}  // namespace isinglass
