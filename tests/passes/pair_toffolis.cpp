// Pairing of Toffolis: exact, and the counts of the reversible benchmark family.
#include "passes/pair_toffolis.h"

#include <doctest/doctest.h>

#include "passes/constructions.h"
#include "passes/lower.h"
#include "passes/merge_distant.h"
#include "support/families_arithmetic.h"
#include "support/random_circuits.h"
#include "support/simulator.h"

using namespace isinglass;

namespace {

/// Paired, constructed and lowered.
Circuit through(const Circuit& source, const PassContext& context = {}) {
  Circuit result = pair_toffolis(source, context);
  check_invariants(result);
  result = choose_constructions(std::move(result), context);
  check_invariants(result);
  result = lower(std::move(result), context);
  return merge_distant_rotations(std::move(result), context);
}

}  // namespace

TEST_CASE("the families compute what their papers say") {
  using support::run_classically;
  for (std::uint32_t n = 3; n <= 5; ++n) {
    for (std::uint64_t bits = 0; bits < (1u << (2 * n - 1)); ++bits) {
      const std::uint64_t controls = (1u << n) - 1;
      const std::uint64_t flip = (bits & controls) == controls ? 1u << (2 * n - 2) : 0;
      CHECK(run_classically(support::barenco_tof(n), bits) == (bits ^ flip));
      const std::uint64_t ancillas = ((1u << (n - 2)) - 1) << n;
      if ((bits & ancillas) == 0) CHECK(run_classically(support::tof(n), bits) == (bits ^ flip));
    }
  }
  const Circuit vbe = support::vbe_adder(3);
  const Circuit cuccaro = support::cuccaro_adder(6);
  for (std::uint64_t a = 0; a < 64; ++a) {
    for (std::uint64_t b = 0; b < 64; ++b) {
      if (a < 8 && b < 8) {
        const std::uint64_t sum = a + b;
        CHECK(run_classically(vbe, a | b << 3) == (a | (sum & 7) << 3 | (sum >> 3) << 9));
      }
      for (const std::uint64_t z : {0, 1}) {
        const std::uint64_t sum = (a + b) ^ (z << 6);
        CHECK(run_classically(cuccaro, a << 1 | b << 7 | z << 13) == (a << 1 | sum << 7));
      }
    }
  }
  for (std::uint32_t n = 4; n <= 8; ++n) {
    const Circuit multiplier = support::gf_multiplier(n);
    const std::uint32_t polynomial = support::field_polynomial(n);
    support::Random random(n);
    for (int trial = 0; trial < 300; ++trial) {
      const std::uint64_t a = random.bits() & ((1u << n) - 1);
      const std::uint64_t b = random.bits() & ((1u << n) - 1);
      std::uint64_t product = 0;
      for (std::uint32_t k = n; k-- > 0;) {
        product <<= 1;
        if (product >> n) product ^= polynomial;
        if ((a >> k) & 1) product ^= b;
      }
      CHECK(run_classically(multiplier, a | b << n) == (a | b << n | product << (2 * n)));
    }
    // irreducible: x^(2^n) = x, and not before for divisors (every a != 0 has an inverse; a^(2^n - 1) = 1)
    const auto times = [&](std::uint64_t a, std::uint64_t b) {
      return run_classically(multiplier, a | b << n) >> (2 * n);
    };
    for (std::uint64_t a = 1; a < (1u << n); a += 3) {
      std::uint64_t power = 1;
      for (std::uint32_t k = 0; k + 1 < (1u << n); ++k) power = times(power, a);
      CHECK(power == 1);
    }
  }
}

TEST_CASE("the families keep their unitaries") {
  for (const Circuit& source : {support::tof(3), support::tof(4), support::barenco_tof(3),
                                support::barenco_tof(4), support::barenco_tof(5), support::vbe_adder(2)}) {
    CHECK(support::distance(source, through(source)) < 1e-9);
    PassContext zero;
    zero.promise.zero_start = true;
    CHECK(support::distance_from_zero(source, through(source, zero)) < 1e-9);
  }
}

TEST_CASE("counts of the families from Toffolis") {
  const auto count = [](const Circuit& source) { return tally_of(through(source)).xx; };
  const std::uint32_t sizes[] = {3, 4, 5, 10};
  const std::size_t tof[] = {11, 17, 23, 53};  // "known better (computed)"
  const std::size_t barenco[] = {16, 26, 34, 74};
  for (int i = 0; i < 4; ++i) {
    CAPTURE(sizes[i]);
    CHECK(count(support::tof(sizes[i])) <= tof[i]);
    CHECK(count(support::barenco_tof(sizes[i])) <= barenco[i]);
    CHECK(count(support::barenco_tof(sizes[i])) == (sizes[i] == 3 ? 14 : 8 * sizes[i] - 10));  // reached here
  }
  CHECK(count(support::vbe_adder(3)) <= 44);
  CHECK(count(support::cuccaro_adder(6)) <= 62);
  for (const std::uint32_t n : {4u, 6u, 8u}) {
    const Circuit multiplier = support::gf_multiplier(n);
    const std::size_t toffolis = n * n;
    const std::size_t textbook = multiplier.body().size() + 5 * toffolis;
    CHECK(static_cast<double>(count(multiplier)) <= 0.845 * static_cast<double>(textbook));
  }
}

TEST_CASE("a target that is known to be 0 takes a Toffoli of three interactions") {
  PassContext zero;
  zero.promise.zero_start = true;
  Circuit source;
  add_register(source, "q", 3);
  source.body().push_back(source.make(Kind::h, {0}));
  source.body().push_back(source.make(Kind::h, {1}));
  source.body().push_back(source.make(Kind::x, {0, 1, 2}));
  CHECK(tally_of(through(source, zero)).xx == 3);
  CHECK(tally_of(through(source)).xx == 5);
  CHECK(support::distance_from_zero(source, through(source, zero)) < 1e-12);
  source.body().insert(source.body().end() - 1, source.make(Kind::h, {2}));
  CHECK(tally_of(through(source, zero)).xx == 5);
  source.body().insert(source.body().end() - 1, source.make(Kind::reset, {2}));
  CHECK(tally_of(through(source)).xx == 3);
}

TEST_CASE("random circuits of Toffolis and other gates keep their unitaries") {
  support::Random random(21);
  for (int trial = 0; trial < 300; ++trial) {
    const int qubits = random.between(3, 5);
    Circuit source =
        support::random_circuit(random, {qubits, random.between(4, 16), 2, support::Family::toffolis});
    const Circuit other = support::random_circuit(random, {qubits, 6, 2, support::Family::any});
    for (const Operation& op : other.body()) {  // other gates in between, here and there
      if (!random.chance(0.4)) continue;
      Operation copy = op;
      const auto operands = other.operands(op);
      source.set_operands(copy, operands);
      const auto at = random.below(static_cast<int>(source.body().size()) + 1);
      source.body().insert(source.body().begin() + at, copy);
    }
    if (trial % 3 == 0) {  // there and back again
      for (std::size_t i = source.body().size(); i-- > 0;) {
        const Operation op = source.body()[i];
        if (op.kind == Kind::x) source.body().push_back(op);
      }
    }
    PassContext context;
    context.promise.zero_start = trial % 2 == 0;
    const Circuit result = through(source, context);
    CAPTURE(listed(source));
    CHECK(support::distance_from_zero(source, result) < 1e-8);
    if (!context.promise.zero_start) CHECK(support::distance(source, result) < 1e-8);
    const Circuit plain = lower(choose_constructions(source, context), context);
    CHECK(tally_of(result).xx <= tally_of(plain).xx);
  }
}
