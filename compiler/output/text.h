// Text that is written fast and piece by piece: numbers in full precision, names of ions and bits, angles.
#pragma once

#include <fmt/compile.h>
#include <fmt/format.h>

#include <ostream>
#include <string_view>

#include "circuit/circuit.h"

namespace isinglass {

/// Collects text and hands it on in large pieces.
class TextWriter {
 public:
  explicit TextWriter(std::ostream& out) : out_(out) {}
  ~TextWriter() { flush(); }
  TextWriter(const TextWriter&) = delete;
  TextWriter& operator=(const TextWriter&) = delete;

  void add(std::string_view text) {
    buffer_.append(text.data(), text.data() + text.size());
    if (buffer_.size() > piece) flush();
  }
  void add(std::uint64_t number) { fmt::format_to(std::back_inserter(buffer_), FMT_COMPILE("{}"), number); }
  /// The shortest text that reads back to the same number.
  void add(double number) { fmt::format_to(std::back_inserter(buffer_), FMT_COMPILE("{}"), number); }

  template <class... Parts>
  void add(const Parts&... parts) requires(sizeof...(Parts) > 1) {
    (add(parts), ...);
  }
  void flush() {
    out_.write(buffer_.data(), static_cast<std::streamsize>(buffer_.size()));
    buffer_.clear();
  }

 private:
  static constexpr std::size_t piece = std::size_t{1} << 16;
  std::ostream& out_;
  fmt::memory_buffer buffer_;
};

/// The angle as an OpenQASM expression: a number, or constant and inputs with their factors.
std::string angle_text(Angle angle, const Circuit& circuit);

/// Names of all flat bits, "c[0]" or "c", in their order.
std::vector<std::string> bit_names(const Circuit& circuit);

/// One line of OpenQASM for a classical statement, without its end of line.
std::string statement_text(const ClassicalStatement& statement, const Circuit& circuit);

/// What stands before the first arm of a branch: "if (c[0] == 1)", "for uint i in [0:3]", "switch (n)".
std::string branch_text(const Branch& branch, const Circuit& circuit);

/// What stands before arm `arm` of an if or switch after the first: "else", "case 1, 2", "default"; of the
/// first arm of an if and of loops: empty.
std::string arm_text(const Branch& branch, std::size_t arm, const Circuit& circuit);

}  // namespace isinglass
