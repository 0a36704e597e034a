// Cubic networks: sums of products of forms, routes that carry forms, and the pass on whole circuits.
#include "passes/cubic_networks.h"

#include <doctest/doctest.h>

#include <algorithm>
#include <bit>
#include <chrono>
#include <set>

#include "passes/form_products.h"
#include "passes/form_route.h"
#include "passes/optimize.h"
#include "passes/rename_swaps.h"
#include "support/families_arithmetic.h"
#include "support/random_circuits.h"
#include "support/simulator.h"

using namespace isinglass;
using support::Random;

namespace {

// ---- sums of products

bool value(Form form, std::uint64_t point) {
  return (std::popcount(form & (point | unity)) & 1) != 0;
}
bool value(const Product& product, std::uint64_t point) {
  return value(product.factor[0], point) && value(product.factor[1], point) &&
         value(product.factor[2], point);
}
bool value(const Products& products, std::uint64_t point) {
  bool sum = value(products.linear(), point);
  for (const Product& product : products.terms()) sum ^= value(product, point);
  return sum;
}

/// Whether two functions of `variables` bits differ by a constant at most.
template <class A, class B>
bool are_equal(const A& a, const B& b, unsigned variables) {
  const bool constant = a(0) != b(0);
  for (std::uint64_t point = 0; point < std::uint64_t{1} << variables; ++point) {
    if ((a(point) != b(point)) != constant) return false;
  }
  return true;
}

Form random_form(Random& random, unsigned variables) {
  Form form = random.bits() & ((Form{1} << variables) - 1);
  if (random.chance(0.5)) form &= random.bits();
  if (random.chance(0.2)) form ^= unity;
  return random.chance(0.1) ? unity : form;
}

bool are_normal(const Products& products) {
  const auto& terms = products.terms();
  for (std::size_t i = 0; i < terms.size(); ++i) {
    const auto& f = terms[i].factor;
    const std::set<Form> distinct(f.begin(), f.end());
    if (distinct.size() != 3 || distinct.count(0) > 0 || f[0] == unity || f[1] == unity) return false;
    if (((f[0] ^ f[1] ^ f[2]) & ~unity) == 0) return false;
    for (std::size_t j = 0; j < i; ++j) {
      const auto& g = terms[j].factor;
      const auto shared = std::count_if(
          f.begin(), f.end(), [&](Form form) { return std::find(g.begin(), g.end(), form) != g.end(); });
      if (shared > 1) return false;
    }
  }
  return true;
}

/// The products of a multiplier: a_i b_j with the form of c that x^(i+j) reaches.
Products multiplier_products(std::uint32_t n) {
  std::vector<Form> power = {1};
  while (power.size() < 2 * n - 1) {
    Form next = power.back() << 1;
    if (next >> n) next ^= support::field_polynomial(n);
    power.push_back(next);
  }
  Products products;
  for (std::uint32_t i = 0; i < n; ++i) {
    for (std::uint32_t j = 0; j < n; ++j) {
      products.add({{Form{1} << i, Form{1} << (n + j), power[i + j] << (2 * n)}});
    }
  }
  return products;
}

// ---- circuits

std::size_t count_of(const Circuit& circuit, std::uint32_t operands) {
  std::size_t count = 0;
  for (const Block& block : circuit.blocks) {
    count += static_cast<std::size_t>(std::count_if(block.begin(), block.end(), [&](const Operation& op) {
      return op.is_unitary() && op.kind != Kind::swap && op.operand_count == operands;
    }));
  }
  return count;
}

/// What the pass counts: a Toffoli and a CNOT by their errors.
double price(const Circuit& circuit) {
  const double pair = Cost().interaction(pi / 2);
  const double toffoli = 5 * Cost().interaction_floor + 3.0438 * Cost().interaction_slope;
  return toffoli * static_cast<double>(count_of(circuit, 3)) +
         pair * static_cast<double>(count_of(circuit, 2));
}

/// NOTs and signs with up to two controls in which most wires are either controls or targets, some h and
/// other gates in between.
Circuit random_network(Random& random, std::uint32_t wires, int gates, double strange) {
  Circuit circuit;
  add_register(circuit, "q", wires);
  std::vector<bool> is_target(wires);
  for (std::uint32_t w = 0; w < wires; ++w) is_target[w] = random.chance(0.4);
  for (int g = 0; g < gates; ++g) {
    const auto operands = random.distinct(std::min(random.between(1, 5), 3), static_cast<int>(wires));
    const Kind kind = is_target[operands.back()] ? Kind::x : Kind::z;
    if (random.chance(strange)) {
      const Kind other = std::array{Kind::h, Kind::p, Kind::x, Kind::z}[random.below(4)];
      const std::vector<Angle> angles(other == Kind::p ? 1 : 0, Angle{0.3});
      circuit.body().push_back(other == Kind::h ? circuit.make(other, {operands[0]})
                                                : circuit.make(other, operands, angles));
    } else if (operands.size() == 2 && random.chance(0.7)) {
      circuit.body().push_back(circuit.make(Kind::x, operands));
    } else {
      circuit.body().push_back(circuit.make(kind, operands));
    }
  }
  return circuit;
}

}  // namespace

TEST_CASE("sums of products stay the same function, in normal form, and get no dearer") {
  Random random(51);
  int shorter = 0;
  for (int trial = 0; trial < 300; ++trial) {
    const auto variables = static_cast<unsigned>(random.between(2, 8));
    std::vector<Product> given(static_cast<std::size_t>(random.between(0, 14)));
    for (Product& product : given) {
      for (Form& form : product.factor) form = random_form(random, variables);
    }
    const auto source = [&](std::uint64_t point) {
      bool sum = false;
      for (const Product& product : given) sum ^= value(product, point);
      return sum;
    };
    Products products;
    for (const Product& product : given) products.add(product);
    CHECK(are_normal(products));
    CHECK(are_equal(
        source, [&](std::uint64_t point) { return value(products, point); }, variables));
    ProductsPlan plan;
    plan.flips = 1000;
    Dice dice(static_cast<std::uint64_t>(trial));
    const Products fewer = fewer_products(products, plan, dice);
    CHECK(are_normal(fewer));
    CHECK(are_equal(
        source, [&](std::uint64_t point) { return value(fewer, point); }, variables));
    CHECK(price_of(fewer, plan) <= price_of(products, plan));
    shorter += fewer.terms().size() < products.terms().size();
  }
  CHECK(shorter > 100);
}

TEST_CASE("multiplication takes as few products as Karatsuba's method") {
  // 3^2, 18 = 3 * 6, 3^3: Karatsuba, Ofman (1963), and three parts in six products (from memory).
  for (const auto& [n, count] : {std::pair(4u, 9u), std::pair(6u, 18u), std::pair(8u, 27u)}) {
    const Products products = multiplier_products(n);
    CHECK(products.terms().size() == n * n);
    ProductsPlan plan;
    plan.folds = 4 * n * n;
    Dice dice(1);
    const Products fewer = fewer_products(products, plan, dice);
    CHECK(fewer.cubic_count() <= count);
    CHECK(fewer.terms().size() == fewer.cubic_count());
    Random random(n);
    for (int trial = 0; trial < 300; ++trial) {
      const std::uint64_t point = random.bits() & ((std::uint64_t{1} << (3 * n)) - 1);
      CHECK(value(products, point) == value(fewer, point));
    }
  }
}

TEST_CASE("routes reach every stop and come home") {
  Random random(52);
  for (int trial = 0; trial < 200; ++trial) {
    const auto wires = static_cast<unsigned>(random.between(3, 9));
    FormTask task{wires, {}, {}};
    for (unsigned w = 0; w < wires; ++w) task.home.push_back(Form{1} << w);
    for (int k = random.between(0, 12); k > 0; --k) {
      const auto pair = random.distinct(2, static_cast<int>(wires));
      task.home[pair[0]] ^= task.home[pair[1]];
    }
    for (int k = random.between(0, 8); k > 0; --k) {
      Products independent;
      const Form all = (Form{1} << wires) - 1;
      const Form last = random.chance(0.2) ? unity : random.bits() & all;
      independent.add({{random.bits() & all, random.bits() & all, last}});
      for (const Product& product : independent.terms()) {
        task.stops.push_back({product.factor[0], product.factor[1], product.factor[2] & ~unity});
      }
    }
    Dice dice(static_cast<std::uint64_t>(trial));
    const auto greedy = find_form_route(task, {20, 0}, dice);
    Dice again(static_cast<std::uint64_t>(trial));
    const auto route = find_form_route(task, {20, 200}, again);
    REQUIRE(route.has_value());
    REQUIRE(greedy.has_value());
    CHECK(route->additions.size() <= greedy->additions.size());
    std::vector<Form> on_wire(wires);
    for (unsigned w = 0; w < wires; ++w) on_wire[w] = Form{1} << w;
    for (std::size_t k = 0; k <= route->additions.size(); ++k) {
      for (std::size_t s = 0; s < task.stops.size(); ++s) {
        if (route->reached[s] != k) continue;
        for (const Form form : task.stops[s]) {
          CHECK((form == 0 || std::find(on_wire.begin(), on_wire.end(), form) != on_wire.end()));
        }
      }
      if (k == route->additions.size()) break;
      const Addition step = route->additions[k];
      on_wire[step.to] ^= on_wire[step.from];
    }
    for (const std::size_t reached : route->reached) CHECK(reached <= route->additions.size());
    for (unsigned w = 0; w < wires; ++w) CHECK(on_wire[route->where[w]] == task.home[w]);
  }
}

TEST_CASE("networks keep their unitaries and get no dearer") {
  Random random(53);
  int rewritten = 0;
  for (int trial = 0; trial < 400; ++trial) {
    const auto wires = static_cast<std::uint32_t>(random.between(3, 7));
    const double strange = std::array{0.0, 0.05, 0.3}[random.below(3)];
    const Circuit source = random_network(random, wires, random.between(1, 40), strange);
    const Circuit result = cubic_networks(source, {});
    check_invariants(result);
    CAPTURE(listed(source));
    CAPTURE(listed(result));
    CHECK(support::distance(source, result) < 1e-9);
    CHECK(price(result) <= price(source) + 1e-9);
    rewritten += listed(source) != listed(result);
    CHECK(listed(cubic_networks(source, {})) == listed(result));
  }
  CHECK(rewritten > 100);
}

TEST_CASE("an arm of a branch keeps its wires, the body may change their names") {
  Random random(54);
  int swaps = 0;
  for (int trial = 0; trial < 100; ++trial) {
    Circuit source = random_network(random, 5, 30, 0);
    const Circuit renamed = rename_swaps(cubic_networks(source, {}), {});
    CHECK(support::distance(source, renamed) < 1e-9);
    for (const Operation& op : renamed.body()) CHECK(op.kind != Kind::swap);
    // The same gates in a block of their own: their swaps have to be worth three CNOTs each.
    Circuit nested = source;
    nested.blocks.push_back(nested.body());
    nested.body().clear();
    nested = cubic_networks(nested, {});
    Circuit arm = source;
    arm.body() = nested.blocks[1];
    CHECK(support::distance(source, arm) < 1e-9);
    const auto swaps_of_arm = static_cast<std::size_t>(std::count_if(
        arm.body().begin(), arm.body().end(), [](const Operation& op) { return op.kind == Kind::swap; }));
    swaps += swaps_of_arm > 0;
    CHECK(price(arm) + 3 * static_cast<double>(swaps_of_arm) * Cost().interaction(pi / 2) <=
          price(source) + 1e-9);
  }
  CHECK(swaps > 0);
}

TEST_CASE("no time leaves the circuit as it is") {
  PassContext late;
  late.deadline = std::chrono::steady_clock::now();
  const Circuit source = support::gf_multiplier(4);
  CHECK(listed(cubic_networks(source, late)) == listed(source));
  CHECK(listed(cubic_networks(source, {})) != listed(source));
}

TEST_CASE("multipliers, whose published counts are those of the textbook") {
  for (const auto& [n, most] : {std::pair(4u, 70u), std::pair(6u, 150u), std::pair(8u, 247u)}) {
    CAPTURE(n);
    const Circuit source = support::gf_multiplier(n);
    const std::size_t textbook = count_of(source, 2) + 6 * count_of(source, 3);
    const Circuit result = optimize(source, {});
    const std::size_t xx = tally_of(result).xx;
    CHECK(xx <= most);
    CHECK(static_cast<double>(xx) <= 0.75 * static_cast<double>(textbook));
    if (n > 6) continue;  // states of 2^24
    // c = a b on basis states, and on a superposition with the sign of each of its parts.
    const Circuit network = cubic_networks(source, {});
    Random random(n);
    for (const Circuit* circuit : {&network, &result}) {
      for (int trial = 0; trial < (n == 4 ? 20 : 2); ++trial) {
        support::State a(3 * n, random.bits() & ((std::uint64_t{1} << (3 * n)) - 1)), b = a;
        for (std::uint32_t w = 0; w < 3 * n; ++w) {
          const std::uint32_t wires[] = {w};
          const support::Matrix turn = support::rotation(0.3 * w, support::pauli_y());
          a.apply(turn, wires);
          b.apply(turn, wires);
        }
        for (const Operation& op : source.body()) support::apply(a, source, op);
        for (const Operation& op : circuit->body()) support::apply(b, *circuit, op);
        support::Complex overlap = 0;
        for (std::uint64_t k = 0; k < a.amplitudes.size(); ++k) {
          std::uint64_t moved = 0;  // where the circuit has left the wires of the source
          for (std::uint32_t q = 0; q < 3 * n; ++q) moved |= (k >> q & 1) << circuit->end_wire[q];
          overlap += std::conj(a.amplitudes[k]) * b.amplitudes[moved];
        }
        CHECK(std::abs(std::abs(overlap) - 1) < 1e-9);
      }
    }
  }
}
