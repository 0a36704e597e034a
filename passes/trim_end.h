// See trim_end.cpp.
#pragma once

#include "passes/pass.h"

namespace isinglass {

/// Interactions that no measurement, and no state that is kept, can tell are gone. Lowered circuits only.
Circuit trim_end(Circuit circuit, const PassContext& context);

}  // namespace isinglass
