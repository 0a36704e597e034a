// See bits_at_end.cpp.
#pragma once

#include "passes/pass.h"

namespace isinglass {

/// A reversible classical map right before the final measurements is done on the measured bits. Source
/// circuits; only where it saves a gate on several wires.
Circuit bits_at_end(Circuit circuit, const PassContext& context);

}  // namespace isinglass
