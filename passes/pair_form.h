// A stretch of turns on one pair of wires whose angles need not be known: a few rotations followed by one
// Clifford, K ... R2(t2) R1(t1), strings as seen from the start.
//
//   XX(t)  ZX(90)      is  Y(t) on the first wire after ZX(90): one interaction, not two
//
// Such a unitary takes quarter turns G about two-letter strings for the Clifford's sake; a rotation is free
// where it is about one of these strings (it adds to the turn), or where they take it to one letter. Which
// quarter turns a two-qubit Clifford needs, as seen from the start: none; one about a string Q; or, times
// SWAP, none or one about Q. SWAP is three quarter turns about any three two-letter strings that commute, so
// SWAP times a quarter turn about Q is two quarter turns about strings that make such a three with Q.
// (Derived here from the classes of two-qubit Cliffords: Vatan, Williams, quant-ph/0308006.) The count is one
// that can be reached, not always the least, where rotations do not commute.
#pragma once

#include <array>
#include <optional>
#include <vector>

#include "passes/turns.h"

namespace isinglass {

class PairForm {
 public:
  struct Rotation {
    Row string;  // on wires 0 and 1
    double angle = 0;
    bool is_symbolic = false;
  };
  static constexpr int in_clifford = -1;

  PairForm();

  /// Takes a turn, its wires named 0 and 1: returns the number of the rotation that it became part of, or
  /// in_clifford. The form must be able to take it.
  int add(const Turn& turn);
  /// Whether there is room for the turn.
  bool can_take(const Turn& turn) const;
  /// The turn's string as seen from the start, with the sign that the turn enters with.
  Row seen(const Turn& turn) const;

  const std::vector<Rotation>& rotations() const { return rotations_; }
  /// Rows 2k and 2k + 1: K^-1 X_k K and K^-1 Z_k K.
  const std::array<Row, 4>& rows() const { return rows_; }

  /// A turn about `string`, by the angle of a rotation (with the sign of the string), by a quarter, or both.
  struct Step {
    Row string;
    int rotation = in_clifford;  // none
    bool is_quarter = false;
  };
  /// What performs the rotations and leaves of the Clifford what takes no interaction: as it is, or with a
  /// SWAP after it that is done by renaming.
  std::vector<Step> steps(bool is_mirrored) const;
  /// The angles of all interactions, known ones reduced to [0, pi/2], pi/2 for symbolic ones.
  std::vector<double> interactions(bool is_mirrored) const;

 private:
  std::vector<Row> quarter_turns(bool is_mirrored) const;
  std::vector<Step> steps(bool is_mirrored, bool extras_first) const;
  /// The rotation that another about the string can be added to, or none.
  std::optional<std::size_t> home_of(const Row& string) const;

  std::vector<Rotation> rotations_;
  std::array<Row, 4> rows_;
};

/// Conjugates the row by a quarter turn about a two-letter string on wires 0 and 1, its sign left out.
void conjugate(Row& row, const Row& about);

}  // namespace isinglass
