// Pauli strings as text; see pauli.h.
#include "algebra/pauli.h"

#include <stdexcept>

namespace isinglass {

namespace {
constexpr std::string_view letters = "IXZY";
}

PauliString PauliString::from_text(std::string_view text) {
  const bool negative = !text.empty() && text.front() == '-';
  if (negative) text.remove_prefix(1);
  PauliString string(text.size());
  for (std::size_t q = 0; q < text.size(); ++q) {
    const std::size_t value = letters.find(text[q]);
    if (value == std::string_view::npos)
      throw std::invalid_argument("a Pauli string has the letters I, X, Y, Z");
    string.set(q, static_cast<Letter>(value));
  }
  string.negative = negative;
  return string;
}

std::string PauliString::text() const {
  std::string text = negative ? "-" : "";
  for (std::size_t q = 0; q < qubits_; ++q) text += letters[static_cast<std::size_t>(letter(q))];
  return text;
}

}  // namespace isinglass
