// The recognizer of plain gate calls; see plain_call.h.
//
// One pass over the bytes by recursive descent, without allocation once its lists have grown. Every function
// returns whether the text had its form; at the first "no" the whole call is left to the grammar.
#include "language/plain_call.h"

#include <charconv>
#include <cstring>
#include <numbers>

namespace isinglass {

namespace {

/// Integers and intermediate integers beyond this are left to the grammar: below it a double holds them.
constexpr std::int64_t largest_integer = std::int64_t{1} << 31;

bool is_digit(char c) {
  return c >= '0' && c <= '9';
}
bool is_name_start(char c) {
  return (c >= 'a' && c <= 'z') || (c >= 'A' && c <= 'Z') || c == '_';
}
bool is_name_part(char c) {
  return is_name_start(c) || is_digit(c);
}
/// What would make a number something else: `2ns`, `1_000`, `0x1F`, a name in other letters.
bool continues_number(char c) {
  return is_name_part(c) || c == '.' || static_cast<unsigned char>(c) >= 0x80;
}

std::uint64_t hash(std::string_view name) {
  std::uint64_t value = 0x9E3779B97F4A7C15ULL ^ name.size();
  for (const char c : name) value = (value ^ static_cast<unsigned char>(c)) * 0x100000001B3ULL;
  return value ^ value >> 29;
}

}  // namespace

// ---- names

PlainNames::PlainNames() : slots_(64, 0) {}

std::uint32_t PlainNames::number_of(std::string_view name) {
  const std::size_t mask = slots_.size() - 1;
  std::size_t slot = hash(name) & mask;
  for (; slots_[slot] != 0; slot = (slot + 1) & mask) {
    if (names_[slots_[slot] - 1] == name) return slots_[slot] - 1;
  }
  names_.emplace_back(name);
  slots_[slot] = static_cast<std::uint32_t>(names_.size());
  if (names_.size() * 2 > slots_.size()) grow();
  return static_cast<std::uint32_t>(names_.size() - 1);
}

void PlainNames::grow() {
  slots_.assign(slots_.size() * 2, 0);
  const std::size_t mask = slots_.size() - 1;
  for (std::size_t i = 0; i < names_.size(); ++i) {
    std::size_t slot = hash(names_[i]) & mask;
    while (slots_[slot] != 0) slot = (slot + 1) & mask;
    slots_[slot] = static_cast<std::uint32_t>(i + 1);
  }
}

// ---- the call

void PlainReader::skip_blanks(Position& position) const {
  while (position.offset < text_.size()) {
    const char c = text_[position.offset];
    if (c == '\n') {
      ++position.offset;
      ++position.line;
      position.column = 1;
    } else if (c == ' ' || c == '\t' || c == '\r') {
      ++position.offset;
      ++position.column;
    } else if (c == '/' && text_.substr(position.offset, 2) == "//") {
      const std::size_t end = text_.find('\n', position.offset);
      if (end == std::string_view::npos) return;  // the last line: left to the lexer, which counts characters
      position.offset = end;
    } else {
      return;
    }
  }
}

const PlainCall* PlainReader::read(const Position& position, int language, Position& end) {
  at_ = position.offset;
  angles_.clear();
  operands_.clear();
  call_.parentheses = call_.uses_pi = false;

  const std::string_view gate = name();
  if (gate.empty()) return nullptr;
  blanks();
  if (take('(') && !angles(language)) return nullptr;
  if (!operands()) return nullptr;
  const std::size_t last = at_;
  blanks();
  if (!take(';')) return nullptr;

  call_.gate = names_.number_of(gate);
  call_.angles = angles_;
  call_.operands = operands_;
  call_.at.offset = static_cast<std::uint32_t>(position.offset);
  call_.at.line = static_cast<std::uint32_t>(position.line);
  call_.at.column = static_cast<std::uint32_t>(position.column);
  call_.at.length = static_cast<std::uint16_t>(std::min<std::size_t>(last - position.offset, 1000));
  call_.at.source = source_;
  end = {at_, position.line, position.column + (at_ - position.offset)};
  return &call_;
}

/// The angles and the closing parenthesis.
bool PlainReader::angles(int language) {
  call_.parentheses = true;
  blanks();
  if (take(')')) return true;
  do {
    Number number;
    if (!sum(language, number)) return false;
    angles_.push_back(number.is_integer ? static_cast<double>(number.integer) : number.real);
  } while (take(','));
  return take(')');
}

bool PlainReader::sum(int language, Number& result) {
  if (!product(language, result)) return false;
  while (here() == '+' || here() == '-') {
    const bool minus = text_[at_++] == '-';
    Number right;
    if (!product(language, right)) return false;
    if (result.is_integer && right.is_integer) {
      result.integer += minus ? -right.integer : right.integer;
      if (result.integer > largest_integer || result.integer < -largest_integer) return false;
    } else {
      const double left = result.is_integer ? static_cast<double>(result.integer) : result.real;
      const double value = right.is_integer ? static_cast<double>(right.integer) : right.real;
      result = {minus ? left - value : left + value};
    }
  }
  return true;
}

bool PlainReader::product(int language, Number& result) {
  if (!factor(language, result)) return false;
  while (here() == '*' || here() == '/') {
    const bool divides = text_[at_++] == '/';
    Number right;
    if (!factor(language, right)) return false;
    if (divides && right.is_integer && right.integer == 0) return false;
    if (divides && !right.is_integer && right.real == 0) return false;
    if (result.is_integer && right.is_integer) {
      result.integer = divides ? result.integer / right.integer : result.integer * right.integer;
      if (result.integer > largest_integer || result.integer < -largest_integer) return false;
    } else {
      const double left = result.is_integer ? static_cast<double>(result.integer) : result.real;
      const double value = right.is_integer ? static_cast<double>(right.integer) : right.real;
      result = {divides ? left / value : left * value};
    }
  }
  return true;
}

/// A number or pi, with at most one sign; blanks around it.
bool PlainReader::factor(int language, Number& result) {
  blanks();
  const bool minus = take('-');
  if (minus) blanks();
  const std::size_t first = at_;
  if (is_name_start(here())) {
    if (name() != "pi") return false;
    call_.uses_pi = true;
    result = {std::numbers::pi};
  } else {
    std::size_t end = first;
    bool is_integer = true;
    while (end < text_.size() && is_digit(text_[end])) ++end;
    const std::size_t whole_digits = end - first;
    if (end < text_.size() && text_[end] == '.') {
      is_integer = false;
      ++end;
      while (end < text_.size() && is_digit(text_[end])) ++end;
      if (whole_digits == 0 && end == first + 1) return false;  // a lone point
    } else if (whole_digits == 0) {
      return false;
    }
    if (end < text_.size() && (text_[end] == 'e' || text_[end] == 'E')) {
      is_integer = false;
      ++end;
      if (end < text_.size() && (text_[end] == '+' || text_[end] == '-')) ++end;
      if (end >= text_.size() || !is_digit(text_[end])) return false;
      while (end < text_.size() && is_digit(text_[end])) ++end;
    }
    if (end < text_.size() && continues_number(text_[end])) return false;
    result = {};
    const auto read = std::from_chars(text_.data() + first, text_.data() + end, result.real);
    if (read.ec != std::errc() || read.ptr != text_.data() + end) return false;
    if (is_integer && language != 2) {
      if (result.real >= static_cast<double>(largest_integer)) return false;
      result.is_integer = true;
      result.integer = static_cast<std::int64_t>(result.real);
    }
    at_ = end;
  }
  if (minus) {
    result.real = -result.real;
    result.integer = -result.integer;
  }
  blanks();
  return true;
}

bool PlainReader::operands() {
  do {
    blanks();
    const std::string_view operand = name();
    if (operand.empty()) return false;
    PlainOperand result;
    result.name = names_.number_of(operand);
    blanks();
    if (take('[')) {
      blanks();
      const char* first = text_.data() + at_;
      std::int32_t index = 0;
      const auto read = std::from_chars(first, text_.data() + text_.size(), index);
      if (read.ec != std::errc() || index < 0 || *first == '-') return false;
      at_ += static_cast<std::size_t>(read.ptr - first);
      result.index = index;
      blanks();
      if (!take(']')) return false;
      operands_.push_back(result);
      blanks();
    } else {
      operands_.push_back(result);
    }
  } while (take(','));
  return true;
}

/// A name of ASCII letters and digits; empty when there is none, or when it goes on in other letters.
std::string_view PlainReader::name() {
  if (!is_name_start(here())) return {};
  std::size_t end = at_ + 1;
  while (end < text_.size() && is_name_part(text_[end])) ++end;
  if (end < text_.size() && static_cast<unsigned char>(text_[end]) >= 0x80) return {};
  const std::string_view result = text_.substr(at_, end - at_);
  at_ = end;
  return result;
}

void PlainReader::blanks() {
  while (here() == ' ' || here() == '\t') ++at_;
}

bool PlainReader::take(char c) {
  if (here() != c) return false;
  ++at_;
  return true;
}

}  // namespace isinglass
