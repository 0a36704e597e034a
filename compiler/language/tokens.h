// What stands between the text and the generated parser: a stream of characters without a copy of the text,
// the lexer with the rules that a lexer grammar cannot state, and a token stream that keeps one statement
// only.
#pragma once

#include <cstdint>
#include <memory>
#include <string>
#include <string_view>
#include <vector>

#include "OpenQasm3Lexer.h"
#include "antlr4-runtime.h"
#include "language/plain_call.h"

namespace isinglass {

/// The characters of a valid UTF-8 text; index() and seek() are byte offsets.
class TextStream final : public antlr4::CharStream {
 public:
  explicit TextStream(std::string_view text) : text_(text) {}

  void consume() override;
  std::size_t LA(ssize_t distance) override;
  ssize_t mark() override { return -1; }
  void release(ssize_t) override {}
  std::size_t index() override { return at_; }
  void seek(std::size_t index) override { at_ = index; }
  std::size_t size() override { return text_.size(); }
  std::string getSourceName() const override { return "text"; }
  std::string getText(const antlr4::misc::Interval& bytes) override;
  std::string toString() const override { return std::string(text_); }

 private:
  std::string_view text_;
  std::size_t at_ = 0;
};

/// The lexer, with what depends on more than the characters of a token: an `@` that does not follow a
/// modifier opens an annotation, which reaches to the end of the line; and each version has its own reserved
/// words.
class Tokens final : public OpenQasm3Lexer {
 public:
  explicit Tokens(std::string_view text) : OpenQasm3Lexer(&stream_), stream_(text), text_(text) {}

  /// Goes on at `from`, the start of a statement, with the reserved words of `language` (2, 3, or 0 for
  /// both).
  void restart(const Position& from, int language);
  std::unique_ptr<antlr4::Token> nextToken() override;
  std::string_view text() const { return text_; }

 private:
  void see_modifier(std::size_t token_type);
  void make_annotation(antlr4::CommonToken& sign);

  TextStream stream_;
  std::string_view text_;
  int language_ = 0;
  std::size_t modifier_depth_ = 0;  // open parentheses since `pow(`, `ctrl(` or `negctrl(`
  bool after_modifier_word_ = false;
  bool after_modifier_ = false;  // an `@` that comes now belongs to it
};

/// Thrown when reading cannot go on behind this token.
struct ReadingEnds {
  ReadingEnds(const antlr4::Token& token, std::string what, std::string why);

  Position at;
  std::string text;
  std::string note;
};

/// How many tokens one statement may have, those of nested statements not counted.
inline constexpr std::size_t max_statement_tokens = 1 << 18;

/// The tokens of the statement being read. Those of a nested statement are forgotten when it is complete, so
/// that the memory does not grow with the length of a block.
class TokenWindow final : public antlr4::TokenStream {
 public:
  explicit TokenWindow(Tokens& source) : source_(source) {}

  void restart();
  /// Forgets the tokens from index `first` to the current one, which takes their place.
  void forget_from(std::size_t first);

  /// Throws ReadingEnds beyond max_statement_tokens.
  antlr4::Token* LT(ssize_t distance) override;
  /// The place behind the last token read: where the next statement begins, but for blanks.
  Position position() const;
  /// The token read last, forgotten or not; null when nothing was read since restart().
  antlr4::Token* last() const;
  /// Whether anything was read since restart().
  bool has_moved() const { return last() != nullptr; }
  antlr4::Token* get(std::size_t index) const override { return tokens_[index].get(); }
  antlr4::TokenSource* getTokenSource() const override { return &source_; }
  void consume() override { ++next_; }
  std::size_t LA(ssize_t distance) override { return LT(distance)->getType(); }
  ssize_t mark() override { return 0; }
  void release(ssize_t) override {}
  std::size_t index() override { return next_; }
  void seek(std::size_t index) override { next_ = index; }
  std::size_t size() override { return tokens_.size(); }
  std::string getSourceName() const override { return "text"; }
  std::string getText(const antlr4::misc::Interval&) override { return {}; }
  std::string getText() override { return {}; }
  std::string getText(antlr4::RuleContext*) override { return {}; }
  std::string getText(antlr4::Token*, antlr4::Token*) override { return {}; }

 private:
  Tokens& source_;
  std::vector<std::unique_ptr<antlr4::Token>> tokens_;
  std::unique_ptr<antlr4::Token> last_forgotten_;
  std::size_t next_ = 0;
};

}  // namespace isinglass
