// Placement pragmas: the program is the same exactly when they say the truth.
#include "verify/native.h"

#include <doctest/doctest.h>

#include <functional>

#include "circuit/message.h"
#include "support/simulator.h"
#include "verify/equivalence.h"

namespace isinglass {
namespace {

/// a = q[0], b = q[1]; a rotation of a, an interaction, then both exchanged.
Circuit source() {
  Circuit circuit;
  add_register(circuit, "q", 2);
  add_register(circuit, "lone", 1, true);
  circuit.body().push_back(circuit.make(Kind::r, {0}, {{0.4}, {0.1}}));
  circuit.body().push_back(circuit.make(Kind::xx, {0, 1}, {{0.3}, {0}, {0.2}}));
  circuit.body().push_back(circuit.make(Kind::r, {2}, {{0.7}, {0.5}}));
  circuit.body().push_back(circuit.make(Kind::swap, {0, 1}));
  return circuit;
}

Circuit native() {
  Circuit circuit;
  add_register(circuit, "ion", 5);
  circuit.body().push_back(circuit.make(Kind::r, {3}, {{0.4}, {0.1}}));
  circuit.body().push_back(circuit.make(Kind::xx, {3, 1}, {{0.3}, {0}, {0.2}}));
  circuit.body().push_back(circuit.make(Kind::r, {4}, {{0.7}, {0.5}}));
  circuit.pragmas = {"pragma isinglass start q[0] ion[3]", "pragma isinglass start q[1] ion[1]",
                     "pragma isinglass start lone ion[4]", "pragma isinglass end q[0] ion[1]",
                     "pragma isinglass end q[1] ion[3]",   "pragma isinglass end lone ion[4]"};
  return circuit;
}

Answer answer(const Circuit& circuit) {
  return compare(source(), on_source_wires(circuit, source()), {}).answer;
}

TEST_CASE("native: placement that tells the truth is the same program, swapped placement is not") {
  const Circuit good = native();
  const Circuit back = on_source_wires(good, source());
  check_invariants(back);
  CHECK(support::distance(source(), back) < 1e-12);
  CHECK(answer(good) == Answer::same);

  Circuit swapped = native();
  swapped.pragmas[3] = "pragma isinglass end q[0] ion[3]";
  swapped.pragmas[4] = "pragma isinglass end q[1] ion[1]";
  CHECK(answer(swapped) == Answer::different);

  Circuit elsewhere = native();
  elsewhere.pragmas[0] = "pragma isinglass start q[0] ion[0]";
  CHECK(answer(elsewhere) == Answer::different);

  const std::uint32_t start[] = {3, 1, 4};
  Circuit placed = native();
  placed.end_wire = {1, 3, 4};
  CHECK(compare(source(), on_source_wires(placed, start, source()), {}).answer == Answer::same);
}

TEST_CASE("native: pragmas that are missing, unknown or contradictory are errors by name") {
  const auto message = [](const std::function<void(Circuit&)>& spoil) -> std::string {
    Circuit circuit = native();
    spoil(circuit);
    try {
      on_source_wires(circuit, source());
    } catch (const Failure& failure) {
      CHECK(failure.exit == Exit::source_at_fault);
      return failure.what();
    }
    return "";
  };
  const auto has = [](const std::string& text, const std::string& part) {
    return text.find(part) != std::string::npos;
  };
  CHECK(has(message([](Circuit& c) { c.pragmas.pop_back(); }), "where lone ends"));
  CHECK(
      has(message([](Circuit& c) { c.pragmas[0] = "pragma isinglass start q[7] ion[3]"; }), "no qubit q[7]"));
  CHECK(
      has(message([](Circuit& c) { c.pragmas[0] = "pragma isinglass start q[0] ion[9]"; }), "no ion ion[9]"));
  CHECK(has(message([](Circuit& c) { c.pragmas[0] = "pragma isinglass start q[0] ion[1]"; }), "taken"));
  CHECK(has(message([](Circuit& c) { c.pragmas[1] = "pragma isinglass start q[0] ion[1]"; }), "already"));
  CHECK(has(message([](Circuit& c) { c.pragmas.push_back("pragma isinglass colour red"); }), "colour"));
  CHECK(has(message([](Circuit& c) { c.pragmas.clear(); }), "no pragma says which is which"));
  CHECK(message([](Circuit& c) { c.pragmas.push_back("pragma other tool"); }).empty());
}

TEST_CASE("native: renamed variables and inputs are known by their source names") {
  Circuit original;
  add_register(original, "q", 1);
  add_bits(original, "r", 1);
  Operation measure = original.make(Kind::measure, {0});
  original.body().push_back(original.make(Kind::h, {0}));
  original.body().push_back(measure);

  Circuit compiled = original;
  compiled.registers[0].name = "ion";
  compiled.variables[0].name = compiled.variables[0].source = "r_";
  compiled.pragmas = {"pragma isinglass start q[0] ion[0]", "pragma isinglass end q[0] ion[0]"};
  CHECK(compare(original, on_source_wires(compiled, original), {true, false}).answer == Answer::different);
  compiled.pragmas.push_back("pragma isinglass name r r_");
  CHECK(compare(original, on_source_wires(compiled, original), {true, false}).answer == Answer::same);
}

}  // namespace
}  // namespace isinglass
