// Random circuits for property tests: as Circuit data of any gate kinds, and as OpenQASM 3 text over the
// whole standard gate library next to the unitary that the text means by the tests' own matrices.
#pragma once

#include <cstdint>
#include <random>
#include <string>
#include <vector>

#include "circuit/circuit.h"
#include "support/simulator.h"

namespace isinglass::support {

/// Random numbers with a seed; the same on every machine.
class Random {
 public:
  explicit Random(std::uint64_t seed) : engine_(seed) {}
  std::uint64_t bits() { return engine_(); }
  /// 0 <= result < limit.
  int below(int limit) { return static_cast<int>(engine_() % static_cast<std::uint64_t>(limit)); }
  /// low <= result <= high.
  int between(int low, int high) { return low + below(high - low + 1); }
  bool chance(double probability) { return real() < probability; }
  /// 0 <= result < 1.
  double real() { return static_cast<double>(engine_() >> 11) * 0x1p-53; }
  double real(double low, double high) { return low + (high - low) * real(); }
  double gaussian();
  /// `count` distinct numbers below `limit`.
  std::vector<std::uint32_t> distinct(int count, int limit);

 private:
  std::mt19937_64 engine_;
};

/// Haar-random unitary on that many qubits (QR of a Gaussian matrix; Mezzadri 2007, from memory).
Matrix haar_unitary(Random& random, int qubits);

/// An angle: mostly anything in (-2 pi, 2 pi), often a multiple of pi/4, sometimes 0, tiny or beyond a turn.
double random_angle(Random& random);
/// A multiple of pi/4 in (-2 pi, 2 pi).
double random_nice_angle(Random& random);

enum class Family {
  any,         // all unitary kinds, up to `most_controls` controls
  native,      // r, rz, xx
  clifford,    // x, y, z, h, p(k pi/2), r, rz, zz, xx at Clifford angles, cx, cz, swap
  clifford_t,  // the same and p(k pi/4)
  toffolis,    // x with 0 to most_controls controls
  pauli,       // exponentials of Pauli strings as textbook ladders of cx around an rz
  symbolic,    // as any, without controls on symbolic gates; angles use three inputs a, b, c
};

struct RandomCircuit {
  int qubits = 3;
  int gates = 20;
  int most_controls = 2;
  Family family = Family::any;
};

/// A circuit without measurements on one register q.
Circuit random_circuit(Random& random, const RandomCircuit& wanted);

/// The same with measurements, resets and (if there are bits) none of the classical control: `bits` bits c.
Circuit random_measured_circuit(Random& random, const RandomCircuit& wanted, int bits);

/// A gate that a text applies, as the tests see it: matrix on all its operands, first operand = low bit.
struct Step {
  Matrix gate;
  std::vector<std::uint32_t> operands;
};

/// An OpenQASM 3 program on `qubit[n] q` and what it means.
struct Source {
  std::string text;
  int qubits = 0;
  std::vector<Step> steps;
};

/// A text over the whole standard gate library with modifiers (ctrl, negctrl, inv, pow), gate definitions and
/// broadcasts.
Source random_source(Random& random, int qubits, int gates);

/// Unitary of the steps in order.
Matrix unitary(const Source& source);

}  // namespace isinglass::support
