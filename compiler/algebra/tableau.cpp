// Conjugation, composition and inversion of Clifford tableaus; see tableau.h.
#include "algebra/tableau.h"

namespace isinglass {

Tableau::Tableau(std::size_t qubits) {
  images_.reserve(2 * qubits);
  for (std::size_t q = 0; q < qubits; ++q) {
    images_.push_back(PauliString::single(qubits, q, Letter::X));
    images_.push_back(PauliString::single(qubits, q, Letter::Z));
  }
}

PauliString Tableau::image(const PauliString& string) const {
  PauliString result(qubits());
  int phase = 0;  // the letters' product is i^phase times the string; Y = i X Z
  for (std::size_t q = 0; q < string.qubits(); ++q) {
    const auto letter = static_cast<unsigned>(string.letter(q));
    if (letter & 1) phase += result.multiply(image_of_x(q));
    if (letter & 2) phase += result.multiply(image_of_z(q));
    if (letter == 3) phase += 1;
  }
  result.negative ^= string.negative ^ ((phase & 2) != 0);
  return result;
}

PauliString Tableau::image(std::size_t qa, Letter a, std::size_t qb, Letter b) const {
  PauliString result(qubits());
  int phase = 0;
  const auto times = [&](std::size_t qubit, Letter letter) {
    const auto value = static_cast<unsigned>(letter);
    if (value & 1) phase += result.multiply(image_of_x(qubit));
    if (value & 2) phase += result.multiply(image_of_z(qubit));
    if (value == 3) phase += 1;
  };
  times(qa, a);
  times(qb, b);
  result.negative ^= (phase & 2) != 0;
  return result;
}

void Tableau::append(const PauliString& axis, int quarters) {
  for (PauliString& image : images_) image.conjugate(axis, quarters);
}

void Tableau::prepend(const PauliString& axis, int quarters) {
  const std::size_t n = qubits();
  std::vector<std::pair<std::size_t, PauliString>> changed;
  for (std::size_t q = 0; q < n; ++q) {
    const Letter letter = axis.letter(q);
    if (letter == Letter::I) continue;
    for (const Letter row : {Letter::X, Letter::Z}) {
      PauliString turned = PauliString::single(n, q, row);
      if (commute(row, letter)) continue;
      turned.conjugate(axis, quarters);
      changed.emplace_back(2 * q + (row == Letter::Z), image(turned));
    }
  }
  for (auto& [row, string] : changed) images_[row] = std::move(string);
}

Tableau Tableau::inverse() const {
  // V^-1 P V carries X (Z) on qubit r exactly when P anticommutes with the image of Z_r (X_r). Its sign is
  // the one that V takes back to P.
  const std::size_t n = qubits();
  Tableau inverse(n);
  for (std::size_t q = 0; q < n; ++q) {
    for (const Letter row : {Letter::X, Letter::Z}) {
      const PauliString target = PauliString::single(n, q, row);
      PauliString string(n);
      for (std::size_t r = 0; r < n; ++r) {
        const unsigned has_x = !target.commutes_with(image_of_z(r));
        const unsigned has_z = !target.commutes_with(image_of_x(r));
        string.set(r, static_cast<Letter>(has_x | has_z << 1));
      }
      string.negative = image(string).negative;
      inverse.images_[2 * q + (row == Letter::Z)] = std::move(string);
    }
  }
  return inverse;
}

Tableau Tableau::then(const Tableau& later) const {
  Tableau both = *this;
  for (PauliString& image : both.images_) image = later.image(image);
  return both;
}

}  // namespace isinglass
