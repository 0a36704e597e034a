// See search_blocks.cpp.
#pragma once

#include "passes/pass.h"

namespace isinglass {

/// Blocks of three and four wires are synthesized numerically and replaced where that lowers the estimated
/// error. Works on lowered circuits, for as many random starts as the effort allows or until the deadline.
Circuit search_blocks(Circuit circuit, const PassContext& context);

}  // namespace isinglass
