// Random numbers for searches.
#pragma once

#include <cstdint>

namespace isinglass {

/// A fast random sequence that is the same everywhere (splitmix64: Steele, Lea, Flood 2014).
class Dice {
 public:
  explicit Dice(std::uint64_t seed) : state_(seed) {}
  std::uint64_t bits() {
    std::uint64_t z = (state_ += 0x9e3779b97f4a7c15u);
    z = (z ^ (z >> 30)) * 0xbf58476d1ce4e5b9u;
    z = (z ^ (z >> 27)) * 0x94d049bb133111ebu;
    return z ^ (z >> 31);
  }
  unsigned below(unsigned limit) { return static_cast<unsigned>((bits() >> 32) * limit >> 32); }
  double real() { return static_cast<double>(bits() >> 11) * 0x1p-53; }
  double real(double low, double high) { return low + (high - low) * real(); }

 private:
  std::uint64_t state_;
};

}  // namespace isinglass
