// See cubic_networks.cpp.
#pragma once

#include <optional>

#include "passes/pass.h"

namespace isinglass {

/// Networks of Toffolis and CNOTs in which no target is a control of another Toffoli are written with fewer
/// Toffolis, where the estimate says that this is cheaper. Exact. Source circuits. The result may hold swaps
/// in the program's body, for `rename-swaps`.
Circuit cubic_networks(Circuit circuit, const PassContext& context);
/// The same beside a circuit that is still wanted; nothing where no stretch gets cheaper.
std::optional<Circuit> cubic_networks_beside(const Circuit& circuit, const PassContext& context);

}  // namespace isinglass
