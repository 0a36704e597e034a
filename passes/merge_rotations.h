// See merge_rotations.cpp.
#pragma once

#include "passes/pass.h"

namespace isinglass {

/// No two interactions of the same pair and axes, and no two symbolic rotations of the same wire and axis,
/// are left apart by nothing but what shares their axes. Lowered circuits only. Linear.
Circuit merge_rotations(Circuit circuit, const PassContext& context);
std::optional<Circuit> merge_rotations_beside(const Circuit& circuit, const PassContext& context);

}  // namespace isinglass
