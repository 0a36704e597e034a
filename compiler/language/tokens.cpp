// Fetching of tokens; see tokens.h.
#include "language/tokens.h"

#include <algorithm>

namespace isinglass {

namespace {

/// Bytes of the character that starts with this byte, in valid UTF-8.
std::size_t width(char first) {
  const auto byte = static_cast<unsigned char>(first);
  return byte < 0x80 ? 1 : byte < 0xE0 ? 2 : byte < 0xF0 ? 3 : 4;
}

std::size_t code_point(std::string_view character) {
  const auto byte = [&](std::size_t i) {
    return static_cast<std::size_t>(static_cast<unsigned char>(character[i]));
  };
  switch (character.size()) {
    case 1:
      return byte(0);
    case 2:
      return (byte(0) & 0x1F) << 6 | (byte(1) & 0x3F);
    case 3:
      return (byte(0) & 0x0F) << 12 | (byte(1) & 0x3F) << 6 | (byte(2) & 0x3F);
    default:
      return (byte(0) & 0x07) << 18 | (byte(1) & 0x3F) << 12 | (byte(2) & 0x3F) << 6 | (byte(3) & 0x3F);
  }
}

/// Number of characters in valid UTF-8.
std::size_t characters(std::string_view text) {
  return static_cast<std::size_t>(std::count_if(
      text.begin(), text.end(), [](char c) { return (static_cast<unsigned char>(c) & 0xC0) != 0x80; }));
}

bool is_word(std::size_t type) {
  return type >= OpenQasm3Lexer::OPENQASM && type <= OpenQasm3Lexer::IM;
}

bool is_word_of_version_2(std::size_t type) {
  switch (type) {
    case OpenQasm3Lexer::OPENQASM:
    case OpenQasm3Lexer::INCLUDE:
    case OpenQasm3Lexer::GATE:
    case OpenQasm3Lexer::OPAQUE:
    case OpenQasm3Lexer::IF:
    case OpenQasm3Lexer::QREG:
    case OpenQasm3Lexer::CREG:
    case OpenQasm3Lexer::MEASURE:
    case OpenQasm3Lexer::RESET:
    case OpenQasm3Lexer::BARRIER:
      return true;
    default:
      return false;
  }
}

bool is_reserved(std::size_t word, int language) {
  if (language == 2) return is_word_of_version_2(word);
  return language == 0 || word != OpenQasm3Lexer::OPAQUE;
}

}  // namespace

ReadingEnds::ReadingEnds(const antlr4::Token& token, std::string what, std::string why)
    : at{token.getStartIndex(), token.getLine(), token.getCharPositionInLine() + 1},
      text(std::move(what)),
      note(std::move(why)) {}

void TextStream::consume() {
  if (at_ < text_.size()) at_ += width(text_[at_]);
}

std::size_t TextStream::LA(ssize_t distance) {
  if (distance == 0) return 0;
  std::size_t at = at_;
  if (distance < 0) {
    for (; distance < 0; ++distance) {
      if (at == 0) return EOF;
      do --at;
      while (at > 0 && (static_cast<unsigned char>(text_[at]) & 0xC0) == 0x80);
    }
  } else {
    for (; distance > 1 && at < text_.size(); --distance) at += width(text_[at]);
  }
  if (at >= text_.size()) return EOF;
  return code_point(text_.substr(at, width(text_[at])));
}

std::string TextStream::getText(const antlr4::misc::Interval& bytes) {
  const auto first = static_cast<std::size_t>(bytes.a);
  if (bytes.b < bytes.a || first >= text_.size()) return {};
  return std::string(text_.substr(first, static_cast<std::size_t>(bytes.b - bytes.a) + 1));
}

void Tokens::restart(const Position& from, int language) {
  stream_.seek(from.offset);
  setLine(from.line);
  setCharPositionInLine(from.column - 1);
  hitEOF = false;
  modeStack.clear();
  mode = DEFAULT_MODE;
  language_ = language;
  modifier_depth_ = 0;
  after_modifier_word_ = after_modifier_ = false;
}

std::unique_ptr<antlr4::Token> Tokens::nextToken() {
  std::unique_ptr<antlr4::Token> next = OpenQasm3Lexer::nextToken();
  auto& common = static_cast<antlr4::CommonToken&>(*next);
  const std::size_t token_type = common.getType();
  if (is_word(token_type) && !is_reserved(token_type, language_)) {
    if (mode != DEFAULT_MODE) popMode();  // `cal` and `defcal` had begun a body
    common.setType(IDENTIFIER);
  }
  if (token_type == AT && !after_modifier_) make_annotation(common);
  see_modifier(common.getType());
  return next;
}

void Tokens::see_modifier(std::size_t token_type) {
  after_modifier_ = false;
  if (modifier_depth_ > 0 || after_modifier_word_) {
    if (token_type == LEFT_PAREN) ++modifier_depth_;
    if (token_type == RIGHT_PAREN && modifier_depth_ > 0) after_modifier_ = --modifier_depth_ == 0;
  }
  after_modifier_word_ =
      token_type == INV || token_type == POW || token_type == CTRL || token_type == NEGCTRL;
  if (after_modifier_word_) after_modifier_ = true;
}

void Tokens::make_annotation(antlr4::CommonToken& sign) {
  const std::size_t start = sign.getStartIndex();
  std::size_t end = std::min(text_.find('\n', start), text_.size());
  while (text_[end - 1] == '\r') --end;
  sign.setType(ANNOTATION);
  sign.setStopIndex(end - 1);
  stream_.seek(end);
}

void TokenWindow::restart() {
  tokens_.clear();
  last_forgotten_.reset();
  next_ = 0;
}

void TokenWindow::forget_from(std::size_t first) {
  if (next_ <= first) return;
  if (last() == tokens_[next_ - 1].get()) last_forgotten_ = std::move(tokens_[next_ - 1]);
  tokens_.erase(tokens_.begin() + static_cast<std::ptrdiff_t>(first),
                tokens_.begin() + static_cast<std::ptrdiff_t>(next_));
  next_ = first;
}

antlr4::Token* TokenWindow::last() const {
  antlr4::Token* kept = next_ > 0 ? tokens_[next_ - 1].get() : nullptr;
  antlr4::Token* forgotten = last_forgotten_.get();
  if (kept == nullptr || forgotten == nullptr) return kept != nullptr ? kept : forgotten;
  return forgotten->getStartIndex() > kept->getStartIndex() ? forgotten : kept;
}

Position TokenWindow::position() const {
  const antlr4::Token& end = *last();
  const std::size_t start = end.getStartIndex();
  const std::string_view text = source_.text().substr(start, end.getStopIndex() + 1 - start);
  return {start + text.size(), end.getLine(), end.getCharPositionInLine() + 1 + characters(text)};
}

antlr4::Token* TokenWindow::LT(ssize_t distance) {
  if (distance < 0) {
    const auto back = static_cast<std::size_t>(-distance);
    if (back == 1) return last();
    return next_ >= back ? tokens_[next_ - back].get() : nullptr;
  }
  const std::size_t wanted = next_ + static_cast<std::size_t>(distance) - 1;
  while (tokens_.size() <= wanted) {
    if (!tokens_.empty() && tokens_.back()->getType() == antlr4::Token::EOF) return tokens_.back().get();
    if (tokens_.size() >= max_statement_tokens) {
      throw ReadingEnds(*tokens_.front(), "this statement is too long to be read",
                        "note: at most " + std::to_string(max_statement_tokens) + " words and signs");
    }
    tokens_.push_back(source_.nextToken());
    static_cast<antlr4::CommonToken&>(*tokens_.back()).setTokenIndex(tokens_.size() - 1);
  }
  return tokens_[wanted].get();
}

}  // namespace isinglass
