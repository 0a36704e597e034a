// Text that is written fast and piece by piece: numbers in full precision, names of ions and bits, angles.
#pragma once

#include <fmt/compile.h>
#include <fmt/format.h>

#include <bit>
#include <ostream>
#include <string>
#include <string_view>
#include <vector>

#include "circuit/circuit.h"

namespace isinglass {

/// Collects text and hands it on in large pieces.
class TextWriter {
 public:
  /// Without a stream everything is kept for take().
  explicit TextWriter(std::ostream* out) : out_(out), known_(cache_size) {}
  ~TextWriter() { flush(); }
  TextWriter(const TextWriter&) = delete;
  TextWriter& operator=(const TextWriter&) = delete;

  void add(std::string_view text) {
    buffer_.append(text);
    if (out_ != nullptr && buffer_.size() > piece) flush();
  }
  void add(std::uint64_t number) { fmt::format_to(std::back_inserter(buffer_), FMT_COMPILE("{}"), number); }
  /// The shortest text that reads back to the same number. Programs repeat their angles: texts are
  /// remembered.
  void add(double number) {
    const auto bits = std::bit_cast<std::uint64_t>(number);
    Known& known = known_[(bits * 0x9e3779b97f4a7c15u) >> (64 - cache_bits)];
    if (known.bits != bits || known.size == 0) {
      known.bits = bits;
      known.size =
          static_cast<std::uint8_t>(fmt::format_to(known.text, FMT_COMPILE("{}"), number) - known.text);
    }
    add(std::string_view(known.text, known.size));
  }

  template <class... Parts>
  void add(const Parts&... parts) requires(sizeof...(Parts) > 1) {
    (add(parts), ...);
  }
  void flush() {
    if (out_ == nullptr) return;
    out_->write(buffer_.data(), static_cast<std::streamsize>(buffer_.size()));
    buffer_.clear();
  }
  /// What was kept; nothing where a stream has it.
  std::string take() { return out_ == nullptr ? std::move(buffer_) : std::string(); }

 private:
  static constexpr std::size_t piece = std::size_t{1} << 16;
  static constexpr int cache_bits = 10;
  static constexpr std::size_t cache_size = std::size_t{1} << cache_bits;
  struct Known {
    std::uint64_t bits = 0;
    std::uint8_t size = 0;
    char text[31];  // the longest double has 24 characters
  };

  std::ostream* out_;
  std::string buffer_;
  std::vector<Known> known_;
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
