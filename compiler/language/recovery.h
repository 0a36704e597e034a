// What happens when a text does not follow the grammar: one message in plain words at the right place, then
// on with the next statement, so that one run shows all independent errors.
#pragma once

#include <functional>
#include <string>
#include <vector>

#include "OpenQasm3Parser.h"
#include "language/source.h"
#include "language/tokens.h"

namespace isinglass {

/// An error inside a statement leaves all rules up to that statement at once. The rest of the statement is
/// skipped: to its `;`, or to the end of the block that it opened.
class Recovery final : public antlr4::ANTLRErrorStrategy {
 public:
  struct Error {
    syntax::Span at;
    std::string text;
    std::vector<std::string> notes;
    std::vector<std::string> names;  // identifiers of the statement that is skipped, some of the first
  };

  Recovery(const Source& source, std::uint16_t index, TokenWindow& window, std::function<void(Error)> report)
      : source_(source), index_(index), window_(window), report_(std::move(report)) {}

  /// The tokens from this index on are those of the innermost statement being read.
  void statement_begins_at(std::size_t index) { first_ = index; }

  void reset(antlr4::Parser*) override {}
  antlr4::Token* recoverInline(antlr4::Parser* parser) override;
  void recover(antlr4::Parser* parser, std::exception_ptr error) override;
  void sync(antlr4::Parser*) override {}
  bool inErrorRecoveryMode(antlr4::Parser*) override { return false; }
  void reportMatch(antlr4::Parser*) override {}
  void reportError(antlr4::Parser*, const antlr4::RecognitionException&) override {}

 private:
  using P = OpenQasm3Parser;
  using Expected = antlr4::misc::IntervalSet;

  void explain(antlr4::Parser& parser, const antlr4::Token& found);
  bool explain_malformed(const antlr4::Token& found);
  bool explain_unclosed_block();
  bool explain_missing_semicolon(const Expected& expected, const antlr4::Token& found);
  bool explain_statement_start(const antlr4::Token& found);
  bool explain_habit(antlr4::Parser& parser, const antlr4::Token& found);
  void explain_expected(antlr4::Parser& parser, const Expected& expected, const antlr4::Token& found);
  std::vector<std::string> where_opened(const Expected& expected, const antlr4::Token& found);
  void skip();
  void skip_parentheses();
  void collect_name(const antlr4::Token& token);

  /// The last token of this statement before the current one; null at its start.
  const antlr4::Token* previous();
  const antlr4::Token* unclosed(std::size_t first, std::size_t open, std::size_t close);
  std::string quoted(const antlr4::Token& token) const;
  syntax::Span at(const antlr4::Token& token) const;
  syntax::Span behind_last() const;
  void say(syntax::Span at, std::string text, std::vector<std::string> notes = {});

  const Source& source_;
  std::uint16_t index_;
  TokenWindow& window_;
  std::function<void(Error)> report_;
  std::size_t first_ = 0;
  std::vector<Error> pending_;      // of the statement that is being left
  std::vector<std::string> names_;  // likewise
  bool explained_ = false;          // an error is under way
  bool ends_here_ = false;          // only a `;` was missing: nothing is to be skipped
  bool end_of_file_said_ = false;
};

}  // namespace isinglass
