// See trim_start.cpp.
#pragma once

#include "passes/pass.h"

namespace isinglass {

/// Interactions on wires in a known state do no more than that state needs. Lowered circuits only.
Circuit trim_start(Circuit circuit, const PassContext& context);

}  // namespace isinglass
