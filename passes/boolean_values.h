// Boolean functions of path variables as polynomials over GF(2), each stored once.
//
// A wire of a circuit carries, between any two operations, a bit that is a function of the bits the circuit
// started with and of the fresh bits that gates like h made: the variables of its sum over paths. Two
// functions with the same identifier are equal; beyond a size limit a function becomes a variable of its own,
// the same one whenever it is computed the same way again, so that equality stays sure but may be missed.
//
// Papers: Montanaro, "Quantum circuits and low-degree polynomials over F2", J. Phys. A 50, 084002 (2017);
// Amy, "Towards large-scale functional verification of universal quantum circuits", arXiv:1805.06908.
#pragma once

#include <cstdint>
#include <map>
#include <utility>
#include <vector>

namespace isinglass {

class BooleanValues {
 public:
  using Value = std::uint32_t;
  static constexpr Value zero = 0;
  static constexpr Value one = 1;

  BooleanValues();

  /// A variable that nothing else is equal to.
  Value fresh();
  Value sum(Value a, Value b);
  Value product(Value a, Value b);
  Value complement(Value a) { return sum(a, one); }
  /// A number that equal functions share, and their complements; that of a sum is the exclusive or of both.
  /// So whether a sum may equal a known function is seen without making it.
  std::uint64_t mark(Value a) const { return marks_[a]; }
  /// Whether the function is 1 where all variables are 0.
  bool has_constant(Value a) const { return !table_[a].empty() && table_[a].front().empty(); }

 private:
  using Monomial = std::vector<std::uint32_t>;  // ascending variables; empty = the constant 1
  using Polynomial = std::vector<Monomial>;     // ascending monomials; empty = 0
  using Pair = std::pair<Value, Value>;

  Value intern(Polynomial polynomial);
  std::uint64_t mark_of(const Polynomial& polynomial) const;
  static bool is_short(const Polynomial& polynomial);
  static bool is_nearly_linear(const Polynomial& polynomial);

  std::vector<Polynomial> table_;
  std::vector<std::uint64_t> marks_;
  std::map<Polynomial, Value> index_;
  std::map<Pair, Value> sums_;
  std::map<Pair, Value> products_;
  std::vector<std::uint64_t> variable_marks_;  // that of a name for a long sum is the sum's own
};

}  // namespace isinglass
