// Prints the table of tests/families/README.md: what known families of circuits come down to, beside what is
// to be reached and where that figure is from. Every row is checked to be the same program before it is
// printed.
//
//   build/families [SECONDS]     seconds for each row of the coupled-cluster family (default 30)
#include <fmt/format.h>

#include <chrono>
#include <cmath>
#include <cstdlib>
#include <string>

#include "circuit/before.h"
#include "passes/clifford_table.h"
#include "passes/lower.h"
#include "passes/optimize.h"
#include "passes/two_qubit_stretches.h"
#include "support/families_arithmetic.h"
#include "support/families_chemistry.h"
#include "support/families_textbook.h"
#include "support/random_circuits.h"
#include "verify/equivalence.h"

using namespace isinglass;

namespace {

struct Row {
  std::string family;
  std::string to_reach;
  std::string source;
};

Circuit on(std::uint32_t qubits) {
  Circuit circuit;
  add_register(circuit, "q", qubits);
  return circuit;
}

void add(Circuit& circuit, Kind kind, std::initializer_list<std::uint32_t> operands,
         std::initializer_list<Angle> angles = {}) {
  circuit.body().push_back(circuit.make(kind, operands, angles));
}

Circuit single(Kind kind, std::initializer_list<std::uint32_t> operands,
               std::initializer_list<Angle> angles = {}) {
  Circuit circuit = on(static_cast<std::uint32_t>(operands.size()));
  add(circuit, kind, operands, angles);
  return circuit;
}

/// Layers of couplings as cx rz cx along the edges of a circulant 3-regular graph, and a turn of every qubit.
Circuit layered(std::uint32_t n, int layers) {
  Circuit circuit = on(n);
  for (int layer = 0; layer < layers; ++layer) {
    for (std::uint32_t q = 0; q < n; ++q) {
      for (const std::uint32_t step : {1u, n / 2}) {
        if (step == n / 2 && q >= n / 2) continue;
        const std::uint32_t other = (q + step) % n;
        add(circuit, Kind::x, {q, other});
        add(circuit, Kind::rz, {other}, {{0.3 + 0.1 * layer}});
        add(circuit, Kind::x, {q, other});
      }
    }
    for (std::uint32_t q = 0; q < n; ++q) add(circuit, Kind::r, {q}, {{0.7}, {0}});
  }
  return circuit;
}

void print_row(const Row& row, const std::string& before, const std::string& xx, const std::string& units,
               const std::string& check) {
  fmt::print("| {} | {} | {} | {} | {} | {} | {} |\n", row.family, before, row.to_reach, xx, units,
             row.source, check);
  std::fflush(stdout);
}

void report(const Row& row, const Circuit& circuit, double seconds = 0) {
  PassContext context;
  context.threads = 2;
  if (seconds > 0) {
    context.effort = Effort::deep;
    context.threads = 1;
    context.deadline =
        std::chrono::steady_clock::now() + std::chrono::duration_cast<std::chrono::steady_clock::duration>(
                                               std::chrono::duration<double>(seconds));
  }
  Steps steps;
  const Circuit result = optimize(circuit, context, nullptr, &steps);
  const Tally tally = tally_of(result);
  const std::size_t before = before_of(circuit).two_qubit;
  CheckOptions options;
  options.threads = 2;
  options.most_unitary_wires = 12;
  const Verdict verdict = compare_along(circuit, steps, result, {}, options);
  print_row(row, fmt::format("{}", before),
            fmt::format("{} ({:.2f} times fewer)", tally.xx,
                        tally.xx > 0 ? static_cast<double>(before) / static_cast<double>(tally.xx) : 0.0),
            fmt::format("{:.4f}", tally.xx_units),
            fmt::format("{} ({})", name(verdict.answer), verdict.method));
}

/// What many circuits of one kind come down to.
struct Mean {
  double xx = 0;
  double units = 0;
  double before = 0;
  double goal = 0;
  std::size_t most_xx = 0;
  double worst = 0;  // distance from the source
  int samples = 0;

  void include(const Circuit& circuit, const Circuit& result, double its_goal = 0) {
    const Tally tally = tally_of(result);
    xx += static_cast<double>(tally.xx);
    units += tally.xx_units;
    before += static_cast<double>(before_of(circuit).two_qubit);
    goal += its_goal;
    most_xx = std::max(most_xx, tally.xx);
    const Verdict verdict = compare(circuit, result, {});
    worst = std::max(worst, verdict.answer == Answer::same ? verdict.distance : 1.0);
    ++samples;
  }
  std::string of(double sum) const { return fmt::format("{:.4f}", sum / samples); }
  std::string checked() const { return worst < 1e-8 ? "same (unitary)" : "different"; }
};

/// Means of many random two-qubit unitaries.
void report_random_pairs() {
  support::Random random(21);
  Mean kept, renamed;
  for (int i = 0; i < 1000; ++i) {
    const Circuit circuit = support::random_pair(random);
    renamed.include(circuit, optimize(circuit, {}));
    kept.include(circuit, lower(two_qubit_stretches(lower(circuit, {}), {}), {}));
  }
  const std::string watts = "Watts, O'Connor, Vala, Entropy 2013 (from memory); computed";
  print_row({"random two-qubit unitaries, mean of 1,000", "3 xx, <= 1.51", "proven average 1.5000: " + watts},
            "3", fmt::format("{}", kept.most_xx), kept.of(kept.units), kept.checked());
  print_row({"the same, renaming allowed", "3 xx, <= 1.29", "proven average 1.2722: " + watts}, "3",
            fmt::format("{}", renamed.most_xx), renamed.of(renamed.units), renamed.checked());
}

/// Quarter turns of pairs that a Clifford circuit needs at least, the names of its wires at the end being
/// free.
int fewest_quarter_turns(const Circuit& clifford) {
  return clifford_distance(support::network_of_circuit(clifford)->rows, true);
}

void report_cliffords() {
  support::Random random(33);
  for (const int qubits : {2, 3, 4}) {
    Mean mean;
    for (int i = 0; i < 50; ++i) {
      const Circuit circuit = random_circuit(random, {qubits, 60, 0, support::Family::clifford});
      mean.include(circuit, optimize(circuit, {}), fewest_quarter_turns(circuit));
    }
    print_row({fmt::format("random Clifford circuits of 60 gates, {} qubits, mean of 50", qubits),
               fmt::format("{} xx: the fewest there are", mean.of(mean.goal)),
               "computed (breadth first over classes; held against the whole group up to 3)"},
              mean.of(mean.before), mean.of(mean.xx), mean.of(mean.units), mean.checked());
  }
  for (const int qubits : {6, 8}) {
    const Circuit circuit = random_circuit(random, {qubits, 200, 0, support::Family::clifford});
    std::string counts;
    Mean last;
    for (const Effort effort : {Effort::quick, Effort::steady, Effort::deep}) {
      PassContext context;
      context.effort = effort;
      context.threads = 2;
      if (effort == Effort::deep)
        context.deadline = std::chrono::steady_clock::now() + std::chrono::seconds(5);
      last = Mean();
      last.include(circuit, optimize(circuit, context));
      counts += fmt::format("{}{:.0f}", counts.empty() ? "" : ", ", last.xx);
    }
    print_row({fmt::format("a random Clifford circuit of 200 gates, {} qubits; quick, steady, deep", qubits),
               "never more with more effort", "computed"},
              last.of(last.before), counts, last.of(last.units), last.checked());
  }
}

/// A line of interactions of any angle between any one-qubit gates: each is on a pair of its own.
Circuit line_of_interactions(std::uint32_t qubits) {
  support::Random random(35);
  Circuit circuit = on(qubits);
  const auto turn = [&](std::uint32_t q) {
    add(circuit, Kind::r, {q}, {{random.real(0.1, 3)}, {random.real(-3, 3)}});
  };
  for (std::uint32_t q = 0; q + 1 < qubits; ++q) {
    turn(q);
    turn(q + 1);
    add(circuit, Kind::xx, {q, q + 1}, {{random.real(0.1, 1.5)}, {0}, {0}});
  }
  return circuit;
}

/// A Toffoli computes, something uses its result, a Toffoli takes it back; from any state of all wires.
Circuit toffoli_pair() {
  Circuit circuit = on(4);
  add(circuit, Kind::x, {0, 1, 2});
  add(circuit, Kind::z, {2, 3});
  add(circuit, Kind::x, {0, 1, 2});
  return circuit;
}

void report_small() {
  const std::string yu = "Yu, Duan, Ying, arXiv:1301.3372; units computed";
  report({"ccx", "5 xx, <= 3.05", yu}, single(Kind::x, {0, 1, 2}));
  report({"cswap", "6 xx", "computed"}, single(Kind::swap, {0, 1, 2}));
  report({"doubly controlled rotation by 1.1", "4 xx and the closed form", "computed"},
         single(Kind::r, {0, 1, 2}, {{1.1}, {0}}));
  report({"doubly controlled phase of 1.1", "5 xx and the closed form", "computed"},
         single(Kind::p, {0, 1, 2}, {{1.1}}));
  report({"controlled rzz", "3 xx", "computed"}, single(Kind::zz, {0, 1, 2}, {{0.8}}));
  report({"triply controlled Z", "13 xx, 6.1475", "computed"}, single(Kind::z, {0, 1, 2, 3}));
  for (const std::uint32_t n : {4u, 8u, 16u, 32u}) {
    report({fmt::format("QFT {}", n),
            fmt::format("{} xx, {:.4f}", n * (n - 1) / 2, n - 2 + std::pow(2.0, 1.0 - n)), "computed"},
           support::fourier(n));
  }
  report(
      {"two Toffolis around what uses their target", "3 + 1 + 3 xx", "Song, Klappenecker, quant-ph/0312225"},
      toffoli_pair());
  report({"already optimal: a line of 11 interactions", "unchanged", "computed"}, line_of_interactions(12));
  report({"Ising model on a 3-regular graph of 10, 4 steps", "60 xx", "computed"}, layered(10, 4));
  report({"the same of 20, 2 layers", "60 xx", "computed"}, layered(20, 2));
  Circuit cut = layered(16, 3);
  for (std::uint32_t q = 0; q < 16; ++q) cut.body().insert(cut.body().begin(), cut.make(Kind::h, {q}));
  report({"QAOA for the largest cut of a 3-regular graph of 16, 3 layers", "72 xx", "computed"}, cut);
}

void report_reversible() {
  const std::string nam = "Nam et al., npj Quantum Information 4, 23 (2018) (from memory); goal computed";
  struct Goal {
    std::uint32_t n;
    int from_ccx;
    int from_t;
    int barenco;
    int published;
    int published_barenco;
  };
  for (const Goal& goal : {Goal{3, 11, 14, 16, 14, 18}, Goal{4, 17, 22, 26, 22, 34},
                           Goal{5, 23, 30, 34, 30, 50}, Goal{10, 53, 70, 74, 70, 130}}) {
    const Circuit tof = support::tof(goal.n);
    report({fmt::format("Tof_{} from ccx", goal.n),
            fmt::format("{} xx (published {})", goal.from_ccx, goal.published), nam},
           tof);
    report({fmt::format("Tof_{} from Clifford and T", goal.n), fmt::format("<= {} xx", goal.from_t), nam},
           support::expanded_clifford_t(tof));
    report({fmt::format("Barenco_Tof_{}", goal.n),
            fmt::format("<= {} xx (published {})", goal.barenco, goal.published_barenco), nam},
           support::barenco_tof(goal.n));
  }
  report({"VBE_Adder_3", "<= 44 xx (published 50)", nam}, support::vbe_adder(3));
  report({"RC_Adder_6", "<= 62 xx (published 71)", nam}, support::cuccaro_adder(6));
  for (const std::uint32_t n : {4u, 6u, 8u}) {
    const Circuit circuit = support::gf_multiplier(n);
    const double textbook = static_cast<double>(before_of(circuit).two_qubit);
    report({fmt::format("GF(2^{}) multiplier", n), fmt::format("<= {:.0f} xx", std::floor(0.845 * textbook)),
            nam},
           circuit);
  }
}

void report_chemistry(double seconds) {
  struct Goal {
    unsigned qubits;
    unsigned electrons;
    double ratio;
  };
  for (const Goal& goal :
       {Goal{4, 2, 4.9}, Goal{6, 2, 6}, Goal{8, 4, 7.2}, Goal{10, 4, 7.7}, Goal{12, 6, 8}, Goal{14, 4, 9}}) {
    report({fmt::format("coupled cluster, {} qubits, {} electrons", goal.qubits, goal.electrons),
            fmt::format("{} times fewer", goal.ratio), "computed; common practice is four to five"},
           support::unitary_coupled_cluster(goal.qubits, goal.electrons, false, 1), seconds);
  }
}

}  // namespace

int main(int argc, char** argv) {
  const double seconds = argc > 1 ? std::atof(argv[1]) : 30;
  fmt::print("| family | textbook CNOT | to reach | xx | units | source of the goal | checked |\n");
  fmt::print("|---|---|---|---|---|---|---|\n");
  report_random_pairs();
  report_small();
  report_cliffords();
  report_reversible();
  report_chemistry(seconds);
}
