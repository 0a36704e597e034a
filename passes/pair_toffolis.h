// See pair_toffolis.cpp.
#pragma once

#include "passes/pass.h"

namespace isinglass {

/// Toffolis whose leftover phases cancel against each other take fewer interactions: 3 in pairs, 4 in groups.
/// Others stay as they are, except that those on one target turn their ends to each other.
Circuit pair_toffolis(Circuit circuit, const PassContext& context);

}  // namespace isinglass
