// Polynomials over GF(2); see boolean_values.h.
#include "passes/boolean_values.h"

#include <algorithm>
#include <iterator>
#include <span>

namespace isinglass {

namespace {

constexpr std::size_t longest = 64;          // monomials of any value
constexpr std::size_t highest = 12;          // variables of a monomial
constexpr std::ptrdiff_t most_products = 3;  // monomials of two variables or more in a sum

/// The mixing function of the SplitMix64 generator: Steele, Lea, Flood, OOPSLA 2014.
std::uint64_t random_bits(std::span<const std::uint32_t> variables) {
  std::uint64_t bits = 0;
  for (const std::uint32_t variable : variables) {
    bits += 0x9e3779b97f4a7c15u * (std::uint64_t{variable} + 1);
    bits = (bits ^ bits >> 30) * 0xbf58476d1ce4e5b9u;
    bits = (bits ^ bits >> 27) * 0x94d049bb133111ebu;
    bits ^= bits >> 31;
  }
  return bits;
}

}  // namespace

BooleanValues::BooleanValues() {
  intern({});
  intern({Monomial{}});
}

BooleanValues::Value BooleanValues::intern(Polynomial polynomial) {
  const auto [entry, is_new] = index_.try_emplace(std::move(polynomial), static_cast<Value>(table_.size()));
  if (is_new) {
    table_.push_back(entry->first);
    marks_.push_back(mark_of(entry->first));
  }
  return entry->second;
}

/// The marks of its variables, random bits for each product of several, none for the constant.
std::uint64_t BooleanValues::mark_of(const Polynomial& polynomial) const {
  std::uint64_t mark = 0;
  for (const Monomial& monomial : polynomial) {
    if (monomial.empty()) continue;
    mark ^= monomial.size() == 1 ? variable_marks_[monomial[0]] : random_bits(monomial);
  }
  return mark;
}

bool BooleanValues::is_short(const Polynomial& polynomial) {
  const auto is_low = [](const Monomial& m) { return m.size() <= highest; };
  return polynomial.size() <= longest && std::all_of(polynomial.begin(), polynomial.end(), is_low);
}

bool BooleanValues::is_nearly_linear(const Polynomial& polynomial) {
  const auto is_product = [](const Monomial& m) { return m.size() > 1; };
  return std::count_if(polynomial.begin(), polynomial.end(), is_product) <= most_products;
}

BooleanValues::Value BooleanValues::fresh() {
  const auto variable = static_cast<std::uint32_t>(variable_marks_.size());
  variable_marks_.push_back(random_bits(std::span(&variable, 1)));
  return intern({Monomial{variable}});
}

BooleanValues::Value BooleanValues::sum(Value a, Value b) {
  if (a > b) std::swap(a, b);
  if (const auto known = sums_.find({a, b}); known != sums_.end()) return known->second;
  Polynomial result;
  std::set_symmetric_difference(table_[a].begin(), table_[a].end(), table_[b].begin(), table_[b].end(),
                                std::back_inserter(result));
  if (is_short(result) && is_nearly_linear(result)) return sums_[{a, b}] = intern(std::move(result));
  // A name of its own, so that a carry's polynomial does not grow with its place; taking back what was added
  // gives the old value again.
  const Value named = fresh();
  marks_[named] = variable_marks_.back() = marks_[a] ^ marks_[b];
  sums_[std::minmax(named, a)] = b;
  sums_[std::minmax(named, b)] = a;
  return sums_[{a, b}] = named;
}

BooleanValues::Value BooleanValues::product(Value a, Value b) {
  if (a > b) std::swap(a, b);
  if (const auto known = products_.find({a, b}); known != products_.end()) return known->second;
  Polynomial terms;
  for (const Monomial& left : table_[a]) {
    for (const Monomial& right : table_[b]) {
      Monomial both;
      std::set_union(left.begin(), left.end(), right.begin(), right.end(), std::back_inserter(both));
      terms.push_back(std::move(both));
    }
  }
  std::sort(terms.begin(), terms.end());
  Polynomial result;  // equal monomials cancel in pairs
  for (Monomial& term : terms) {
    if (!result.empty() && result.back() == term) {
      result.pop_back();
    } else {
      result.push_back(std::move(term));
    }
  }
  return products_[{a, b}] = is_short(result) ? intern(std::move(result)) : fresh();
}

}  // namespace isinglass
