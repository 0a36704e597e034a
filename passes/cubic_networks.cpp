// Writes networks of Toffolis and CNOTs with fewer Toffolis.
//
//   before   c-c-x a0 b0 c0;  c-c-x a0 b1 c1;  c-c-x a1 b0 c1;  c-c-x a1 b1 c0          4 Toffolis
//   after    cx a0 a1, cx b0 b1 and cx c0 c1 around one Toffoli each of a0 b0, a1 b1 and (a0+a1) (b0+b1)
//
// Idea. Between Hadamards on the targets a Toffoli is a sign (-1)^{x y z}, and so a stretch in which targets
// are never controls of Toffolis is a sign (-1)^f and a linear map of the bits, done by CNOTs: f is a cubic
// form over GF(2) in the bits that the stretch begins with. Any way to write f as a sum of products of linear
// forms gives the same operator; one with few products is sought (form_products.h), and then a short sequence
// of CNOTs that brings the factors of each product onto wires, in an order that it chooses (form_route.h).
// Nothing is known about multipliers here, but what it finds for them is Karatsuba's multiplication and
// better.
//
// Papers: Amy, Mosca, "T-count optimization and Reed-Muller codes", IEEE Trans. Inf. Theory 65, 4771 (2019)
// (cubic forms); Ruiz et al., "Quantum circuit optimization with AlphaTensor", arXiv:2402.14396 (Toffolis as
// terms of a tensor); both from memory. The rest was derived for this program.
#include "passes/cubic_networks.h"

#include <algorithm>
#include <bit>
#include <cmath>
#include <optional>

#include "passes/form_products.h"
#include "passes/form_route.h"
#include "passes/rename_swaps.h"

namespace isinglass {

namespace {

constexpr std::uint8_t absent = 0xff;

/// In which basis a wire is read: as it is, or between Hadamards.
enum class Basis : std::uint8_t { open, bit, sign };

struct Prices {
  double toffoli;
  double pair;  // a CNOT

  explicit Prices(const Cost& cost)
      : toffoli(4 * cost.interaction(std::asin(std::sqrt(std::sin(pi / 4)))) + cost.interaction(pi / 4)),
        pair(cost.interaction(pi / 2)) {}
};

struct Item {
  Operation op;
  std::size_t position;  // in the block
};

bool is_not(const Operation& op) {
  return op.kind == Kind::x && op.control_count() <= 2;
}
bool is_sign(const Operation& op) {
  return op.kind == Kind::z && op.control_count() <= 2;
}

bool is_cubic(const Operation& op) {
  return (is_not(op) || is_sign(op)) && op.operand_count == 3;
}

/// What every wire is to the Toffolis of a block, in their order.
class Roles {
 public:
  Roles(const Circuit& circuit, const Block& block) : on_wire_(circuit.wires) {
    for (std::size_t i = 0; i < block.size(); ++i) {
      if (!is_cubic(block[i])) continue;
      for (const std::uint32_t wire : circuit.operands(block[i])) {
        const bool is_target = block[i].kind == Kind::x && wire == block[i].operand[2];
        on_wire_[wire].push_back({i, is_target ? Basis::sign : Basis::bit});
      }
    }
  }
  /// The basis in which the next Toffoli needs the wire.
  Basis next(std::uint32_t wire, std::size_t position) const {
    const auto& all = on_wire_[wire];
    const auto found = std::lower_bound(all.begin(), all.end(), position,
                                        [](const auto& entry, std::size_t p) { return entry.first < p; });
    return found == all.end() ? Basis::open : found->second;
  }

 private:
  std::vector<std::vector<std::pair<std::size_t, Basis>>> on_wire_;
};

/// A stretch as a function: the form on each wire and the products of signs, in the forms it began with.
class Stretch {
 public:
  Stretch(const Circuit& circuit, const Roles& roles)
      : circuit_(circuit), roles_(roles), number_(circuit.wires, absent) {}

  /// Takes an operation into the stretch; false where it does not fit.
  bool take(const Item& item) {
    if (!is_not(item.op) && !is_sign(item.op)) return false;
    const auto operands = circuit_.operands(item.op);
    std::size_t fresh = 0;
    for (const std::uint32_t wire : operands) fresh += number_[wire] == absent;
    if (wire_.size() + fresh > most_variables || products_.terms().size() >= most_products) return false;
    std::array<Basis, 3> basis = bases_for(item);
    if (!fits(item.op, basis)) return false;
    std::array<std::uint8_t, 3> wires{};
    for (std::size_t k = 0; k < operands.size(); ++k) wires[k] = enter(operands[k], basis[k]);
    perform(item.op, wires, basis);
    items_.push_back(item);
    toffolis_ += operands.size() == 3;
    return true;
  }

  bool touches(std::uint32_t wire) const { return number_[wire] != absent; }
  std::size_t toffolis() const { return toffolis_; }
  const std::vector<Item>& items() const { return items_; }
  const Products& products() const { return products_; }
  unsigned size() const { return static_cast<unsigned>(wire_.size()); }
  std::uint32_t wire(unsigned number) const { return wire_[number]; }
  Basis basis(unsigned number) const { return basis_[number]; }
  const std::vector<Form>& forms() const { return form_; }

  double price(const Prices& prices) const {
    double sum = 0;
    for (const Item& item : items_) {
      sum += item.op.operand_count == 3 ? prices.toffoli : item.op.operand_count == 2 ? prices.pair : 0;
    }
    return sum;
  }

  void clear() {
    for (const std::uint32_t wire : wire_) number_[wire] = absent;
    wire_.clear();
    basis_.clear();
    form_.clear();
    items_.clear();
    products_ = {};
    toffolis_ = 0;
  }

 private:
  static constexpr std::size_t most_products = 300;

  /// The bases of the operands: those they have, those the next Toffolis want, or that of the partner.
  std::array<Basis, 3> bases_for(const Item& item) const {
    const auto operands = circuit_.operands(item.op);
    std::array<Basis, 3> basis{};
    for (std::size_t k = 0; k < operands.size(); ++k) {
      const std::uint8_t n = number_[operands[k]];
      basis[k] = n == absent ? roles_.next(operands[k], item.position) : basis_[n];
    }
    for (std::size_t k = 0; k < operands.size(); ++k) {
      if (basis[k] == Basis::open && operands.size() == 2) basis[k] = basis[1 - k];
      if (basis[k] == Basis::open) basis[k] = Basis::bit;
    }
    return basis;
  }

  static bool fits(const Operation& op, const std::array<Basis, 3>& basis) {
    const bool is_x = op.kind == Kind::x;
    switch (op.operand_count) {
      case 1:
        return true;
      case 2:
        return is_x ? basis[0] == Basis::bit || basis[1] == Basis::sign
                    : basis[0] == Basis::bit || basis[1] == Basis::bit;
      default:
        return basis[0] == Basis::bit && basis[1] == Basis::bit &&
               basis[2] == (is_x ? Basis::sign : Basis::bit);
    }
  }

  std::uint8_t enter(std::uint32_t wire, Basis basis) {
    if (number_[wire] == absent) {
      number_[wire] = static_cast<std::uint8_t>(wire_.size());
      form_.push_back(Form{1} << wire_.size());
      wire_.push_back(wire);
      basis_.push_back(basis);
    }
    return number_[wire];
  }

  void perform(const Operation& op, const std::array<std::uint8_t, 3>& w, const std::array<Basis, 3>& basis) {
    const bool is_x = op.kind == Kind::x;
    if (op.operand_count == 3) return products_.add({{form_[w[0]], form_[w[1]], form_[w[2]]}});
    if (op.operand_count == 1) {
      const bool flips = is_x == (basis[0] == Basis::bit);
      return flips ? void(form_[w[0]] ^= unity) : products_.add_linear(form_[w[0]]);
    }
    // A CNOT between Hadamards on its target is a sign, on both wires a CNOT the other way round.
    const bool is_sign_at_last = is_x != (basis[1] == Basis::sign);
    if (basis[0] == Basis::bit && is_sign_at_last) {
      form_[w[1]] ^= form_[w[0]];
    } else if (basis[0] == Basis::bit) {
      products_.add({{form_[w[0]], form_[w[1]], unity}});
    } else {
      form_[w[0]] ^= form_[w[1]];
    }
  }

  const Circuit& circuit_;
  const Roles& roles_;
  std::vector<std::uint8_t> number_;  // of each wire of the circuit
  std::vector<std::uint32_t> wire_;   // of each number
  std::vector<Basis> basis_;
  std::vector<Form> form_;
  std::vector<Item> items_;
  Products products_;
  std::size_t toffolis_ = 0;
};

/// Writes a sum of products along a route.
class Writer {
 public:
  Writer(Circuit& circuit, const Stretch& stretch, Block& out)
      : circuit_(circuit), stretch_(stretch), out_(out) {
    for (const Item& item : stretch.items()) origin_ = circuit.origins.merged(origin_, item.op.origin);
  }

  void write(const Products& products, const FormRoute& route) {
    for (unsigned w = 0; w < stretch_.size(); ++w) {
      if (products.linear() >> w & 1) change_sign(w);
    }
    for (std::size_t k = 0; k <= route.additions.size(); ++k) {
      for (std::size_t p = 0; p < products.terms().size(); ++p) {
        if (route.reached[p] == k) multiply(products.terms()[p], route, k);
      }
      if (k < route.additions.size()) add(route.additions[k]);
    }
    for (unsigned w = 0; w < stretch_.size(); ++w) {
      if (stretch_.forms()[w] & unity) flip(route.where[w]);
    }
    bring_home(route.where);
  }

 private:
  bool is_sign(unsigned w) const { return stretch_.basis(w) == Basis::sign; }

  void put(Kind kind, std::initializer_list<unsigned> wires) {
    std::vector<std::uint32_t> operands;
    for (const unsigned w : wires) operands.push_back(stretch_.wire(w));
    out_.push_back(circuit_.make(kind, operands, {}, origin_));
  }
  void flip(unsigned w) { put(is_sign(w) ? Kind::z : Kind::x, {w}); }
  void change_sign(unsigned w) { put(is_sign(w) ? Kind::x : Kind::z, {w}); }

  void add(Addition step) {
    const unsigned from = step.from, to = step.to;
    if (is_sign(from) && is_sign(to)) return put(Kind::x, {to, from});
    if (is_sign(to)) return put(Kind::z, {from, to});
    if (is_sign(from)) put(Kind::h, {from});
    put(Kind::x, {from, to});
    if (is_sign(from)) put(Kind::h, {from});
  }

  /// The sign of a product whose factors stand on wires after `steps` additions.
  void multiply(const Product& product, const FormRoute& route, std::size_t steps) {
    std::vector<unsigned> wires, flipped, turned;  // a target, if there is one, last
    for (Form form : product.factor) {
      if (form == unity) continue;
      const bool is_flipped = (form & unity) != 0;
      form &= ~unity;
      for (std::size_t k = 0; k < steps; ++k) {
        form ^= (form >> route.additions[k].to & 1) << route.additions[k].from;
      }
      wires.push_back(static_cast<unsigned>(std::countr_zero(form)));
      if (is_flipped) flipped.push_back(wires.back());
    }
    std::stable_partition(wires.begin(), wires.end(), [&](unsigned w) { return !is_sign(w); });
    for (std::size_t k = 0; k + 1 < wires.size(); ++k) {
      if (is_sign(wires[k])) turned.push_back(wires[k]);
    }
    for (const unsigned w : flipped) flip(w);
    for (const unsigned w : turned) put(Kind::h, {w});
    const Kind kind = is_sign(wires.back()) ? Kind::x : Kind::z;
    wires.size() == 3 ? put(kind, {wires[0], wires[1], wires[2]}) : put(kind, {wires[0], wires[1]});
    for (const unsigned w : turned) put(Kind::h, {w});
    for (const unsigned w : flipped) flip(w);
  }

  /// The forms that belong on wire w stand on where[w].
  void bring_home(std::vector<std::uint8_t> where) {
    for (unsigned w = 0; w < where.size(); ++w) {
      if (is_sign(w) != is_sign(where[w])) put(Kind::h, {where[w]});
    }
    for (unsigned w = 0; w < where.size(); ++w) {
      if (where[w] == w) continue;
      put(Kind::swap, {w, where[w]});
      std::replace(where.begin(), where.end(), static_cast<std::uint8_t>(w), where[w]);
    }
  }

  Circuit& circuit_;
  const Stretch& stretch_;
  Block& out_;
  Origin origin_;
};

std::size_t swaps_in(std::vector<std::uint8_t> where) {
  std::size_t count = 0;
  for (unsigned w = 0; w < where.size(); ++w) {
    if (where[w] == w) continue;
    ++count;
    std::replace(where.begin(), where.end(), static_cast<std::uint8_t>(w), where[w]);
  }
  return count;
}

class Rewriter {
 public:
  Rewriter(Circuit& circuit, const PassContext& context)
      : circuit_(circuit), context_(context), prices_(context.cost) {}

  /// The block with its stretches rewritten; nothing where none got cheaper.
  std::optional<Block> rewritten(const Block& block, bool may_rename) {
    const Roles roles(circuit_, block);
    Stretch stretch(circuit_, roles);
    std::vector<bool> is_blocked(circuit_.wires);
    std::vector<Item> waiting, passed;  // taken out of earlier stretches; passed over by this one
    std::size_t next_waiting = 0, next = 0;
    Block out;
    bool is_changed = false;
    while (next_waiting < waiting.size() || next < block.size()) {
      // One stretch, with everything that can be done before it.
      while ((next_waiting < waiting.size() || next < block.size()) && passed.size() < most_passed) {
        const bool is_waiting = next_waiting < waiting.size();
        const Item item = is_waiting ? waiting[next_waiting] : Item{block[next], next};
        const auto operands = circuit_.operands(item.op);
        const auto blocked = [&](std::uint32_t wire) { return is_blocked[wire]; };
        const auto touched = [&](std::uint32_t wire) { return stretch.touches(wire); };
        const bool is_later = std::any_of(operands.begin(), operands.end(), blocked);
        if (!item.op.is_unitary() && (stretch.size() > 0 || !passed.empty())) break;
        ++(is_waiting ? next_waiting : next);
        if (!is_later && stretch.take(item)) continue;
        if (!is_later && std::none_of(operands.begin(), operands.end(), touched)) {
          out.push_back(item.op);
          continue;
        }
        for (const std::uint32_t wire : operands) is_blocked[wire] = true;
        passed.push_back(item);
      }
      is_changed = write(stretch, may_rename, out) || is_changed;
      stretch.clear();
      for (const Item& item : passed) {
        for (const std::uint32_t wire : circuit_.operands(item.op)) is_blocked[wire] = false;
      }
      waiting.erase(waiting.begin(), waiting.begin() + static_cast<std::ptrdiff_t>(next_waiting));
      waiting.insert(waiting.begin(), passed.begin(), passed.end());
      next_waiting = 0;
      passed.clear();
    }
    if (!is_changed) return std::nullopt;
    return out;
  }

 private:
  static constexpr std::size_t most_passed = 64;
  static constexpr std::size_t least_toffolis = 3;

  /// Writes the stretch the cheaper way; true where that is a new one.
  bool write(const Stretch& stretch, bool may_rename, Block& out) {
    if (stretch.toffolis() >= least_toffolis && !context_.out_of_time() &&
        rewrite(stretch, may_rename, out)) {
      return true;
    }
    for (const Item& item : stretch.items()) out.push_back(item.op);
    return false;
  }

  bool rewrite(const Stretch& stretch, bool may_rename, Block& out) {
    // Searches from other random choices go on as long as the first one paid.
    const int tries = context_.effort == Effort::deep ? 12 : 3;
    Dice dice(context_.seed);
    std::optional<Network> best;
    for (int k = 0; k < tries && (k == 0 || (best && !context_.out_of_time())); ++k) {
      auto network = cheaper_network(stretch, may_rename, dice);
      if (network && (!best || network->price < best->price)) best = std::move(network);
    }
    if (!best) return false;
    Writer(circuit_, stretch, out).write(best->products, best->route);
    return true;
  }

  struct Network {
    Products products;
    FormRoute route;
    double price;  // in CNOTs
  };

  std::optional<Network> cheaper_network(const Stretch& stretch, bool may_rename, Dice& dice) {
    const double before = stretch.price(prices_) / prices_.pair;
    const auto count = static_cast<unsigned>(stretch.products().terms().size());
    ProductsPlan plan;
    plan.cubic = prices_.toffoli / prices_.pair;
    plan.folds = 2 * count;
    plan.flips = 200 * count;
    plan.deadline = context_.deadline;
    const Products products = fewer_products(stretch.products(), plan, dice);
    if (price_of(products, plan) >= before) return std::nullopt;

    FormTask task{stretch.size(), {}, stretch.forms()};
    for (const Product& product : products.terms()) {
      Stop stop = product.factor;
      for (Form& form : stop) form &= ~unity;
      task.stops.push_back(stop);
    }
    for (Form& form : task.home) form &= ~unity;
    const std::size_t cubic = products.cubic_count();
    const double fixed =
        plan.cubic * static_cast<double>(cubic) + static_cast<double>(products.terms().size() - cubic);
    FormRoutePlan search;
    search.starts = 10 + 2 * count;
    search.windows = 150 * count;
    search.worth = static_cast<std::size_t>(before - fixed);
    search.deadline = context_.deadline;
    auto route = find_form_route(task, search, dice);
    if (!route) return std::nullopt;
    const std::size_t additions = route->additions.size() + (may_rename ? 0 : 3 * swaps_in(route->where));
    const double price = fixed + static_cast<double>(additions);
    if (price > before - 1e-9) return std::nullopt;
    return Network{products, std::move(*route), price};
  }

  Circuit& circuit_;
  const PassContext& context_;
  Prices prices_;
};

}  // namespace

std::optional<Circuit> cubic_networks_beside(const Circuit& circuit, const PassContext& context) {
  const auto has_toffolis = [](const Block& block) {
    return std::any_of(block.begin(), block.end(), is_cubic);
  };
  if (std::none_of(circuit.blocks.begin(), circuit.blocks.end(), has_toffolis)) return std::nullopt;
  Circuit result = circuit;
  const bool may_rename = may_rename_wires(circuit);
  bool is_changed = false;
  for (std::size_t b = 0; b < circuit.blocks.size(); ++b) {
    auto better = Rewriter(result, context).rewritten(circuit.blocks[b], b == 0 && may_rename);
    if (!better) continue;
    result.blocks[b] = std::move(*better);
    is_changed = true;
  }
  if (!is_changed) return std::nullopt;
  return result;
}

Circuit cubic_networks(Circuit circuit, const PassContext& context) {
  if (auto better = cubic_networks_beside(circuit, context)) return std::move(*better);
  return circuit;
}

}  // namespace isinglass
