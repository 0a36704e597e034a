// Messages about text that does not follow the grammar; see recovery.h.
#include "language/recovery.h"

#include <fmt/format.h>

#include <algorithm>
#include <array>

#include "language/tree.h"

namespace isinglass {

namespace {

using P = OpenQasm3Parser;
using antlr4::Token;

constexpr std::size_t most_names = 64;
constexpr std::size_t longest_quote = 40;

bool is_word(std::size_t type) {
  return type >= P::OPENQASM && type <= P::IM;
}
bool is_type_word(std::size_t type) {
  return type >= P::QUBIT && type <= P::STRETCH;
}
bool is_operator(std::size_t type) {
  return type >= P::CONCATENATE && type <= P::LOGICAL_NOT;
}

/// Words that begin a statement: after a complete one they mean that its `;` is missing.
bool begins_statement(std::size_t type) {
  switch (type) {
    case P::ELSE:
    case P::IN:
    case P::CASE:
    case P::DEFAULT:
    case P::DIM:
    case P::VOID:
    case P::TRUE:
    case P::FALSE:
    case P::IM:
    case P::READONLY:
    case P::MUTABLE:
      return false;
    default:
      return is_word(type);
  }
}

/// What may begin an expression, a type or an operand is named by one word in "expected ...".
constexpr std::array expression_starts = {
    P::IDENTIFIER, P::INTEGER, P::REAL,       P::IMAGINARY,  P::TIMING,         P::TRUE,
    P::FALSE,      P::STRING,  P::LEFT_PAREN, P::DURATIONOF, P::MINUS,          P::LOGICAL_NOT,
    P::BIT_NOT,    P::BIT,     P::BOOL,       P::INT,        P::UINT,           P::FLOAT,
    P::ANGLE,      P::COMPLEX, P::DURATION,   P::STRETCH,    P::HARDWARE_QUBIT, P::POW};

/// A long name or number is quoted up to a length, cut between characters.
std::string shortened(std::string text) {
  if (text.size() <= longest_quote) return text;
  std::size_t end = longest_quote;
  while (end > 0 && (static_cast<unsigned char>(text[end]) & 0xC0) == 0x80) --end;
  return text.substr(0, end) + "...";
}

std::string display_name(const antlr4::Parser& parser, std::size_t type) {
  switch (type) {
    case P::STRING:
      return "a text between quotes";
    case P::COMPOUND_ASSIGNMENT:
      return "an assignment";
    case P::SEMICOLON:
      return "';'";
    case P::LEFT_BRACE:
    case P::CALIBRATION_OPEN:
    case P::CALIBRATION_HEAD:
      return "'{'";
    case P::RIGHT_BRACE:
      return "'}'";
    default:
      return parser.getVocabulary().getDisplayName(type);
  }
}

std::string listed(const std::vector<std::string>& words) {
  std::string text;
  for (std::size_t i = 0; i < words.size(); ++i) {
    if (i > 0) text += i + 1 == words.size() ? " or " : ", ";
    text += words[i];
  }
  return text;
}

}  // namespace

Token* Recovery::recoverInline(antlr4::Parser* parser) {
  // A block whose next token neither begins a statement nor is its `}`: the fault lies in that statement, not
  // in the block.
  auto* block = dynamic_cast<P::BlockContext*>(parser->getContext());
  if (block != nullptr && !block->children.empty()) {
    while (window_.LA(1) != P::RIGHT_BRACE && window_.LA(1) != Token::EOF) {
      static_cast<P*>(parser)->statement();
    }
    if (window_.LA(1) == P::RIGHT_BRACE) return parser->consume();
  }
  throw antlr4::InputMismatchException(parser);
}

void Recovery::recover(antlr4::Parser* parser, std::exception_ptr error) {
  if (!explained_) {
    explained_ = true;
    try {
      std::rethrow_exception(error);
    } catch (const antlr4::RecognitionException& recognition) {
      explain(*parser, *recognition.getOffendingToken());
    }
  }
  if (parser->getContext()->getRuleIndex() != P::RuleStatement) std::rethrow_exception(error);
  explained_ = false;
  for (std::size_t i = first_; i < window_.index(); ++i) collect_name(*window_.get(i));
  if (!std::exchange(ends_here_, false)) skip();
  for (Error& one : pending_) {
    one.names = names_;
    report_(std::move(one));
  }
  pending_.clear();
  names_.clear();
}

// ---- what is wrong

void Recovery::explain(antlr4::Parser& parser, const Token& found) {
  if (explain_malformed(found)) return;
  if (found.getType() == Token::EOF && explain_unclosed_block()) return;
  const Expected expected = parser.getExpectedTokens();
  const bool ahead = &found != parser.getCurrentToken();
  if (!ahead && explain_missing_semicolon(expected, found)) return;
  if (explain_habit(parser, found)) return;
  if (ahead) {
    say(at(found), fmt::format("{} cannot stand here", quoted(found)));
  } else {
    explain_expected(parser, expected, found);
  }
}

bool Recovery::explain_malformed(const Token& found) {
  switch (found.getType()) {
    case P::BAD_NUMBER: {
      const std::string number = quoted(found);
      const bool underscores = number.find("__") != std::string::npos || number.ends_with("_'");
      say(at(found), number + " is not a number",
          {underscores ? "note: a single '_' may stand between two digits"
                       : "note: a number ends before a letter, and a name cannot begin with a digit"});
      return true;
    }
    case P::OPEN_STRING:
      say(at(found), "this text has no closing quote on its line");
      return true;
    case P::OPEN_COMMENT: {
      syntax::Span start = at(found);
      start.length = 2;
      say(start, "this comment is never closed", {"help: end it with '*/'"});
      return true;
    }
    case P::STRAY_COMMENT_END:
      say(at(found), "'*/' closes no comment",
          {"note: comments do not nest, so the first '*/' ended the comment"});
      return true;
    case P::UNKNOWN:
      say(at(found), fmt::format("the character {} has no meaning here", quoted(found)));
      return true;
    default:
      return false;
  }
}

bool Recovery::explain_unclosed_block() {
  const Token* open = unclosed(0, P::LEFT_BRACE, P::RIGHT_BRACE);
  if (open == nullptr) open = unclosed(0, P::CALIBRATION_OPEN, P::CALIBRATION_CLOSE);
  if (open == nullptr) return false;
  if (!std::exchange(end_of_file_said_, true)) say(at(*open), "this '{' is never closed");
  return true;
}

bool Recovery::explain_missing_semicolon(const Expected& expected, const Token& found) {
  const Token* before = previous();
  if (before == nullptr || !expected.contains(std::size_t{P::SEMICOLON})) return false;
  const std::size_t type = found.getType();
  ends_here_ = begins_statement(type) || type == P::RIGHT_BRACE || type == Token::EOF ||
               before->getLine() < found.getLine();
  if (ends_here_) say(behind_last(), fmt::format("missing ';' after {}", quoted(*before)));
  return ends_here_;
}

bool Recovery::explain_statement_start(const Token& found) {
  switch (found.getType()) {
    case P::SEMICOLON:
      say(at(found), "';' stands alone", {"note: there is no empty statement; '{}' does nothing"});
      return true;
    case P::RIGHT_BRACE:
      say(at(found), "this '}' closes nothing");
      return true;
    case P::ELSE:
      say(at(found), "'else' without an 'if' before it");
      return true;
    default:
      say(at(found), fmt::format("a statement cannot begin with {}", quoted(found)));
      return true;
  }
}

/// Slips that come from other languages or older forms deserve an answer of their own.
bool Recovery::explain_habit(antlr4::Parser& parser, const Token& found) {
  const std::size_t rule = parser.getContext()->getRuleIndex();
  const std::size_t type = found.getType();
  const Token* before = previous();
  const std::size_t last = before == nullptr ? Token::INVALID_TYPE : before->getType();
  const auto is = [&](std::string text, std::vector<std::string> notes = {}) {
    say(at(found), std::move(text), std::move(notes));
    return true;
  };

  if (rule == P::RuleStatement && before == nullptr) return explain_statement_start(found);
  if (rule == P::RuleStatement && last == P::ANNOTATION)
    return is("an annotation must be followed by a statement");
  if (rule == P::RuleVersion) {
    return is(fmt::format("expected the version of the language, found {}", quoted(found)),
              {"help: write 'OPENQASM 3.0;' or 'OPENQASM 2.0;'"});
  }
  if (type == P::LEFT_BRACKET && last == P::IDENTIFIER &&
      (rule == P::RuleQubitDeclaration || rule == P::RuleDeclaration)) {
    return is("the size stands before the name", {"help: write 'qubit[2] q;' or 'bit[2] c;'"});
  }
  if (last == P::FOR) {
    return is(fmt::format("expected the type of the loop variable, found {}", quoted(found)),
              {"help: write 'for int i in [0:9] { ... }'"});
  }
  if (type == P::EQUALS && rule == P::RuleParenthesized) {
    return is("unexpected '='", {"help: '==' compares; an assignment is a statement of its own"});
  }
  if (type == P::SEMICOLON && (last == P::CONCATENATE || (last == P::MINUS && window_.LA(-2) == P::MINUS))) {
    return is("an operand is missing before ';'", {"help: write 'i += 1;' or 'i -= 1;' to count"});
  }
  if (type == P::MEASURE) {
    return is("a measurement is no part of an expression",
              {"help: measure into a bit first: 'bit b = measure q;'"});
  }
  if (rule == P::RuleInclude && last == P::INCLUDE) {
    return is("'include' needs a path between quotes", {"help: write 'include \"stdgates.inc\";'"});
  }
  if (is_type_word(type) && (rule == P::RuleNames || rule == P::RuleGate)) {
    return is("the parameters and qubits of a gate have no types",
              {"help: write 'gate g(angle1) a, b { ... }'"});
  }
  if (type == P::IDENTIFIER &&
      (rule == P::RuleParameters || rule == P::RuleParameter || rule == P::RuleSubroutine) &&
      (last == P::LEFT_PAREN || last == P::COMMA)) {
    return is(fmt::format("the parameter {} has no type", quoted(found)),
              {"help: write 'qubit q' or 'int[8] n'"});
  }
  const bool after_operand = last == P::IDENTIFIER || last == P::HARDWARE_QUBIT || last == P::RIGHT_BRACKET;
  if ((type == P::IDENTIFIER || type == P::HARDWARE_QUBIT) && after_operand &&
      (rule == P::RuleExpressionStatement || rule == P::RuleModifiedGate)) {
    return is(fmt::format("expected ',' or ';' before {}", quoted(found)));
  }
  if (type == P::LEFT_PAREN && rule == P::RuleDeclaration) {
    return is("a statement cannot begin with a conversion");
  }
  return false;
}

void Recovery::explain_expected(antlr4::Parser& parser, const Expected& expected, const Token& found) {
  const auto wants = [&](std::size_t type) { return expected.contains(type); };
  const bool expression = wants(P::INTEGER) && wants(P::REAL);
  const bool type = wants(P::INT) && wants(P::FLOAT);
  if (is_word(found.getType()) && wants(P::IDENTIFIER) && !expression) {
    say(at(found), fmt::format("{} is a reserved word and cannot be a name", quoted(found)));
    return;
  }
  std::vector<std::string> words;
  if (expression) {
    words.emplace_back("an expression");
  } else if (type) {
    words.emplace_back("a type");
  } else if (wants(P::HARDWARE_QUBIT)) {
    words.emplace_back("an operand");
  } else if (wants(P::IDENTIFIER)) {
    words.emplace_back("a name");
  }
  const bool ends = wants(P::SEMICOLON) || wants(P::RIGHT_PAREN) || wants(P::RIGHT_BRACKET);
  for (const ssize_t one : expected.toList()) {
    const auto token = static_cast<std::size_t>(one);
    const bool named =
        std::find(expression_starts.begin(), expression_starts.end(), token) != expression_starts.end();
    const bool value = expression && (token == P::MEASURE || token == P::LEFT_BRACE);
    const bool said = value || (named && !words.empty());
    // An operator, an index or a call can follow almost anything: no news.
    const bool obvious = is_operator(token) || (ends && (token == P::LEFT_BRACKET || token == P::LEFT_PAREN ||
                                                         token == P::COMPOUND_ASSIGNMENT || named));
    if (said || obvious || token == Token::EOF || (type && is_type_word(token))) continue;
    words.push_back(display_name(parser, token));
  }
  std::vector<std::string> notes = where_opened(expected, found);
  constexpr std::size_t most_words = 4;
  if (words.empty() || words.size() > most_words) {
    say(at(found), fmt::format("unexpected {}", quoted(found)), std::move(notes));
  } else {
    say(at(found), fmt::format("expected {}, found {}", listed(words), quoted(found)), std::move(notes));
  }
}

/// For a missing `)` or `]`: where its partner stands, unless that is plain to see.
std::vector<std::string> Recovery::where_opened(const Expected& expected, const Token& found) {
  std::vector<std::string> notes;
  for (const auto& [open, close] :
       {std::pair{P::LEFT_PAREN, P::RIGHT_PAREN}, {P::LEFT_BRACKET, P::RIGHT_BRACKET}}) {
    if (!expected.contains(std::size_t{close})) continue;
    const Token* opened = unclosed(first_, open, close);
    if (opened != nullptr && opened->getLine() != found.getLine()) {
      notes.push_back(fmt::format("note: {} was opened in line {}, column {}", quoted(*opened),
                                  opened->getLine(), opened->getCharPositionInLine() + 1));
    }
  }
  return notes;
}

// ---- going on

/// To behind the end of the statement: its `;`, or the `}` of the block that it opened. The `}` of a block
/// around it stays.
void Recovery::skip() {
  std::size_t depth = 0;
  for (std::size_t i = first_; i < window_.index(); ++i) {
    const std::size_t type = window_.get(i)->getType();
    if (type == P::LEFT_BRACE) ++depth;
    if (type == P::RIGHT_BRACE && depth > 0) --depth;
  }
  if (first_ < window_.index() && window_.get(first_)->getType() == P::FOR) skip_parentheses();
  for (std::size_t type = window_.LA(1); type != Token::EOF; type = window_.LA(1)) {
    if (type == P::RIGHT_BRACE && depth == 0) return;
    if (type == P::LEFT_BRACE) ++depth;
    window_.consume();
    collect_name(*window_.LT(-1));
    window_.forget_from(first_);
    // What reaches to the end of its line has swallowed the `;`.
    const bool ends =
        type == P::SEMICOLON || type == P::OPEN_STRING || type == P::ANNOTATION || type == P::PRAGMA;
    if (depth == 0 && ends) return;
    if (type == P::RIGHT_BRACE && --depth == 0) {
      // `{ ... };` and `{ ... } else { ... }` belong together.
      if (window_.LA(1) == P::ELSE) continue;
      if (window_.LA(1) == P::SEMICOLON) window_.consume();
      return;
    }
  }
}

/// Over the `(int i = 0; i < n; i++)` of other languages, whose `;` ends no statement.
void Recovery::skip_parentheses() {
  if (window_.LA(1) != P::LEFT_PAREN) return;
  std::size_t depth = 0;
  do {
    const std::size_t type = window_.LA(1);
    if (type == Token::EOF || type == P::LEFT_BRACE || type == P::RIGHT_BRACE) return;
    if (type == P::LEFT_PAREN) ++depth;
    if (type == P::RIGHT_PAREN) --depth;
    window_.consume();
    window_.forget_from(first_);
  } while (depth > 0);
}

void Recovery::collect_name(const Token& token) {
  if (token.getType() != P::IDENTIFIER || names_.size() >= most_names) return;
  const std::size_t length = token.getStopIndex() + 1 - token.getStartIndex();
  names_.emplace_back(source_.text.substr(token.getStartIndex(), length));
}

// ---- places

const Token* Recovery::previous() {
  return window_.index() > first_ ? window_.LT(-1) : nullptr;
}

const Token* Recovery::unclosed(std::size_t first, std::size_t open, std::size_t close) {
  std::vector<const Token*> opened;
  for (std::size_t i = first; i < window_.size(); ++i) {
    const Token* token = window_.get(i);
    if (token->getType() == open) opened.push_back(token);
    if (token->getType() == close && !opened.empty()) opened.pop_back();
  }
  return opened.empty() ? nullptr : opened.back();
}

std::string Recovery::quoted(const Token& token) const {
  if (token.getType() == Token::EOF) return "the end of the file";
  const std::size_t length = token.getStopIndex() + 1 - token.getStartIndex();
  std::string text(source_.text.substr(token.getStartIndex(), std::min(length, longest_quote + 4)));
  text.resize(std::min(text.size(), text.find_first_of("\r\n")));
  return "'" + shortened(std::move(text)) + "'";
}

syntax::Span Recovery::at(const Token& token) const {
  return span_of(source_, index_, token, token);
}

syntax::Span Recovery::behind_last() const {
  const Position position = window_.position();
  return {static_cast<std::uint32_t>(position.offset), static_cast<std::uint32_t>(position.line),
          static_cast<std::uint32_t>(position.column), 1, index_};
}

void Recovery::say(syntax::Span place, std::string text, std::vector<std::string> notes) {
  pending_.push_back({place, std::move(text), std::move(notes), {}});
}

}  // namespace isinglass
