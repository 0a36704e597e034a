// See recover_toffolis.cpp.
#pragma once

#include "passes/pass.h"

namespace isinglass {

/// Toffolis and doubly controlled Zs that were written out as Clifford and T gates become one operation
/// again. A circuit in which none is found is returned unchanged.
Circuit recover_toffolis(Circuit circuit, const PassContext& context);

}  // namespace isinglass
