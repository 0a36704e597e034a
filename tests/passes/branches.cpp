// Programs with branches, in each other too, with measurements, resets and early ends wherever they like:
// every pass of the table alone, and the whole, keep what they promise. All outcomes are followed
// (measured.h).
#include <doctest/doctest.h>

#include <algorithm>
#include <set>
#include <string>

#include "measured.h"
#include "passes/expand_controls.h"
#include "passes/lower.h"
#include "passes/optimize.h"
#include "support/random_circuits.h"

using namespace isinglass;
using support::Family;

namespace {

/// A program under construction.
class Writer {
 public:
  Writer(support::Random& random, int qubits, bool may_end) : random_(random), may_end_(may_end) {
    constexpr Family families[] = {Family::any,        Family::native,   Family::clifford,
                                   Family::clifford_t, Family::toffolis, Family::pauli};
    plan_.qubits = qubits;
    plan_.most_controls = random.below(4);
    plan_.family = families[random.below(6)];
    add_register(program_, "q", static_cast<std::uint32_t>(qubits));
    bits_ = add_bits(program_, "c", static_cast<std::uint32_t>(qubits));
  }

  Circuit written() {
    fill(0, 0);
    for (std::uint32_t q = 0; q < program_.wires; ++q) {
      if (random_.chance(0.7)) program_.body().push_back(measurement(q, q));
    }
    check_invariants(program_);
    return std::move(program_);
  }

 private:
  std::uint32_t any_wire() { return static_cast<std::uint32_t>(random_.below(plan_.qubits)); }

  Operation measurement(std::uint32_t wire, std::uint32_t bit) {
    Operation op = program_.make(Kind::measure, {wire});
    op.payload = bit;
    ++measured_;
    return op;
  }

  void add_gates(std::uint32_t block, int count) {
    plan_.gates = count;
    const Circuit gates = support::random_circuit(random_, plan_);
    for (Operation op : gates.body()) {
      program_.set_operands(op, gates.operands(op));
      program_.blocks[block].push_back(op);
    }
  }

  /// Fills a block with gates and what lies between them.
  void fill(std::uint32_t block, int depth) {
    const int most = depth == 0 ? 8 : 4;
    add_gates(block, random_.between(1, most));
    for (int part = random_.between(0, 2 - depth); part > 0 || (depth == 0 && branches_ == 0); --part) {
      if (measured_ < 3) program_.blocks[block].push_back(measurement(any_wire(), any_wire()));
      if (measured_ < 3 && random_.chance(0.2)) {
        program_.blocks[block].push_back(program_.make(Kind::reset, {any_wire()}));
        ++measured_;
      }
      if (random_.chance(0.1)) program_.blocks[block].push_back(program_.make(Kind::barrier, {any_wire()}));
      add_branch(block, depth);
      add_gates(block, random_.between(0, most));
    }
    if (depth > 0 && may_end_ && random_.chance(0.3)) {
      Operation op = program_.make(Kind::classical, {});
      op.payload = static_cast<std::uint32_t>(program_.statements.size());
      program_.statements.emplace_back();
      program_.statements.back().kind = ClassicalStatement::Kind::end_program;
      program_.blocks[block].push_back(op);
    }
  }

  void add_branch(std::uint32_t block, int depth) {
    ++branches_;
    Branch branch;
    Expression name;
    name.kind = Expression::Kind::variable;
    name.variable = bits_;
    Expression place;
    place.text = std::to_string(any_wire());
    branch.condition.kind = Expression::Kind::index;
    branch.condition.arguments = {name, place};
    std::set<std::uint32_t> touched;
    for (int arm = random_.between(1, 2); arm > 0; --arm) {
      const auto inner = static_cast<std::uint32_t>(program_.blocks.size());
      program_.blocks.emplace_back();
      fill(inner, depth + 1);
      for (const Operation& op : program_.blocks[inner]) {
        const auto operands = program_.operands(op);
        touched.insert(operands.begin(), operands.end());
      }
      branch.arms.push_back({{}, inner});
    }
    Operation op = program_.make(Kind::branch, std::vector<std::uint32_t>(touched.begin(), touched.end()));
    op.payload = static_cast<std::uint32_t>(program_.branches.size());
    program_.branches.push_back(branch);
    program_.blocks[block].push_back(op);
  }

  support::Random& random_;
  bool may_end_;
  support::RandomCircuit plan_;
  Circuit program_;
  std::uint32_t bits_ = 0;
  int measured_ = 0;
  int branches_ = 0;
};

/// Source qubits that no block measures or touches after measuring: those that the program leaves for later
/// use.
std::vector<std::uint32_t> never_measured(const Circuit& source) {
  std::vector<bool> is_measured(source.wires, false);
  for (const Block& block : source.blocks) {
    for (const Operation& op : block) {
      if (op.kind == Kind::measure) is_measured[op.operand[0]] = true;
    }
  }
  std::vector<std::uint32_t> kept;
  for (std::uint32_t q = 0; q < source.source_qubits; ++q) {
    if (!is_measured[q]) kept.push_back(q);
  }
  return kept;
}

void check_kept(support::Random& random, const Circuit& source, const Circuit& result,
                const PassContext& context) {
  check_invariants(result);
  support::State start(source.wires);
  for (std::uint32_t q = 0; q < source.source_qubits && !context.promise.zero_start; ++q) {
    start.apply(support::haar_unitary(random, 1), std::span(&q, 1));
  }
  const auto kept = context.promise.keep_bits_only ? std::vector<std::uint32_t>{} : never_measured(source);
  CHECK(support::distance(support::outcomes_of(source, start, kept),
                          support::outcomes_of(result, start, kept)) < 1e-9);
}

constexpr Promise promises[] = {{false, false}, {true, false}, {true, true}, {false, true}};

}  // namespace

TEST_CASE("branches: each pass keeps what programs with branches promise") {
  support::Random random(61);
  bool is_lowered = false;
  for (const Pass& pass : all_passes()) {
    const bool is_search = pass.name == "search-blocks";
    for (int trial = 0; trial < (is_search ? 24 : 160); ++trial) {
      PassContext context;
      context.promise = promises[trial % 4];
      context.spare_wires = trial % 3 == 0 ? 1 : 0;
      Circuit source = Writer(random, random.between(2, 4), trial % 8 > 4).written();
      // "lower" and what follows it in the table take gates on two wires; a few before it do, too.
      if (is_lowered || pass.name == "lower") source = expand_controls(std::move(source), context);
      if (is_lowered) source = lower(std::move(source), context);
      if (is_search) context.deadline = std::chrono::steady_clock::now() + std::chrono::milliseconds(15);
      const Circuit result = pass.run(source, context);
      CAPTURE(std::string(pass.name));
      CAPTURE(listed(source));
      CAPTURE(listed(result));
      check_kept(random, source, result, context);
    }
    is_lowered = is_lowered || pass.name == "lower";
  }
}

TEST_CASE("branches: the whole keeps what programs with branches promise") {
  support::Random random(62);
  for (int trial = 0; trial < 400; ++trial) {
    PassContext context;
    context.effort = trial % 5 == 0 ? Effort::quick : Effort::steady;
    context.promise = promises[trial % 4];
    const Circuit source = Writer(random, random.between(2, 4), trial % 8 > 4).written();
    const Circuit result = optimize(source, context);
    CAPTURE(listed(source));
    CAPTURE(listed(result));
    check_kept(random, source, result, context);
  }
}
