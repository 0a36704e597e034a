// Durations by the figures of a machine, and stretches that give boxes their lengths.
#include <doctest/doctest.h>
#include <fmt/format.h>

#include <map>

#include "language/meaning.h"
#include "support/random_circuits.h"

using namespace isinglass;
using meaning::circuit_of;

namespace {

const std::string heading = "OPENQASM 3.1;\ninclude \"stdgates.inc\";\nqubit[4] q;\n";

/// Microseconds of all delays, in order.
std::vector<double> delays(const std::string& body, const ReadOptions& options = {}) {
  const Reading reading = read("t.qasm", heading + body, options);
  for (const Message& message : reading.messages) INFO(printed(message));
  REQUIRE(reading.ok());
  CHECK_NOTHROW(check_invariants(*reading.circuit));
  std::vector<double> lengths;
  for (const Block& block : reading.circuit->blocks) {
    for (const Operation& op : block) {
      if (op.kind == Kind::delay) lengths.push_back(op.value[0]);
      if (op.kind == Kind::barrier) CHECK(op.payload == 0);
    }
  }
  return lengths;
}

void check_delays(const std::string& body, const std::vector<double>& wanted) {
  INFO(body);
  const auto lengths = delays(body);
  REQUIRE(lengths.size() == wanted.size());
  for (std::size_t i = 0; i < wanted.size(); ++i) CHECK(lengths[i] == doctest::Approx(wanted[i]));
}

/// The only error.
std::string error(const std::string& body) {
  INFO(body);
  const Reading reading = read("t.qasm", heading + body);
  CHECK_FALSE(reading.ok());
  std::vector<std::string> errors;
  for (const Message& message : reading.messages) {
    if (message.severity == Message::Severity::error) errors.push_back(message.text);
  }
  REQUIRE(errors.size() == 1);
  return errors[0];
}

}  // namespace

TEST_CASE("durationof: pulses, frames, interactions, by the figures that are given") {
  check_delays("delay[durationof({ x q[0]; })] q[1];", {5});
  check_delays("delay[durationof({ x q[0]; y q[0]; h q[1]; })] q[1];", {10});
  check_delays("delay[durationof({ z q[0]; rz(1) q[0]; s q[0]; t q[0]; gphase(1); })] q[1];", {0});
  check_delays("delay[durationof({ cx q[0], q[1]; })] q[1];", {210});
  check_delays("delay[durationof({ cx q[0], q[1]; cx q[2], q[3]; cz q[1], q[2]; })] q[1];", {420});
  check_delays("delay[durationof({ swap q[0], q[1]; ccx q[0], q[1], q[2]; })] q[1];", {9 * 210});
  check_delays("delay[durationof({ reset q[0]; delay[3us] q[0]; })] q[1];", {23});
  check_delays(
      "gate xx(theta, phi_a, phi_b) a, b { rz(-phi_a) a; rz(-phi_b) b; h a; h b; cx a, b; rz(theta) b; cx a, "
      "b; "
      "h a; h b; rz(phi_a) a; rz(phi_b) b; }\n"
      "delay[durationof({ xx(0.3, 0, 0) q[0], q[1]; })] q[1];",
      {200});
  check_delays("delay[100dt] q[1];", {0.1});
  int asked = 0;
  ReadOptions options;
  options.times = [&] {
    ++asked;
    return GateTimes{1'000, 300'000, 7'000, 2'000};
  };
  CHECK(delays("delay[durationof({ x q[0]; cx q[0], q[1]; reset q[0]; })] q; delay[durationof({x q;})] q;",
               options) == std::vector<double>{1 + 302 + 2, 1});
  CHECK(asked == 1);
  CHECK(delays("delay[3us] q; x q; box { x q; }", options) == std::vector<double>{3});
  CHECK(asked == 1);  // nobody asked
  options.times = []() -> GateTimes { throw Failure(Exit::file_trouble, "no machine"); };
  CHECK_THROWS_AS(read("t.qasm", heading + "delay[durationof({ x q; })] q;", options), Failure);
}

TEST_CASE("durationof: what has no fixed duration is refused") {
  CHECK(error("bit b; delay[durationof({ b = measure q[0]; })] q;").starts_with("durationof needs"));
  CHECK(error("stretch s; delay[durationof({ delay[s] q[0]; })] q;").starts_with("durationof needs"));
  CHECK(error("gate g a { x a; } duration d = durationof({ g q[0], q[1]; });").starts_with("`g` takes"));
}

TEST_CASE("stretches fill a box of given length") {
  check_delays("stretch a; box[100us] { delay[a] q[0]; x q[0]; }", {95});
  check_delays("stretch a; box[100us] { delay[a] q[0]; x q[0]; delay[a] q[0]; }", {47.5, 47.5});
  check_delays("stretch a; stretch b; box[100us] { delay[a] q[0]; x q[0]; delay[b] q[0]; }", {47.5, 47.5});
  check_delays("stretch a; box[100us] { delay[a] q[0]; x q[0]; delay[3 * a + 15us] q[0]; }", {20, 75});
  check_delays("stretch a; box[100us] { delay[a / 2] q[0]; delay[147.5us - a] q[0]; x q[1]; delay[a] q[1]; }",
               {47.5, 52.5, 95});
}

TEST_CASE("a box of given length without stretches is waited for") {
  check_delays("box[100us] { x q[0]; x q[0]; h q[1]; }", {90});
  check_delays("box[300us] { cx q[0], q[1]; x q[0]; delay[95us] q[2]; }", {95, 85});
  check_delays("box[10us] { x q[0]; delay[5us] q[0]; }", {5});
  check_delays("box { x q[0]; }", {});
  check_delays("box[100us] { box[50us] { x q[0]; } x q[0]; }", {45, 45});
  check_delays("bit b; box[400us] { b = measure q[0]; if (b) x q[1]; }",
               {});  // how long it takes is not known
}

TEST_CASE("stretches: lower bounds, and the min-max among what fits") {
  check_delays("stretch a = 80us; stretch b; box[100us] { delay[a] q[0]; delay[b] q[0]; }", {80, 20});
  check_delays("stretch a = 10us; stretch b; box[100us] { delay[a] q[0]; delay[b] q[0]; }", {50, 50});
  // c is bound by its wire; then a and b share theirs.
  check_delays(
      "stretch a; stretch b; stretch c; box[100us] { delay[c] q[0]; delay[60us] q[0]; delay[a] q[1]; "
      "delay[b] q[1]; delay[c] q[1]; }",
      {40, 60, 30, 30, 40});
  check_delays("stretch a = 7us; delay[a] q; delay[2 * a] q;", {7, 14});  // nothing holds it
}

TEST_CASE("stretches align work on parallel qubits") {
  // Right-aligned, centred, left-aligned beside a cx of 210 us.
  check_delays(
      "stretch a; stretch b; stretch c; box { cx q[0], q[1]; delay[a] q[2]; x q[2]; delay[b] q[3]; x q[3]; "
      "delay[b] q[3]; }",
      {205, 102.5, 102.5});
  // Between barriers as the standard's own example has it, and where no box is.
  check_delays("stretch g; barrier q; cx q[0], q[1]; delay[g] q[2]; x q[2]; delay[g] q[2]; barrier q;",
               {102.5, 102.5});
  check_delays("stretch g; cx q[0], q[1]; delay[g] q[2]; x q[2]; barrier q;", {0});  // no barrier before it
  check_delays("stretch g; barrier q[0:2]; cx q[0], q[3]; delay[g] q[2]; x q[2]; barrier q[0:2];",
               {0});  // not closed
  check_delays("stretch g; barrier q[0:2]; cx q[0], q[1]; x q[3]; delay[g] q[2]; barrier q[0:2];", {210});
  // A delay on two qubits waits for both.
  check_delays("stretch a; box[500us] { x q[0]; cx q[0], q[1]; delay[a] q[1], q[2]; x q[2]; }",
               {500 - 5 - 210 - 5});
  // One qubit waits for its partner without a delay of its own.
  check_delays("stretch s; box[500us] { delay[100us] q[0]; cx q[0], q[1]; delay[s] q[1]; }", {100, 190});
}

TEST_CASE("stretches: one length in all boxes that use it, and in nested ones") {
  check_delays(
      "stretch a; stretch b; box[10us] { delay[a] q[0]; delay[b] q[0]; } box[3us] { delay[a] q[1]; }",
      {3, 7, 3});
  check_delays("stretch a; for int i in [0:3] { box[20us] { delay[a] q[i]; x q[i]; delay[a] q[i]; } }",
               {7.5, 7.5, 7.5, 7.5, 7.5, 7.5, 7.5, 7.5});
  check_delays("for int i in [1:3] { stretch a; box[i * 10us] { delay[a] q[0]; x q[0]; } }", {5, 15, 25});
  check_delays("stretch a; stretch b; box[100us] { delay[a] q[0]; box[30us] { x q[0]; delay[b] q[0]; } }",
               {70, 25});
  check_delays("stretch a; def f(qubit p) { stretch b; box[9us] { delay[b] p; x p; } } f(q[0]); f(q[1]);",
               {4, 4});
  check_delays("stretch s; duration d = 2 * s + 10us; box[60us] { delay[d] q[0]; delay[s] q[0]; }",
               {2 * 50.0 / 3 + 10, 50.0 / 3});
}

TEST_CASE("stretches that cannot be solved are refused where they stand") {
  CHECK(error("stretch a; box[10us] { delay[a] q[0]; delay[20us] q[0]; }") ==
        "what is in the box takes about 20 us, longer than its length of 10 us");
  CHECK(error("stretch a; box[10us] { delay[a] q[0]; delay[a] q[1]; x q[1]; }") ==
        "no lengths of its stretches give this box its length");
  CHECK(error("stretch a; box[10us] { delay[a] q[0]; } box[20us] { delay[a] q[0]; }") ==
        "no lengths of the stretches fit this box and the others that use the same stretches");
  CHECK(error("stretch a; delay[a - 1us] q;") == "a delay cannot be negative");
  CHECK(error("stretch a; bit b; box[9us] { b = measure q[0]; if (b) x q[0]; delay[a] q[0]; }")
            .starts_with("the stretches of a box with branches"));
  CHECK(error("stretch a; if (a > 3us) x q;").starts_with("the length of a stretch is found when"));
  CHECK(error("stretch a; rx(a / 1us) q;").starts_with("the length of a stretch is found when"));
  CHECK(error("stretch a; rx(a) q;") == "an angle is expected here, not stretch");
  CHECK(error("stretch a; input float t; delay[a * t] q;") == "a duration must be known while compiling");
  CHECK(error("stretch a; a = 3us;") == "a stretch is found by the compiler, not assigned");
  CHECK(error("stretch a = -3us;") == "a stretch cannot be negative");
  CHECK(error("stretch a; const duration d = 2 * a;") == "the value of a constant must be a constant");
  CHECK(error("stretch a; extern f(duration) -> bit; bit b = f(a);") ==
        "the length of a stretch can be used in delays only");
  // Too large a system says so.
  std::string text = "box[1ms] {";
  for (int i = 0; i < 70; ++i) text += fmt::format("stretch s{0}; delay[s{0}] q[0];", i);
  CHECK(error(text + "}").starts_with("70 stretches and what stands between them"));
}

TEST_CASE("stretches: random boxes are filled exactly") {
  support::Random random(41);
  int filled = 0;
  for (int round = 0; round < 400; ++round) {
    std::string text = "box[5000us] {\n";
    for (int s = 0; s < 3; ++s) text += fmt::format("stretch s{} = {}us;\n", s, random.below(3));
    const int lines = random.between(1, 14);
    for (int i = 0; i < lines; ++i) {
      const auto pair = random.distinct(2, 4);
      switch (random.below(4)) {
        case 0:
          text += fmt::format("x q[{}];\n", pair[0]);
          break;
        case 1:
          text += fmt::format("cx q[{}], q[{}];\n", pair[0], pair[1]);
          break;
        default:
          text += fmt::format("delay[{}us + {} * s{}] q[{}];\n", random.below(20), random.between(1, 3),
                              random.below(3), pair[0]);
      }
    }
    const Reading reading = read("t.qasm", heading + text + "}");
    if (!reading.ok()) continue;  // asks for what cannot be
    ++filled;
    // Each wire that can stretch after its last shared gate must end with the box, when all start as late as
    // that demands: seen from the end, a wire's last pieces take what is left.
    const Circuit& circuit = *reading.circuit;
    std::map<std::uint32_t, double> tail;
    double longest = 0;
    for (std::size_t i = circuit.body().size(); i-- > 0;) {
      const Operation& op = circuit.body()[i];
      if (op.kind == Kind::barrier) continue;
      const auto operands = circuit.operands(op);
      double after = 0;
      for (const auto wire : operands) after = std::max(after, tail[wire]);
      const double takes = op.kind == Kind::delay ? op.value[0] : operands.size() == 1 ? 5 : 210;
      CHECK(takes >= 0);
      for (const auto wire : operands) tail[wire] = after + takes;
      longest = std::max(longest, after + takes);
    }
    bool any = false;
    for (const Operation& op : circuit.body()) any = any || op.kind == Kind::delay;
    CHECK(longest <= 5000 + 1e-6);
    if (any) CHECK(longest == doctest::Approx(5000));
  }
  CHECK(filled > 100);
}
