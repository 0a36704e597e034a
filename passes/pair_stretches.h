// What a sequence of turns costs once every two-wire stretch is performed with the fewest interactions.
//
// A stretch is a run of turns on one pair of wires that no other pair interrupts on either. Its cost is
// decided by its canonical coordinates; where wires may be renamed, by the cheaper of the stretch and the
// stretch times SWAP. Hammerer, Vidal, Cirac, quant-ph/0205100; Cross et al., Physical Review A 100, 032328.
#pragma once

#include <complex>
#include <vector>

#include "circuit/cost.h"
#include "passes/pair_form.h"
#include "passes/turns.h"

namespace isinglass {

/// Interactions of smaller angles (radians) are none: rounding of the canonical decomposition.
inline constexpr double least_interaction = 2e-11;

/// Interactions and estimated error of a sequence.
struct Price {
  int interactions = 0;
  double error = 0;
};

/// One stretch: its unitary where all angles are known, the angle about each axis as long as all its turns
/// commute, and in sequences with unknown angles its form as commuting rotations and a Clifford.
class PairStretch {
 public:
  PairStretch(unsigned a, unsigned b, bool may_rename, bool has_inputs);

  unsigned a() const { return a_; }
  unsigned b() const { return b_; }
  int interactions() const { return interactions_; }
  /// Whether the pair turn can join: with angles that are not known only where that takes at most one more.
  bool can_take(const Turn& turn) const;
  /// Interactions after the turn; the stretch must be able to take it.
  int interactions_with(const Turn& turn) const;
  void take(const Turn& turn);
  /// A turn of one of its wires; false when the stretch ends there (it cannot be multiplied in).
  bool take_single(const Turn& turn);
  /// Decided on canonical coordinates, where interactions() may take very small angles for none.
  Price price(const Cost& cost) const;
  /// Whether the stretch times SWAP is the cheaper one; only where wires may be renamed.
  bool is_mirrored(const Cost& cost) const;
  /// Whether all its turns commute.
  bool is_commuting() const { return commuting_; }
  bool is_symbolic() const { return symbolic_; }
  /// The turn with the stretch's wires named 0 and 1.
  Turn named(const Turn& turn) const;
  /// Of a stretch without unknown angles: 4x4, row-major, index = wire a + 2 * wire b.
  const std::array<std::complex<double>, 16>& matrix() const { return matrix_; }

 private:
  struct AxisAngle {
    Letter la, lb;
    double angle;
    bool is_symbolic;
  };
  struct Prices {
    Price plain, mirrored;
  };
  /// The axes of pair turns that commute with each other; there are at most three of them.
  struct Axes {
    std::array<AxisAngle, 3> axis;
    std::size_t count = 0;
    void add(Letter la, Letter lb, const Turn& turn);
  };
  using Matrix = std::array<std::complex<double>, 16>;

  static int count(const Axes& axes, bool may_rename);
  static int count(const Matrix& matrix, bool may_rename);
  static int count(const PairForm& form, bool may_rename);
  static void multiply(Matrix& matrix, Letter la, Letter lb, double angle);
  Prices prices(const Cost& cost) const;
  void recount();
  void add_to_form(const Turn& turn);
  bool commutes_with_all(Letter la, Letter lb) const;
  std::pair<Letter, Letter> letters(const Turn& turn) const;

  unsigned a_, b_;
  bool may_rename_;
  bool commuting_ = true;  // all turns so far do: then axes_ tells all
  bool symbolic_ = false;
  int interactions_ = 0;
  Axes axes_;
  std::array<std::uint8_t, 2> singles_{};  // letters of one-wire turns on a and b, bit 1 << letter
  Matrix matrix_;
  std::optional<PairForm> form_;
};

/// The stretches of a growing sequence.
class PairStretches {
 public:
  /// `has_inputs`: whether any turn's angle may be unknown.
  PairStretches(unsigned wires, bool may_rename, bool has_inputs)
      : current_(wires, none), may_rename_(may_rename), has_inputs_(has_inputs) {}

  /// Adds a turn at the end and returns the stretch it became part of, none for a one-wire turn outside of
  /// all.
  int add(const Turn& turn);
  static constexpr int none = -1;
  const PairStretch& operator[](int stretch) const { return stretches_[static_cast<std::size_t>(stretch)]; }
  /// The stretch that a turn on the pair would join, or nullptr.
  const PairStretch* open(unsigned a, unsigned b) const;
  /// Interactions that the pair turn would add.
  int interactions_added(const Turn& turn) const;
  int interactions() const { return interactions_; }
  Price price(const Cost& cost) const;

 private:
  std::vector<PairStretch> stretches_;
  std::vector<int> current_;  // a wire's last stretch while it may go on
  bool may_rename_, has_inputs_;
  int interactions_ = 0;
};

/// Whether any turn's angle is unknown.
bool has_inputs(const std::vector<Turn>& turns);

/// The price of turns on wires 0 to wires - 1.
Price price_of(const std::vector<Turn>& turns, unsigned wires, bool may_rename, const Cost& cost);

}  // namespace isinglass
