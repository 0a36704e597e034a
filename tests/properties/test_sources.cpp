// From the text of a source to the text of its compiled program: random texts over the whole standard gate
// library, modifiers, definitions and broadcasts included. Only the tests' own code decides what source and
// result mean.
#include <doctest/doctest.h>

#include "support/compile.h"
#include "support/interpreter.h"
#include "support/random_circuits.h"
#include "verify/equivalence.h"
#include "verify/native.h"

namespace isinglass {
namespace {

using support::Program;
using support::Random;
using support::Source;

/// Compiles `count` random texts and compares each with its meaning.
void check_sources(int count, Effort effort, std::uint64_t seed, bool read_back) {
  Random random(seed);
  for (int n = 0; n < count; ++n) {
    const int qubits = random.between(2, 6);
    const Source source = random_source(random, qubits, random.between(1, 10));
    PassContext context;
    context.effort = effort;
    const support::Compiled compiled = support::compile(source.text, context, random.chance(0.2) ? 1 : 0);
    const Program program(compiled.text);
    const support::Matrix wanted = unitary(source);
    const double d = support::distance(wanted, unitary(program, placement_of(program, Program(source.text))));
    if (d > 1e-8) {
      FAIL_CHECK("deviation " << d << ", seed " << seed << ", text " << n << "\n"
                              << source.text << "\n"
                              << compiled.text);
      return;
    }
    if (!read_back) continue;
    // The compiler's own check of the file that it wrote says the same.
    const Circuit back = on_source_wires(support::circuit_of(compiled.text), compiled.source);
    const Verdict verdict = compare(compiled.source, back, compiled.promise);
    if (verdict.answer != Answer::same) {
      FAIL_CHECK("read back: " << verdict.explanation << "\n" << source.text << "\n" << compiled.text);
      return;
    }
  }
}

TEST_CASE("sources: random texts, quick") {
  check_sources(1200, Effort::quick, 51, true);
}
TEST_CASE("sources: random texts, steady") {
  check_sources(800, Effort::steady, 52, true);
}

TEST_CASE("sources: the reader alone") {
  Random random(53);
  for (int n = 0; n < 300; ++n) {
    const Source source = random_source(random, random.between(1, 5), 8);
    const double d = support::distance(unitary(source), support::unitary(support::circuit_of(source.text)));
    if (d > 1e-9) {
      FAIL_CHECK("deviation " << d << ", text " << n << "\n" << source.text);
      return;
    }
  }
}

}  // namespace
}  // namespace isinglass
