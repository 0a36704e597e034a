// Spelling of operators; see syntax.h.
#include "language/syntax.h"

namespace isinglass::syntax {

const char* spelling(Operator op) {
  constexpr const char* table[] = {"",  "**", "-", "!",  "~",  "*",  "/", "%", "+", "-",  "<<", ">>",
                                   "<", "<=", ">", ">=", "==", "!=", "&", "^", "|", "&&", "||", "++"};
  return table[static_cast<std::size_t>(op)];
}

}  // namespace isinglass::syntax
