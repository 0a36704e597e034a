// Annotations of a source: what `@name ...` lines said, and about which lines.
#pragma once

#include <cstdint>
#include <string>

#include "circuit/circuit.h"

namespace isinglass {

/// One annotation line and the statement under it.
struct Annotation {
  std::string text;              // "@name words", one line
  std::uint32_t line = 0;        // of itself
  std::uint32_t first_line = 0;  // of the statement in the source, from 1
  std::uint32_t last_line = 0;
  std::string declares = {};  // the name of a classical variable that the statement declares, or empty
  /// What the statement as such becomes: measure, reset, barrier, delay, branch or classical; phase = gates.
  Kind kind = Kind::phase;
};

}  // namespace isinglass
