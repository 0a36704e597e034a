// See cubic_networks.cpp.
#pragma once

#include "passes/pass.h"

namespace isinglass {

/// Networks of Toffolis and CNOTs in which no target is a control of another Toffoli are written with fewer
/// Toffolis, where the estimate says that this is cheaper. Exact. Source circuits. The result may hold swaps
/// in the program's body, for `rename-swaps`.
Circuit cubic_networks(Circuit circuit, const PassContext& context);

}  // namespace isinglass
