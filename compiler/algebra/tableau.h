// Clifford unitaries as tableaus: where conjugation takes X and Z of every qubit.
//
// A Tableau of V holds the 2n Pauli strings V X_q V^-1 and V Z_q V^-1 and so knows V up to its global phase.
// Method: Aaronson, Gottesman, "Improved simulation of stabilizer circuits", Physical Review A 70, 052328.
#pragma once

#include <vector>

#include "algebra/pauli.h"

namespace isinglass {

class Tableau {
 public:
  Tableau() = default;
  /// The identity on `qubits` qubits.
  explicit Tableau(std::size_t qubits);

  std::size_t qubits() const { return images_.size() / 2; }
  const PauliString& image_of_x(std::size_t qubit) const { return images_[2 * qubit]; }
  const PauliString& image_of_z(std::size_t qubit) const { return images_[2 * qubit + 1]; }

  /// V string V^-1.
  PauliString image(const PauliString& string) const;
  /// The same for the string that has letter `a` on qubit `qa` and `b` on `qb` (b = I: one letter only).
  PauliString image(std::size_t qa, Letter a, std::size_t qb = 0, Letter b = Letter::I) const;

  /// V := g V with g a turn about `axis` by quarters * pi/2. Costs O(n) strings.
  void append(const PauliString& axis, int quarters);
  /// V := V g. Costs as many strings as the axis has letters.
  void prepend(const PauliString& axis, int quarters);

  /// The tableau of V^-1.
  Tableau inverse() const;
  /// The tableau of `later` V: first this, then `later`.
  Tableau then(const Tableau& later) const;

  bool operator==(const Tableau&) const = default;

 private:
  std::vector<PauliString> images_;  // of X_0, Z_0, X_1, Z_1, ...
};

}  // namespace isinglass
