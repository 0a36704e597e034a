// What the compiler does after movement: swaps and interactions of one pair become one stretch, on reachable
// pairs, with the same meaning.
#include <doctest/doctest.h>

#include "passes/lower.h"
#include "passes/two_qubit_stretches.h"
#include "support/random_circuits.h"
#include "support/simulator.h"
#include "targets/place.h"
#include "verify/native.h"

using namespace isinglass;

TEST_CASE("stretches after movement keep the meaning, the pairs and need no more interactions") {
  support::Random random(41);
  std::size_t before = 0;
  std::size_t after = 0;
  for (int round = 0; round < 25; ++round) {
    Target target = typical(4);
    for (const auto& [a, b] : {std::pair(0u, 2u), std::pair(0u, 3u), std::pair(1u, 3u)}) {
      target.pair(a, b).reachable = false;
    }
    const Circuit circuit = support::random_circuit(random, {4, 12, 0, support::Family::native});
    const Placed placed = place(circuit, target);
    const Circuit joined = lower(two_qubit_stretches(placed.circuit, {}), {});
    for (const Operation& op : joined.body()) {
      if (op.kind == Kind::xx) CHECK(target.pair(op.operand[0], op.operand[1]).reachable);
    }
    CHECK(support::distance(circuit, on_source_wires(joined, placed.start, circuit)) < 1e-9);
    before += tally_of(placed.circuit).xx;
    after += tally_of(joined).xx;
  }
  CHECK(after < before);
}
