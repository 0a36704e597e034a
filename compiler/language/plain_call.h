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

}  // namespace isinglass
