// See known_start.cpp.
#pragma once

#include "passes/pass.h"

namespace isinglass {

/// Controls on wires that are known to hold 0 or 1 are resolved. Source circuits.
Circuit known_start(Circuit circuit, const PassContext& context);

}  // namespace isinglass
