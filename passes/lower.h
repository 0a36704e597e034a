// See lower.cpp.
#pragma once

#include "passes/pass.h"

namespace isinglass {

/// Gates on at most two wires become r, xx, rz in normal form: one xx a controlled gate (a controlled u with
/// symbolic angles two), three a swap.
Circuit lower(Circuit circuit, const PassContext& context);

}  // namespace isinglass
