// Expressions of the native program, evaluated: for derived inputs and for angles of gates.
#pragma once

#include <functional>

#include "language/value.h"

namespace isinglass {

/// The value of an expression whose leaves `leaf` gives: it is called with nodes of kind input and variable,
/// and with nodes of kind index, for which it may answer with a value without a type (not a leaf). Throws
/// Fault where the language's rules are broken.
Value evaluate(const Expression& expression, const std::function<Value(const Expression&)>& leaf,
               const Rules& rules);

}  // namespace isinglass
