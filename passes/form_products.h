// Cubic forms over GF(2) as sums of few products of linear forms.
//
//   a0 b0 c0 + a0 b1 c1 + a1 b0 c1 + a1 b1 c2   becomes   a0 b0 (c0+c1) + a1 b1 (c2+c1) + (a0+a1) (b0+b1) c1
//
// Idea. A sum of products stays the same function when two products that share a factor are rewritten (a
// flip: f b c + f b' c' = f (b+b') c + f b' (c+c')), and gets shorter when two products share two factors or
// when four of them are all products of two forms with two others and their third factors have a relation (a
// fold, the step of Karatsuba's multiplication). Folds are chosen by how few new forms they bring in, since
// each costs a CNOT later; the sequence of folds is then run again from a random place with some noise, as
// long as there are tries. A walk of random flips, annealed, takes what folds do not see.
//
// Papers: Karatsuba, Ofman, Soviet Physics Doklady 7, 595 (1963); Kauers, Moosbauer, "Flip graphs for matrix
// multiplication", J. Symb. Comput. 128 (2025), arXiv:2212.01175 (from memory).
#pragma once

#include <array>
#include <chrono>
#include <cstdint>
#include <vector>

#include "passes/dice.h"

namespace isinglass {

/// A linear form over GF(2) plus a constant: bit k stands for variable k < 63, bit 63 for the constant 1.
/// Forms are added by exclusive or.
using Form = std::uint64_t;
inline constexpr Form unity = Form{1} << 63;
inline constexpr unsigned most_variables = 63;

/// The product of three forms. One of two forms has `unity` as its last factor.
struct Product {
  std::array<Form, 3> factor{};
  bool is_cubic() const { return factor[2] != unity; }
  bool operator==(const Product&) const = default;
};

/// A sum of products, each of two or three forms whose linear parts are independent, no two of which share
/// two factors; and a linear form (its constant is dropped: it stands for a global phase).
class Products {
 public:
  /// Adds a product of any three forms.
  void add(Product product);
  void add_linear(Form form) { linear_ ^= form & ~unity; }
  void remove(std::size_t i);

  const std::vector<Product>& terms() const { return terms_; }
  Form linear() const { return linear_; }
  std::size_t cubic_count() const;

 private:
  std::vector<Product> terms_;
  Form linear_ = 0;
};

struct ProductsPlan {
  double cubic = 3.4;      // what a cubic product costs
  double quadratic = 1;    // and a quadratic one; in units of what a form costs that is not one variable
  unsigned folds = 100;    // sequences of folds tried
  unsigned flips = 10000;  // random flips tried
  std::chrono::steady_clock::time_point deadline = std::chrono::steady_clock::time_point::max();
};

/// What a sum costs under the plan: its products and the forms in them, each counted once.
double price_of(const Products& products, const ProductsPlan& plan);

/// The cheapest sum found for the same function; never dearer than the given one.
Products fewer_products(const Products& products, const ProductsPlan& plan, Dice& dice);

}  // namespace isinglass
