// Text that is written fast and piece by piece: numbers in full precision, names of ions and bits, angles.
#pragma once

#include <fmt/compile.h>
#include <fmt/format.h>

#include <bit>
#include <cstring>
#include <ostream>
#include <stdexcept>
#include <string>
#include <string_view>
#include <utility>
#include <vector>

#include "circuit/circuit.h"

namespace isinglass {

/// A name of at most 23 characters, copied without asking how long it is.
struct ShortText {
  char text[23] = {};
  std::uint8_t size = 0;

  ShortText() = default;
  /// Throws std::length_error where the name is longer.
  explicit ShortText(std::string_view name) : size(static_cast<std::uint8_t>(name.size())) {
    if (name.size() > sizeof text) throw std::length_error("a name too long to be short");
    name.copy(text, name.size());
  }
};

/// Collects text and hands it on in large pieces.
class TextWriter {
 public:
  /// Without a stream everything is kept for take().
  explicit TextWriter(std::ostream* out) : out_(out), known_(cache_size) {}
  ~TextWriter() { flush(); }
  TextWriter(const TextWriter&) = delete;
  TextWriter& operator=(const TextWriter&) = delete;

  /// Literals: their size is known, so that copying is a few moves.
  template <std::size_t Size>
  void add(const char (&text)[Size]) {
    std::memcpy(room(Size - 1), text, Size - 1);
    used_ += Size - 1;
  }
  void add(std::string_view text) {
    std::memcpy(room(text.size()), text.data(), text.size());
    used_ += text.size();
  }
  void add(const ShortText& name) {
    std::memcpy(room(sizeof name.text), name.text, sizeof name.text);
    used_ += name.size;
  }
  void add(std::uint64_t number) {
    char* const at = room(most_digits);
    used_ += static_cast<std::size_t>(fmt::format_to(at, FMT_COMPILE("{}"), number) - at);
  }
  /// The shortest text that reads back to the same number. Programs repeat their angles: texts are
  /// remembered.
  void add(double number) {
    const auto bits = std::bit_cast<std::uint64_t>(number);
    Known& known = known_[(bits * 0x9e3779b97f4a7c15u) >> (64 - cache_bits)];
    char* const at = room(sizeof known.text);
    if (known.bits == bits && known.size > 0) {
      std::memcpy(at, known.text, sizeof known.text);
    } else {
      known.bits = bits;
      known.size = static_cast<std::uint8_t>(fmt::format_to(at, FMT_COMPILE("{}"), number) - at);
      std::memcpy(known.text, at, sizeof known.text);
    }
    used_ += known.size;
  }

  template <class... Parts>
  void add(const Parts&... parts) requires(sizeof...(Parts) > 1) {
    (add(parts), ...);
  }
  void flush() {
    if (out_ == nullptr) return;
    out_->write(buffer_.data(), static_cast<std::streamsize>(used_));
    used_ = 0;
  }
  /// What was kept; nothing where a stream has it.
  std::string take() {
    if (out_ != nullptr) return {};
    buffer_.resize(std::exchange(used_, 0));
    return std::move(buffer_);
  }

 private:
  static constexpr std::size_t piece = std::size_t{1} << 16;
  static constexpr std::size_t most_digits = 20;  // of 64 bits
  static constexpr int cache_bits = 10;
  static constexpr std::size_t cache_size = std::size_t{1} << cache_bits;
  struct Known {
    std::uint64_t bits = 0;
    std::uint8_t size = 0;
    char text[31];  // the longest double has 24 characters
  };

  /// Where the next `size` bytes go.
  char* room(std::size_t size) {
    if (used_ + size > buffer_.size()) [[unlikely]]
      grow(size);
    return buffer_.data() + used_;
  }
  void grow(std::size_t size);  // apart, so that room() stays small enough to be everywhere

  std::ostream* out_;
  std::string buffer_;  // longer than the text in it
  std::size_t used_ = 0;
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
