// See rename_swaps.cpp.
#pragma once

#include "passes/pass.h"

namespace isinglass {

/// No swap without controls is left in the body; those of child blocks stay.
Circuit rename_swaps(Circuit circuit, const PassContext& context);

}  // namespace isinglass
