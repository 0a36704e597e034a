// OpenQASM text to statements, one at a time: the grammar decides, plain gate calls go through a fast lane,
// and the tree of one statement is gone before the next is read.
#pragma once

#include <cstddef>
#include <string>
#include <vector>

#include "circuit/message.h"
#include "language/plain_call.h"
#include "language/source.h"
#include "language/syntax.h"

namespace isinglass {

/// How deep blocks, parentheses and operators may nest; beyond it reading ends with a message.
inline constexpr std::size_t max_nesting = 256;
/// How deep the operators of one expression may nest: `1 + 2 + ... ` with that many terms is the deepest
/// tree.
inline constexpr std::size_t max_expression_depth = 1000;
/// Reading stops after so many errors of syntax in one text.
inline constexpr std::size_t max_syntax_errors = 100;

/// What a text is handed to. Called once a statement, in the order of the text.
class StatementSink {
 public:
  virtual ~StatementSink() = default;

  /// The version of the language that holds from here on: 2, 3, or 0 while it is not known yet (then as 3,
  /// with the keywords of 2 accepted too). Asked before every statement that the grammar reads.
  virtual int language() const = 0;

  /// A plain gate call at the outermost level. Returns whether it was taken; a call that is declined (unknown
  /// names, wrong counts, an index out of range, anything unusual) comes again as a statement. Never called
  /// while language() is 0.
  virtual bool plain_call(const PlainCall& call, const PlainNames& names) = 0;

  virtual void statement(syntax::Statement&& statement) = 0;

  /// An error or warning of syntax. An erroneous statement is skipped; `names` are all identifiers in it, so
  /// that a later use of one of them need not be reported as an unknown name.
  virtual void syntax_message(Message message, std::vector<std::string> names) = 0;
};

/// Reads the text with this index. Returns when the text is at its end, or earlier after max_syntax_errors or
/// an error after which reading cannot go on (nesting too deep, a binary file). To include a file, call it
/// from within statement() with the included text and the same sink.
void read_statements(const Sources& sources, std::uint16_t source, StatementSink& sink);

}  // namespace isinglass
