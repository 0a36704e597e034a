// Deadlines: what passes will take is foretold, and those that stop on the way keep the program.
#include <doctest/doctest.h>

#include <string>

#include "passes/expand_controls.h"
#include "passes/merge_distant.h"
#include "passes/optimize.h"
#include "passes/pace.h"
#include "passes/recover_toffolis.h"
#include "support/random_circuits.h"
#include "support/simulator.h"

using namespace isinglass;
using support::Family;
using support::Random;

namespace {

const Pass& named(std::string_view name) {
  for (const Pass& pass : all_passes()) {
    if (pass.name == name) return pass;
  }
  FAIL("no such pass");
  return all_passes().front();
}

PassContext too_late() {
  PassContext context;
  context.deadline = std::chrono::steady_clock::now() - std::chrono::seconds(1);
  return context;
}

}  // namespace

TEST_CASE("what a pass takes is foretold from the table, its own past, and how slow the machine is") {
  const Pass& slow = named("merge-distant");
  const Pass& other = named("trim-end");
  const double slow_row = 1e-6 * slow.us_a_gate, other_row = 1e-6 * other.us_a_gate;
  Pace pace;
  CHECK(pace.expected(slow, 1000) == doctest::Approx(1000 * slow_row));
  CHECK(pace.expected(slow, 0) == 0);
  pace.saw(slow, 100'000, 100'000 * slow_row / 10);  // faster than it says: the row stands
  CHECK(pace.expected(slow, 1000) == doctest::Approx(1000 * slow_row));
  pace.saw(slow, 100'000,
           100'000 * slow_row * 5);  // slower: its own past counts, and the others may be slow too
  CHECK(pace.expected(slow, 1000) == doctest::Approx(1000 * slow_row * 5));
  CHECK(pace.expected(other, 1000) > 1000 * other_row * 2);
  CHECK(pace.expected(other, 1000) < 1000 * other_row * 5);
  Pace few;
  few.saw(slow, 10, 10);  // a second a gate, but hardly any gates
  CHECK(few.expected(slow, 1000) == doctest::Approx(1000 * slow_row));
}

TEST_CASE("every pass has a row to be foretold from") {
  for (const Pass& pass : all_passes()) {
    CAPTURE(std::string(pass.name));
    CHECK(pass.us_a_gate > 0);
  }
}

TEST_CASE("passes that are stopped by the deadline keep the program") {
  Random random(17);
  for (const Family family : {Family::clifford_t, Family::pauli, Family::toffolis}) {
    for (int trial = 0; trial < 30; ++trial) {
      const Circuit source =
          support::random_circuit(random, {random.between(2, 5), random.between(1, 60), 2, family});
      CAPTURE(listed(source));
      CHECK(support::distance(source, recover_toffolis(source, too_late())) < 1e-9);
      const Circuit expanded = expand_controls(source, {});
      CHECK(support::distance(source, merge_distant_rotations(expanded, too_late())) < 1e-9);
      PassContext late = too_late();
      late.effort = trial % 2 == 0 ? Effort::deep : Effort::steady;
      CHECK(support::distance(source, optimize(source, late)) < 1e-9);
    }
  }
}
