// See merge_gates.cpp.
#pragma once

#include "passes/pass.h"

namespace isinglass {

/// Equal gates with any number of controls that nothing keeps apart become one, or none. Source circuits.
Circuit merge_gates(Circuit circuit, const PassContext& context);

}  // namespace isinglass
