// See expand_controls.cpp.
#pragma once

#include "passes/pass.h"

namespace isinglass {

/// Every unitary operation of the result touches at most two wires, controls included. Exact.
Circuit expand_controls(Circuit circuit, const PassContext& context);

}  // namespace isinglass
