// See rename_swaps.cpp.
#pragma once

#include "passes/pass.h"

namespace isinglass {

/// Whether an `end` can stop the program before its last operation.
bool may_end_early(const Circuit& circuit);

/// Whether wires of the body may change their names. Not where the program may end early, since
/// Circuit::end_wire holds at every end; and not where the source names physical qubits, which stay where
/// they are.
bool may_rename_wires(const Circuit& circuit);

/// No swap without controls is left in the body; those of child blocks stay.
Circuit rename_swaps(Circuit circuit, const PassContext& context);
std::optional<Circuit> rename_swaps_beside(const Circuit& circuit, const PassContext& context);

}  // namespace isinglass
