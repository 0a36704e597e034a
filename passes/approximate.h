// See approximate.cpp.
#pragma once

#include "passes/pass.h"

namespace isinglass {

struct Approximation {
  Circuit circuit;
  double infidelity = 0;  // at most this much was added to the whole unitary's infidelity
};

/// Leaves out the smallest interactions of the body while that lowers the total estimated error and adds at
/// most context.tolerance. Lowered circuits only; to be run once, since every run may take the whole
/// tolerance.
Approximation approximated(Circuit circuit, const PassContext& context);

/// The same as a pass.
Circuit approximate(Circuit circuit, const PassContext& context);

}  // namespace isinglass
