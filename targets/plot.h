// A drawing of a machine: its chain, its transverse spectrum and, for a pair, the pulse and the paths of the
// modes.
#pragma once

#include <optional>
#include <string>

#include "targets/trap_machine.h"

namespace isinglass {

/// A standalone SVG. Colours are told apart without red against green; every series has a label besides its
/// colour.
std::string plot_of(const TrapMachine& machine, const std::optional<LitPair>& lit);

}  // namespace isinglass
