// A native program on its way back in: which source qubit its pragmas put on which ion.
#pragma once

#include "circuit/circuit.h"
#include "targets/place.h"

namespace isinglass {

/// The placed circuit of a native program, as the language room reads it. Registers, start and end are those
/// that the pragmas name; other pragmas are kept. Throws Failure(source_at_fault) where a pragma makes no
/// sense, a qubit has no start or no end, or the program is none of ours.
Placed plan_of(const Circuit& native);

}  // namespace isinglass
