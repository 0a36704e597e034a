// SHA-256; see sha256.h. The constants are computed, not listed: FIPS 180-4 defines them as the first 32 bits
// of the fractional parts of the square roots of the first 8 primes and the cube roots of the first 64.
#include "algebra/sha256.h"

#include <array>
#include <bit>
#include <cmath>
#include <cstdint>

namespace isinglass {

namespace {

using Word = std::uint32_t;

Word fraction_bits(long double root) {
  return static_cast<Word>((root - std::floor(root)) * 4294967296.0L);
}

struct Constants {
  std::array<Word, 8> start{};
  std::array<Word, 64> round{};

  Constants() {
    std::size_t found = 0;
    for (unsigned n = 2; found < round.size(); ++n) {
      bool is_prime = true;
      for (unsigned d = 2; d * d <= n; ++d) is_prime = is_prime && n % d != 0;
      if (!is_prime) continue;
      if (found < start.size()) start[found] = fraction_bits(std::sqrt(static_cast<long double>(n)));
      round[found] = fraction_bits(std::cbrt(static_cast<long double>(n)));
      ++found;
    }
  }
};

const Constants& constants() {
  static const Constants made;
  return made;
}

/// Takes one chunk of 64 bytes into the state.
void absorb(std::array<Word, 8>& state, const unsigned char* chunk) {
  std::array<Word, 64> w;
  for (std::size_t i = 0; i < 16; ++i) {
    w[i] = Word{chunk[4 * i]} << 24 | Word{chunk[4 * i + 1]} << 16 | Word{chunk[4 * i + 2]} << 8 |
           Word{chunk[4 * i + 3]};
  }
  for (std::size_t i = 16; i < 64; ++i) {
    const Word s0 = std::rotr(w[i - 15], 7) ^ std::rotr(w[i - 15], 18) ^ (w[i - 15] >> 3);
    const Word s1 = std::rotr(w[i - 2], 17) ^ std::rotr(w[i - 2], 19) ^ (w[i - 2] >> 10);
    w[i] = w[i - 16] + s0 + w[i - 7] + s1;
  }
  auto [a, b, c, d, e, f, g, h] = state;
  for (std::size_t i = 0; i < 64; ++i) {
    const Word s1 = std::rotr(e, 6) ^ std::rotr(e, 11) ^ std::rotr(e, 25);
    const Word choice = (e & f) ^ (~e & g);
    const Word first = h + s1 + choice + constants().round[i] + w[i];
    const Word s0 = std::rotr(a, 2) ^ std::rotr(a, 13) ^ std::rotr(a, 22);
    const Word majority = (a & b) ^ (a & c) ^ (b & c);
    h = g;
    g = f;
    f = e;
    e = d + first;
    d = c;
    c = b;
    b = a;
    a = first + s0 + majority;
  }
  const std::array<Word, 8> mixed = {a, b, c, d, e, f, g, h};
  for (std::size_t i = 0; i < 8; ++i) state[i] += mixed[i];
}

}  // namespace

std::string sha256(std::string_view bytes) {
  std::array<Word, 8> state = constants().start;
  const auto* data = reinterpret_cast<const unsigned char*>(bytes.data());
  std::size_t done = 0;
  for (; done + 64 <= bytes.size(); done += 64) absorb(state, data + done);

  // The rest, a one bit, zeros, and the length in bits: one or two last chunks.
  std::array<unsigned char, 128> tail{};
  const std::size_t rest = bytes.size() - done;
  for (std::size_t i = 0; i < rest; ++i) tail[i] = data[done + i];
  tail[rest] = 0x80;
  const std::size_t length = rest < 56 ? 64 : 128;
  const std::uint64_t bits = std::uint64_t{bytes.size()} * 8;
  for (std::size_t i = 0; i < 8; ++i) tail[length - 1 - i] = static_cast<unsigned char>(bits >> (8 * i));
  for (std::size_t at = 0; at < length; at += 64) absorb(state, tail.data() + at);

  std::string text;
  for (const Word word : state) {
    for (int shift = 28; shift >= 0; shift -= 4) text += "0123456789abcdef"[word >> shift & 15u];
  }
  return text;
}

}  // namespace isinglass
