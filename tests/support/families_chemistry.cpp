// Excitations as Pauli strings, and their ladders; see families_chemistry.h.
#include "support/families_chemistry.h"

#include <complex>
#include <map>
#include <string>

#include "support/random_circuits.h"

namespace isinglass::support {

namespace {

/// A sum of Pauli strings; the text has a letter a qubit.
using Sum = std::map<std::string, Complex>;

/// The product of two letters and its phase, from the multiplication table of the Pauli matrices.
std::pair<char, Complex> times(char a, char b) {
  if (a == 'I') return {b, 1};
  if (b == 'I') return {a, 1};
  if (a == b) return {'I', 1};
  const char c = static_cast<char>('X' + 'Y' + 'Z' - a - b);
  const bool cyclic = (a == 'X' && b == 'Y') || (a == 'Y' && b == 'Z') || (a == 'Z' && b == 'X');
  return {c, Complex(0, cyclic ? 1 : -1)};
}

Sum times(const Sum& left, const Sum& right) {
  Sum result;
  for (const auto& [a, ca] : left) {
    for (const auto& [b, cb] : right) {
      std::string c = a;
      Complex coefficient = ca * cb;
      for (std::size_t q = 0; q < a.size(); ++q) {
        const auto [letter, phase] = times(a[q], b[q]);
        c[q] = letter;
        coefficient *= phase;
      }
      result[c] += coefficient;
    }
  }
  return result;
}

/// Jordan-Wigner: a_p = Z...Z (X + iY)/2, its adjoint with -iY.
Sum ladder_operator(unsigned qubits, unsigned p, bool creates) {
  std::string x(qubits, 'I');
  for (unsigned q = 0; q < p; ++q) x[q] = 'Z';
  std::string y = x;
  x[p] = 'X';
  y[p] = 'Y';
  return {{x, 0.5}, {y, Complex(0, creates ? -0.5 : 0.5)}};
}

class Maker {
 public:
  Maker(unsigned qubits, bool symbolic, std::uint64_t seed)
      : qubits_(qubits), symbolic_(symbolic), random_(seed) {
    add_register(circuit_, "q", qubits);
  }

  /// exp(t (T - T^+)), T = creators of `to` and annihilators of `from`.
  void excite(const std::vector<unsigned>& to, const std::vector<unsigned>& from) {
    Sum sum{{std::string(qubits_, 'I'), 1}};
    for (const unsigned p : to) sum = times(sum, ladder_operator(qubits_, p, true));
    for (const unsigned p : from) sum = times(sum, ladder_operator(qubits_, p, false));
    const Angle amplitude = next_amplitude();
    for (const auto& [string, coefficient] : sum) {
      // T - T^+ keeps twice the imaginary part of each coefficient: exp(2 i t Im(c) P) turns by -4 t Im(c).
      if (std::abs(coefficient.imag()) < 1e-12) continue;
      ladder(string, circuit_.forms.scaled(amplitude, -4 * coefficient.imag()));
    }
  }

  Circuit take() { return std::move(circuit_); }

 private:
  Angle next_amplitude() {
    if (!symbolic_) return {random_.real(0.01, 0.2) * (random_.chance(0.5) ? 1 : -1)};
    Input input;
    input.name = "t" + std::to_string(circuit_.inputs.size());
    input.type = "float";
    circuit_.inputs.push_back(input);
    return {0, circuit_.forms.of_input(static_cast<std::uint32_t>(circuit_.inputs.size() - 1))};
  }

  void basis(const std::string& string, bool back) {
    for (unsigned q = 0; q < qubits_; ++q) {
      if (string[q] == 'X') put(Kind::h, {q});
      if (string[q] == 'Y') put(Kind::r, {q}, {{back ? -pi / 2 : pi / 2}, {0}});
    }
  }

  void ladder(const std::string& string, Angle angle) {
    std::vector<unsigned> support;
    for (unsigned q = 0; q < qubits_; ++q) {
      if (string[q] != 'I') support.push_back(q);
    }
    basis(string, false);
    for (std::size_t k = 0; k + 1 < support.size(); ++k) put(Kind::x, {support[k], support[k + 1]});
    put(Kind::rz, {support.back()}, {angle});
    for (std::size_t k = support.size() - 1; k-- > 0;) put(Kind::x, {support[k], support[k + 1]});
    basis(string, true);
  }

  void put(Kind kind, std::initializer_list<std::uint32_t> operands,
           std::initializer_list<Angle> angles = {}) {
    circuit_.body().push_back(circuit_.make(kind, operands, angles));
  }

  unsigned qubits_;
  bool symbolic_;
  Random random_;
  Circuit circuit_;
};

}  // namespace

Circuit unitary_coupled_cluster(unsigned qubits, unsigned electrons, bool symbolic, std::uint64_t seed) {
  Maker maker(qubits, symbolic, seed);
  const unsigned occupied = electrons / 2, orbitals = qubits / 2;
  const auto qubit = [](unsigned orbital, unsigned spin) { return 2 * orbital + spin; };
  for (unsigned spin = 0; spin < 2; ++spin) {
    for (unsigned i = 0; i < occupied; ++i) {
      for (unsigned a = occupied; a < orbitals; ++a) maker.excite({qubit(a, spin)}, {qubit(i, spin)});
    }
  }
  for (unsigned i = 0; i < 2 * occupied; ++i) {
    for (unsigned j = i + 1; j < 2 * occupied; ++j) {
      for (unsigned a = 2 * occupied; a < qubits; ++a) {
        for (unsigned b = a + 1; b < qubits; ++b) {
          if (i % 2 + j % 2 != a % 2 + b % 2) continue;  // spin is conserved
          maker.excite({a, b}, {j, i});
        }
      }
    }
  }
  return maker.take();
}

}  // namespace isinglass::support
