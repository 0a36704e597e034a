// Pauli strings of any number of qubits, bit-packed: one x and one z bit a qubit, 64 qubits a word.
//
// A string stands for the Hermitian operator (-1)^negative * P_0 (x) P_1 (x) ..., where qubit q carries the
// letter I, X, Z or Y for (x, z) = 00, 10, 01 or 11. Products and conjugations work a word at a time.
#pragma once

#include <bit>
#include <cstddef>
#include <cstdint>
#include <functional>
#include <string>
#include <string_view>
#include <vector>

namespace isinglass {

/// A letter of a Pauli string; the value is x + 2 z.
enum class Letter : std::uint8_t { I = 0, X = 1, Z = 2, Y = 3 };

/// The letter of the product of two letters, its phase left out.
constexpr Letter operator*(Letter a, Letter b) {
  return static_cast<Letter>(static_cast<std::uint8_t>(a) ^ static_cast<std::uint8_t>(b));
}

/// k such that a * b = i^k (letter of a * b), as 0, 1 or -1: XY = iZ, YZ = iX, ZX = iY.
constexpr int product_phase(Letter a, Letter b) {
  if (a == b || a == Letter::I || b == Letter::I) return 0;
  const bool forward = (a == Letter::X && b == Letter::Y) || (a == Letter::Y && b == Letter::Z) ||
                       (a == Letter::Z && b == Letter::X);
  return forward ? 1 : -1;
}

constexpr bool commute(Letter a, Letter b) {
  return a == b || a == Letter::I || b == Letter::I;
}

class PauliString {
 public:
  PauliString() = default;
  /// The identity on `qubits` qubits.
  explicit PauliString(std::size_t qubits) : qubits_(qubits), words_(2 * ((qubits + 63) / 64)) {}

  /// "XIZ" or "-XIZ": the first letter is qubit 0. Throws std::invalid_argument on any other character.
  static PauliString from_text(std::string_view text);
  /// The string with one letter on `qubit` and identity elsewhere.
  static PauliString single(std::size_t qubits, std::size_t qubit, Letter letter) {
    PauliString string(qubits);
    string.set(qubit, letter);
    return string;
  }

  std::size_t qubits() const { return qubits_; }
  Letter letter(std::size_t qubit) const {
    const std::size_t word = qubit / 64;
    const unsigned shift = qubit % 64;
    return static_cast<Letter>((x(word) >> shift & 1) | (z(word) >> shift & 1) << 1);
  }
  void set(std::size_t qubit, Letter letter) {
    const std::size_t word = qubit / 64;
    const std::uint64_t bit = std::uint64_t{1} << (qubit % 64);
    const auto value = static_cast<unsigned>(letter);
    words_[word] = value & 1 ? words_[word] | bit : words_[word] & ~bit;
    std::uint64_t& z_word = words_[half() + word];
    z_word = value & 2 ? z_word | bit : z_word & ~bit;
  }

  /// Words of 64 qubits each: bits of X and of Z.
  std::size_t half() const { return words_.size() / 2; }
  std::uint64_t x(std::size_t word) const { return words_[word]; }
  std::uint64_t z(std::size_t word) const { return words_[half() + word]; }

  /// Number of letters that are not I.
  std::size_t weight() const {
    std::size_t count = 0;
    for (std::size_t w = 0; w < half(); ++w) count += static_cast<std::size_t>(std::popcount(x(w) | z(w)));
    return count;
  }

  bool commutes_with(const PauliString& other) const {
    std::uint64_t odd = 0;
    for (std::size_t w = 0; w < half(); ++w) odd ^= (x(w) & other.z(w)) ^ (z(w) & other.x(w));
    return std::popcount(odd) % 2 == 0;
  }

  /// this := this * right, both on the same qubits. Returns k in 0..3: the product is i^k times the string
  /// that is left here, whose sign is the product of both signs. k is even exactly when the two commute.
  int multiply(const PauliString& right) {
    int phase = 0;
    for (std::size_t w = 0; w < half(); ++w) {
      const std::uint64_t ax = x(w), az = z(w), bx = right.x(w), bz = right.z(w);
      const std::uint64_t forward = (ax & ~az & bx & bz) | (ax & az & ~bx & bz) | (~ax & az & bx & ~bz);
      const std::uint64_t backward = (ax & az & bx & ~bz) | (~ax & az & bx & bz) | (ax & ~az & ~bx & bz);
      phase += std::popcount(forward) - std::popcount(backward);
      words_[w] = ax ^ bx;
      words_[half() + w] = az ^ bz;
    }
    negative ^= right.negative;
    return phase & 3;
  }

  /// this := g this g^-1 with g = exp(-i quarters pi/4 axis), a quarter turn (pi/2) about `axis` for each of
  /// `quarters`.
  void conjugate(const PauliString& axis, int quarters) {
    if (commutes_with(axis)) return;
    if (quarters & 2) negative = !negative;
    if ((quarters & 1) == 0) return;
    // g P g^-1 = -i axis P for a quarter turn when axis and P anticommute.
    PauliString product = axis;
    const int phase = (product.multiply(*this) + 3) & 3;
    if (phase == 2) product.negative = !product.negative;
    *this = std::move(product);
  }

  /// Whether the letters agree; signs are not compared.
  bool same_letters(const PauliString& other) const { return words_ == other.words_; }
  bool operator==(const PauliString&) const = default;

  /// For hash tables; the sign does not enter.
  std::size_t hash_of_letters() const {
    std::uint64_t hash = 0x9e3779b97f4a7c15u;
    for (const std::uint64_t word : words_) hash = (hash ^ word) * 0xff51afd7ed558ccdu, hash ^= hash >> 32;
    return hash;
  }

  /// As from_text reads it.
  std::string text() const;

  bool negative = false;

 private:
  std::size_t qubits_ = 0;
  std::vector<std::uint64_t> words_;  // all x words, then all z words
};

}  // namespace isinglass
