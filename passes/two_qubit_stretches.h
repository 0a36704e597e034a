// See two_qubit_stretches.cpp.
#pragma once

#include "passes/pass.h"

namespace isinglass {

/// Every two-qubit stretch with known angles has the fewest xx, then the least total angle, for its unitary.
/// Lowered circuits only.
Circuit two_qubit_stretches(Circuit circuit, const PassContext& context);

/// The same, and in the body a stretch may be replaced by its product with a swap, which renames the wires.
Circuit mirrored_stretches(Circuit circuit, const PassContext& context);

}  // namespace isinglass
