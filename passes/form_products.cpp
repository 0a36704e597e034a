// See form_products.h.
#include "passes/form_products.h"

#include <algorithm>
#include <cmath>
#include <optional>
#include <unordered_map>

namespace isinglass {

namespace {

/// Whether the form is more than one variable, so that it has to be made.
bool is_sum(Form form) {
  const Form linear = form & ~unity;
  return (linear & (linear - 1)) != 0;
}

/// Brings a product into its normal form: distinct factors, unities last. False where it is a constant.
bool normalize(Product& product) {
  std::array<Form, 3> proper{};
  int count = 0;
  for (const Form form : product.factor) {
    if (form == 0) return false;
    if (form == unity || std::find(proper.begin(), proper.begin() + count, form) != proper.begin() + count) {
      continue;  // f f = f
    }
    if (std::find(proper.begin(), proper.begin() + count, form ^ unity) != proper.begin() + count)
      return false;
    proper[count++] = form;
  }
  const Form sum = proper[0] ^ proper[1] ^ proper[2];
  if (count == 3 && sum == 0) return false;   // f g (f+g) = 0
  if (count == 3 && sum == unity) count = 2;  // f g (f+g+1) = f g
  std::fill(proper.begin() + count, proper.end(), unity);
  product.factor = proper;
  return count > 0;
}

int slot_of(const Product& product, Form form) {
  return static_cast<int>(std::find(product.factor.begin(), product.factor.end(), form) -
                          product.factor.begin());
}

/// If two products share two factors, the slots of the third ones.
struct Slots {
  int mine;
  int theirs;
};
std::optional<Slots> two_shared(const Product& p, const Product& q) {
  Slots third{0, slot_of(q, p.factor[0])};
  int missing = 0;
  for (int s = 0; s < 3; ++s) {
    if (slot_of(q, p.factor[s]) < 3) continue;
    third.mine = s;
    ++missing;
  }
  if (missing > 1) return std::nullopt;
  for (int s = 0; s < 3 && missing == 1; ++s) {
    if (slot_of(p, q.factor[s]) == 3) third.theirs = s;
  }
  return third;
}

double price(const Product& product, const ProductsPlan& plan) {
  return product.is_cubic() ? plan.cubic : plan.quadratic;
}

std::size_t mixed(Form form) {
  return static_cast<std::size_t>((form ^ form >> 32) * 0x9e3779b97f4a7c15u >> 13);
}

// ---- folds
// ------------------------------------------------------------------------------------------------

/// Four products f g x, f g' y, f' g z, f' g' w that become three.
struct Fold {
  std::array<std::size_t, 4> removed{};
  std::array<Product, 3> added{};
  double change = 0;  // of the price
};

/// Finds the fold that lowers the price of a sum most.
class Folder {
 public:
  Folder(const std::vector<Product>& terms, const ProductsPlan& plan, double noise, Dice& dice)
      : terms_(terms), plan_(plan), noise_(noise), dice_(dice) {
    for (std::size_t i = 0; i < terms.size(); ++i) {
      for (int s = 0; s < 3; ++s) with_[terms[i].factor[s]].push_back({i, s});
    }
  }

  std::optional<Fold> best() {
    // All products as the first one, from a random one on, as long as the work is bounded.
    const std::size_t count = terms_.size();
    const std::size_t start = dice_.below(static_cast<unsigned>(count));
    for (std::size_t k = 0; k < count && looked_ < most_looked; ++k) {
      const std::size_t i = (start + k) % count;
      for (int third = 0; third < 3; ++third) look_from(i, (third + 1) % 3, (third + 2) % 3);
    }
    return best_;
  }

 private:
  struct Place {
    std::size_t term;
    int slot;
  };
  static constexpr std::size_t most_looked = 30'000;

  /// Folds in which product i is f g x with the least f and g.
  void look_from(std::size_t i, int slot_f, int slot_g) {
    if (terms_[i].factor[slot_f] > terms_[i].factor[slot_g]) std::swap(slot_f, slot_g);
    const Form f = terms_[i].factor[slot_f];
    const Form g = terms_[i].factor[slot_g];
    const Form x = terms_[i].factor[3 - slot_f - slot_g];
    for (const Place& j : with_.at(f)) {
      if (j.term == i) continue;
      for (int r = 1; r <= 2; ++r) {
        const Form g2 = terms_[j.term].factor[(j.slot + r) % 3];
        const Form y = terms_[j.term].factor[(j.slot + 3 - r) % 3];
        if (g2 <= g) continue;
        for (const Place& k : with_.at(g)) {
          if (k.term == i) continue;
          for (int q = 1; q <= 2; ++q) {
            const Form f2 = terms_[k.term].factor[(k.slot + q) % 3];
            const Form z = terms_[k.term].factor[(k.slot + 3 - q) % 3];
            if (f2 <= f) continue;
            ++looked_;
            if (const auto last = with_both(f2, g2)) {
              try_fold({i, j.term, k.term, last->term}, {f, f2}, {g, g2},
                       {{{x, y}, {z, terms_[last->term].factor[last->slot]}}});
            }
          }
        }
      }
    }
  }

  /// The product with these two factors, and the slot of its third.
  std::optional<Place> with_both(Form f, Form g) const {
    const auto found = with_.find(f);
    if (found == with_.end()) return std::nullopt;
    for (const Place& place : found->second) {
      for (int r = 1; r <= 2; ++r) {
        if (terms_[place.term].factor[(place.slot + r) % 3] == g) {
          return Place{place.term, (place.slot + 3 - r) % 3};
        }
      }
    }
    return std::nullopt;
  }

  /// With another basis h, h' of the forms spanned by g, g': f h X + f h' Y + f' h Y + f' h' Z =
  /// f h (X+Y) + f' h' (Z+Y) + (f+f') (h+h') Y.
  void try_fold(const std::array<std::size_t, 4>& removed, const std::array<Form, 2>& f,
                const std::array<Form, 2>& g, const std::array<std::array<Form, 2>, 2>& third) {
    std::array<std::size_t, 4> sorted = removed;
    std::sort(sorted.begin(), sorted.end());
    if (std::adjacent_find(sorted.begin(), sorted.end()) != sorted.end()) return;
    const std::array<Form, 3> span = {g[0], g[1], g[0] ^ g[1]};
    for (int h = 0; h < 3; ++h) {
      for (int h2 = 0; h2 < 3; ++h2) {
        if (h == h2) continue;
        // c0 g + c1 g' in the basis of span[h] and span[h2].
        const auto coefficients = [&](const std::array<Form, 2>& c) {
          // The part along span[h] is what vanishes on span[h2].
          const std::array<Form, 3> vanishing = {c[1], c[0], c[0] ^ c[1]};
          return std::array<Form, 2>{vanishing[h2], vanishing[h]};
        };
        const auto upper = coefficients(third[0]);
        const auto lower = coefficients(third[1]);
        if (upper[1] != lower[0]) continue;
        const Form y = upper[1];
        consider({sorted,
                  {Product{{f[0], span[h], upper[0] ^ y}}, Product{{f[1], span[h2], lower[1] ^ y}},
                   Product{{f[0] ^ f[1], span[h] ^ span[h2], y}}}});
      }
    }
  }

  void consider(Fold fold) {
    std::array<Form, 21> forms;  // of the seven products, removed ones first
    double change = 0;
    for (int k = 0; k < 4; ++k) {
      const Product& product = terms_[fold.removed[k]];
      std::copy_n(product.factor.begin(), 3, forms.begin() + 3 * k);
      change -= price(product, plan_);
    }
    for (int k = 0; k < 3; ++k) {
      Product product = fold.added[k];
      std::copy_n(product.factor.begin(), 3, forms.begin() + 12 + 3 * k);
      if (normalize(product)) change += price(product, plan_);
    }
    for (int k = 0; k < 21; ++k) {
      if (!is_sum(forms[k]) || std::find(forms.begin(), forms.begin() + k, forms[k]) != forms.begin() + k) {
        continue;
      }
      const auto found = with_.find(forms[k]);
      const auto before = found == with_.end() ? 0 : static_cast<std::ptrdiff_t>(found->second.size());
      const auto after = before - std::count(forms.begin(), forms.begin() + 12, forms[k]) +
                         std::count(forms.begin() + 12, forms.end(), forms[k]);
      change += static_cast<double>(after > 0) - static_cast<double>(before > 0);
    }
    change += noise_ * dice_.real();
    if (best_ && change >= best_->change) return;
    fold.change = change;
    best_ = fold;
  }

  struct Hash {
    std::size_t operator()(Form form) const { return mixed(form); }
  };

  const std::vector<Product>& terms_;
  const ProductsPlan& plan_;
  double noise_;
  Dice& dice_;
  std::unordered_map<Form, std::vector<Place>, Hash> with_;  // by factor
  std::size_t looked_ = 0;
  std::optional<Fold> best_;
};

void apply(const Fold& fold, Products& products) {
  for (int k = 3; k >= 0; --k) products.remove(fold.removed[k]);
  for (const Product& product : fold.added) products.add(product);
}

/// All the sums on the way from the first to one that has no fold.
using FoldPath = std::vector<Products>;

FoldPath folded_on(FoldPath path, const ProductsPlan& plan, double noise, Dice& dice) {
  while (path.back().terms().size() >= 4) {
    const auto fold = Folder(path.back().terms(), plan, noise, dice).best();
    if (!fold) break;
    path.push_back(path.back());
    apply(*fold, path.back());
  }
  return path;
}

bool is_over(const ProductsPlan& plan) {
  return plan.deadline != std::chrono::steady_clock::time_point::max() &&
         std::chrono::steady_clock::now() >= plan.deadline;
}

Products by_folds(const Products& products, const ProductsPlan& plan, Dice& dice) {
  FoldPath best = {products};
  double best_price = price_of(products, plan);
  for (unsigned k = 0; k < plan.folds && !is_over(plan); ++k) {
    const bool is_fresh = k < plan.folds / 10 + 1;
    const std::size_t kept =
        is_fresh ? 1 : 1 + dice.below(static_cast<unsigned>(std::max<std::size_t>(1, best.size() - 1)));
    FoldPath path(best.begin(), best.begin() + static_cast<std::ptrdiff_t>(kept));
    path = folded_on(std::move(path), plan, k == 0 ? 0.01 : 1.0, dice);
    if (path.size() == 1) break;  // nothing to fold
    const double now = price_of(path.back(), plan);
    if (now > best_price) continue;
    best_price = now;
    best = std::move(path);
  }
  return std::move(best.back());
}

// ---- flips
// ------------------------------------------------------------------------------------------------

/// Simulated annealing over flips (Kirkpatrick, Gelatt, Vecchi, Science 220, 671).
Products by_flips(Products products, const ProductsPlan& plan, Dice& dice) {
  constexpr double hot = 0.7, cold = 0.1;
  Products best = products;
  double price_now = price_of(products, plan);
  double best_price = price_now;
  for (unsigned k = 0; k < plan.flips; ++k) {
    const auto& terms = products.terms();
    const auto count = static_cast<unsigned>(terms.size());
    if (count < 2 || (k % 1024 == 0 && is_over(plan))) break;
    const std::size_t i = dice.below(count);
    const int s = static_cast<int>(dice.below(3));
    const Form shared = terms[i].factor[s];
    const unsigned offset = dice.below(count);
    std::size_t j = count;
    int t = 0;
    for (unsigned step = 0; step < count && j == count; ++step) {
      const std::size_t candidate = (offset + step) % count;
      const auto& factor = terms[candidate].factor;
      const auto place = std::find(factor.begin(), factor.end(), shared);
      if (candidate == i || place == factor.end()) continue;
      j = candidate;
      t = static_cast<int>(place - factor.begin());
    }
    if (j == count) continue;
    const unsigned sides = dice.below(4);
    const int b = (s + 1 + static_cast<int>(sides & 1)) % 3, c = 3 - s - b;
    const int b2 = (t + 1 + static_cast<int>(sides >> 1)) % 3, c2 = 3 - t - b2;
    Product first = terms[i], second = terms[j];
    first.factor[b] ^= second.factor[b2];
    second.factor[c2] ^= first.factor[c];
    Products next = products;
    next.remove(std::max(i, j));
    next.remove(std::min(i, j));
    next.add(first);
    next.add(second);
    const double after = price_of(next, plan);
    const double heat = hot * std::pow(cold / hot, static_cast<double>(k) / plan.flips);
    if (after > price_now && dice.real() >= std::exp((price_now - after) / heat)) continue;
    products = std::move(next);
    price_now = after;
    if (price_now < best_price - 1e-9) {
      best_price = price_now;
      best = products;
    }
  }
  return best;
}

}  // namespace

void Products::add(Product product) {
  if (!normalize(product)) return;
  if (product.factor[1] == unity) return add_linear(product.factor[0]);
  for (std::size_t i = 0; i < terms_.size(); ++i) {
    const auto shared = two_shared(product, terms_[i]);
    if (!shared) continue;
    product.factor[shared->mine] ^= terms_[i].factor[shared->theirs];
    remove(i);
    return add(product);
  }
  terms_.push_back(product);
}

void Products::remove(std::size_t i) {
  terms_[i] = terms_.back();
  terms_.pop_back();
}

std::size_t Products::cubic_count() const {
  return static_cast<std::size_t>(
      std::count_if(terms_.begin(), terms_.end(), [](const Product& p) { return p.is_cubic(); }));
}

double price_of(const Products& products, const ProductsPlan& plan) {
  double sum = 0;
  std::vector<Form> forms;
  for (const Product& product : products.terms()) {
    sum += price(product, plan);
    for (const Form form : product.factor) {
      if (is_sum(form)) forms.push_back(form & ~unity);
    }
  }
  std::sort(forms.begin(), forms.end());
  return sum + static_cast<double>(std::unique(forms.begin(), forms.end()) - forms.begin());
}

Products fewer_products(const Products& products, const ProductsPlan& plan, Dice& dice) {
  const Products folded = by_folds(products, plan, dice);
  const Products flipped = by_flips(folded, plan, dice);
  return price_of(flipped, plan) < price_of(folded, plan) ? flipped : folded;
}

}  // namespace isinglass
