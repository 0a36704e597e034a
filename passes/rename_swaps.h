// See rename_swaps.cpp.
#pragma once

#include "passes/pass.h"

namespace isinglass {

/// Whether an `end` can stop the program before its last operation. Circuit::end_wire holds at every end, so
/// wires must keep their names then.
bool may_end_early(const Circuit& circuit);

/// No swap without controls is left in the body; those of child blocks stay.
Circuit rename_swaps(Circuit circuit, const PassContext& context);

}  // namespace isinglass
