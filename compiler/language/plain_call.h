// The fast lane of reading: plain gate calls, `name(angles) q[i], q[j];`, recognized without the grammar.
//
// Machine-made files consist of little else. The recognizer knows exactly this form and reads it from the
// bytes; everything else, errors included, it leaves to the grammar, which reads the same text again. So it
// may decline whenever it is in doubt, and it never has to say what is wrong.
#pragma once

#include <array>
#include <cstdint>
#include <span>
#include <string>
#include <string_view>
#include <vector>

#include "language/syntax.h"

namespace isinglass {

/// Names of the plain calls of one reading, numbered 0, 1, 2, ... in the order in which they first occur, so
/// that a consumer can look a gate or register up once and then by number.
class PlainNames {
 public:
  PlainNames();
  std::uint32_t number_of(std::string_view name);
  std::string_view operator[](std::uint32_t number) const { return names_[number]; }
  std::size_t size() const { return names_.size(); }

 private:
  void grow();

  std::vector<std::string> names_;
  std::vector<std::uint32_t> slots_;  // open addressing; 0 = free, else number + 1
};

/// An operand `name[index]`, or `name` alone with index = whole.
struct PlainOperand {
  static constexpr std::int64_t whole = -1;
  std::uint32_t name = 0;  // in PlainNames
  std::int64_t index = whole;
};

/// One plain call. The spans live until the next call is read.
struct PlainCall {
  std::uint32_t gate = 0;  // in PlainNames
  bool parentheses = false;
  bool uses_pi = false;            // an angle names pi, taken to be the built-in constant
  std::span<const double> angles;  // evaluated as the language says: integers divide as integers in version 3
  std::span<const PlainOperand> operands;  // at least one
  syntax::Span at;                         // the call without its `;`
};

/// A place in a text: a byte offset, and line and column counted from 1, the column in characters.
struct Position {
  std::size_t offset = 0;
  std::size_t line = 1;
  std::size_t column = 1;
};

/// Reads plain calls from one text.
class PlainReader {
 public:
  PlainReader(std::string_view text, std::uint16_t source) : text_(text), source_(source) {}

  /// Moves over blanks, line ends and comments that end with their line.
  void skip_blanks(Position& position) const;

  /// The plain call that starts at `position`, in language version 2 or 3, or null when what stands there has
  /// not exactly that form. Never reads beyond the line. `end` is set to the place behind its `;`.
  const PlainCall* read(const Position& position, int language, Position& end);

  const PlainNames& names() const { return names_; }

 private:
  /// A number as the language has it: in version 3, integers stay integers until they meet a float.
  struct Number {
    double real = 0;
    std::int64_t integer = 0;
    bool is_integer = false;
  };

  bool angles(int language);
  bool sum(int language, Number& result);
  bool product(int language, Number& result);
  bool factor(int language, Number& result);
  bool operands();
  std::string_view name();
  void blanks();
  bool take(char c);
  char here() const { return at_ < text_.size() ? text_[at_] : '\0'; }

  std::string_view text_;
  std::uint16_t source_;
  PlainNames names_;
  PlainCall call_;
  std::vector<double> angles_;
  std::vector<PlainOperand> operands_;
  std::size_t at_ = 0;
};

}  // namespace isinglass
