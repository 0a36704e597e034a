// Local Pauli rotations of a piece on at most 64 wires, in the compact form that synthesis works on, and the
// same piece as a network: rotations about Pauli strings followed by one Clifford.
#pragma once

#include <array>
#include <span>
#include <vector>

#include "algebra/pauli.h"
#include "circuit/circuit.h"

namespace isinglass {

inline constexpr unsigned most_wires = 64;  // of a network: strings are two words

/// exp(-+ i angle/2 la (x) lb) on wires a and b (minus where `negative` is false); lb = I: on wire a alone.
struct Turn {
  std::uint8_t a = 0, b = 0;
  Letter la = Letter::I, lb = Letter::I;
  bool negative = false;
  Angle angle;
  Origin origin;

  bool is_pair() const { return lb != Letter::I; }
  /// The known part of the angle, signed.
  double signed_constant() const { return negative ? -angle.constant : angle.constant; }
};

/// A Pauli string on up to 64 wires with its sign.
struct Row {
  std::uint64_t x = 0, z = 0;
  bool negative = false;

  std::uint64_t support() const { return x | z; }
  unsigned weight() const { return static_cast<unsigned>(std::popcount(x | z)); }
  Letter letter(unsigned wire) const { return static_cast<Letter>((x >> wire & 1) | (z >> wire & 1) << 1); }
  bool commutes_with(const Row& other) const { return std::popcount((x & other.z) ^ (z & other.x)) % 2 == 0; }
  bool same_letters(const Row& other) const { return x == other.x && z == other.z; }
};

/// this * other = i^k * result; returns k in 0..3 and leaves the result in `left`.
int multiply(Row& left, const Row& right);
/// row := g row g^-1, g = exp(-i pi/4 axis) with axis = +- la (x) lb as in Turn.
void conjugate(Row& row, unsigned a, Letter la, unsigned b, Letter lb, bool negative);

/// V string V^-1 of the string with letters la on wire a and lb on b, where V takes X_k, Z_k to rows 2k and
/// 2k + 1.
Row image(std::span<const Row> rows, unsigned a, Letter la, unsigned b, Letter lb);

/// A rotation exp(-i angle/2 string).
struct Exponential {
  Row string;
  Angle angle;
  Origin origin;
};

/// A unitary as C * (last exponential) ... (first), up to its phase. Rows 2k and 2k + 1 are C^-1 X_k C and
/// C^-1 Z_k C.
struct Network {
  unsigned wires = 0;
  std::vector<Exponential> exponentials;
  std::vector<Row> rows;
};

/// The network of turns on wires 0 to wires - 1. Known multiples of pi/2 go into the Clifford.
Network network_of(const std::vector<Turn>& turns, unsigned wires);

/// Turns and where they leave things: afterwards, what belongs on wire k is on wire home[k].
struct Sequence {
  std::vector<Turn> turns;
  std::vector<std::uint8_t> home;
};

/// The inverse of turns, in time order.
std::vector<Turn> inverted(const std::vector<Turn>& turns);
/// The inverse of a sequence, its renaming brought to the end again.
Sequence inverted(const Sequence& sequence);

/// Appends one-wire turns that perform the Clifford c on `wire` with c^-1 X c = x and c^-1 Z c = z.
void append_local_clifford(Row x, Row z, unsigned wire, std::vector<Turn>& turns);

/// Drops the one-wire Clifford turns by conjugating everything after them; what is left of them comes at the
/// end.
void push_local_cliffords(std::vector<Turn>& turns, unsigned wires);

}  // namespace isinglass
