// Programs whose course depends on measured bits: source and compiled text are run branch by branch by the
// tests' own interpreter, and their bits and states are compared.
#include <doctest/doctest.h>

#include "language/bind.h"
#include "output/native.h"
#include "support/compile.h"
#include "support/interpreter.h"
#include "support/random_circuits.h"
#include "verify/equivalence.h"
#include "verify/native.h"

namespace isinglass {
namespace {

using support::RunOptions;

const std::string head = "OPENQASM 3.1;\ninclude \"stdgates.inc\";\n";

/// Compiles with several efforts and promises; every result must be the source, by the tests and by the
/// compiler.
void check(const std::string& body) {
  const std::string source = head + body;
  for (const Effort effort : {Effort::quick, Effort::steady}) {
    PassContext context;
    context.effort = effort;
    const auto compiled = support::compile(source, context);
    CHECK_MESSAGE(support::difference(source, compiled.text) < 1e-8, compiled.text);
    const Circuit back = on_source_wires(support::circuit_of(compiled.text), compiled.source);
    const Verdict verdict = compare(compiled.source, back, compiled.promise);
    CHECK_MESSAGE(verdict.answer == Answer::same, verdict.explanation);
    context.promise.keep_bits_only = true;
    const auto bits = support::compile(source, context);
    CHECK_MESSAGE(support::difference(source, bits.text, {}, true) < 1e-8, bits.text);
  }
}

TEST_CASE("feed-forward: teleportation") {
  check(
      "qubit[3] q; bit[2] c;\n"
      "u3(0.3, 0.4, 0.5) q[0]; h q[1]; cx q[1], q[2]; cx q[0], q[1]; h q[0];\n"
      "c[0] = measure q[0]; c[1] = measure q[1];\n"
      "if (c[1]) { x q[2]; } if (c[0] == 1) z q[2];\n");
}

TEST_CASE("feed-forward: teleportation of a qubit that is verified afterwards") {
  check(
      "qubit[3] q; bit[2] c; bit ok;\n"
      "ry(0.9) q[0]; rz(0.2) q[0]; h q[1]; cx q[1], q[2]; cx q[0], q[1]; h q[0];\n"
      "c = measure q[0:1];\n"
      "switch (uint[2](c)) { case 1 { z q[2]; } case 2 { x q[2]; } case 3 { x q[2]; z q[2]; } default { } }\n"
      "rz(-0.2) q[2]; ry(-0.9) q[2]; ok = measure q[2];\n");
}

TEST_CASE("feed-forward: iterative phase estimation") {
  check(
      "qubit a; qubit b; bit[3] c;\n"
      "x b;\n"
      "h a; pow(4) @ cp(2*pi*0.3) a, b; h a; c[0] = measure a; reset a;\n"
      "h a; pow(2) @ cp(2*pi*0.3) a, b; if (c[0]) { p(-pi/2) a; } h a; c[1] = measure a; reset a;\n"
      "h a; cp(2*pi*0.3) a, b; if (c[0]) p(-pi/4) a; if (c[1]) { p(-pi/2) a; } h a; c[2] = measure a;\n");
}

TEST_CASE("feed-forward: repeat until success") {
  check(
      "qubit[2] q; bit c; uint[4] tries = 0;\n"
      "ry(0.4) q[1];\n"
      "while (!c && tries < 6) { reset q[0]; h q[0]; t q[0]; cx q[0], q[1]; h q[0]; tdg q[1]; cx q[0], "
      "q[1];\n"
      "  c = measure q[0]; tries += 1; if (!c) { z q[1]; } }\n"
      "sx q[1];\n");
}

TEST_CASE("feed-forward: a syndrome round with correction") {
  check(
      "qubit[3] d; qubit[2] s; bit[2] m; bit[3] out;\n"
      "ry(0.8) d[0]; cx d[0], d[1]; cx d[0], d[2];\n"
      "rx(0.5) d[1];\n"
      "cx d[0], s[0]; cx d[1], s[0]; cx d[1], s[1]; cx d[2], s[1];\n"
      "m[0] = measure s[0]; m[1] = measure s[1]; reset s;\n"
      "if (m[0] && !m[1]) { x d[0]; } else { if (m[0] && m[1]) x d[1]; else if (m[1]) { x d[2]; } }\n"
      "cx d[0], d[2]; cx d[0], d[1]; rz(0.3) d[0]; out = measure d;\n");
}

TEST_CASE("feed-forward: entanglement swapping over a chain") {
  check(
      "qubit[6] q; bit[4] c;\n"
      "h q[0]; cx q[0], q[1]; h q[2]; cx q[2], q[3]; h q[4]; cx q[4], q[5];\n"
      "cx q[1], q[2]; h q[1]; c[0] = measure q[1]; c[1] = measure q[2];\n"
      "if (c[1]) x q[3]; if (c[0]) z q[3];\n"
      "cx q[3], q[4]; h q[3]; c[2] = measure q[3]; c[3] = measure q[4];\n"
      "if (c[3]) x q[5]; if (c[2]) z q[5];\n");
}

TEST_CASE("feed-forward: loops over measured values, early ends, classical maps of bits") {
  check(
      "qubit[2] q; bit[2] c; int[8] n = 0;\n"
      "h q; c = measure q;\n"
      "for bit b in c { if (b) { n += 1; ry(0.3) q[0]; } }\n"
      "if (n == 2) { rx(0.7) q[1]; } else { s q[1]; h q[1]; }\n");
  check(
      "qubit[2] q; bit[2] c;\nh q[0]; c[0] = measure q[0]; if (c[0]) { end; } h q[1]; cx q[1], q[0]; c[1] = "
      "measure q[1];\n");
  check(
      "qubit[3] q; bit[3] c; bit p;\nh q[0]; cx q[0], q[1]; ry(0.4) q[2]; cx q[1], q[2]; c = measure q; p = "
      "c[0] ^ c[1];\n");
}

TEST_CASE("feed-forward: measured qubits used again") {
  check(
      "qubit[2] q; bit[3] c;\nry(1.1) q[0]; c[0] = measure q[0]; cx q[0], q[1]; ry(0.4) q[0]; c[1] = measure "
      "q[0];"
      "cry(0.7) q[0], q[1]; c[2] = measure q[1]; rz(0.3) q[1]; h q[1];\n");
  check(
      "qubit[2] q; bit c;\nh q[0]; cx q[0], q[1]; reset q[0]; rx(0.3) q[0]; cx q[0], q[1]; c = measure q[0]; "
      "ry(0.2) q[1];\n");
}

TEST_CASE("feed-forward: rotations by sums over running bits") {
  const std::string start =
      "qubit[3] q; bit[3] c; h q; ry(0.4) q[1]; rz(0.3) q[2]; c = measure q; ry(0.9) q; h q[0];\n";
  const auto with = [&](const std::string& body) { check(start + body); };
  with("uint[3] k = uint[3](c); rz(k * pi / 8) q[0]; h q[0];");
  with("uint[3] k = uint[3](c); rx(float(k) * 0.3 - 0.7) q[0]; cry(2 * k * pi / 8) q[0], q[1];");
  with("int[3] k = int[3](c); rx(k * 0.37) q[0]; ctrl @ rz(k / 2.0) q[0], q[1]; h q[0];");
  with("angle[3] a = angle[3](c); rz(a) q[0]; rx(a) q[1]; ctrl @ rx(a) q[1], q[2]; p(3 * a) q[0]; h q;");
  with("angle[3] a = angle[3](c); cp(-a) q[0], q[1]; p(a + a) q[1]; h q;");
  with("cp(angle[3](c)) q[0], q[1]; crx(c[0] * 0.4 + c[2] * 1.1) q[1], q[2]; h q;");
  with(
      "uint[3] k = uint[3](c); negctrl @ inv @ ry(k * 0.2) q[0], q[1]; pow(3) @ rx(k * 0.2) q[2]; rz(k * "
      "0.7) q; h q;");
  with(
      "gate g(a) p, r { h p; cx p, r; rz(a) r; cx p, r; h p; } uint[3] k = uint[3](c); g(k * 0.21) q[0], "
      "q[2];");
  with("uint[3] k = uint[3](c); ctrl @ gphase(k * 0.3) q[0]; h q[0];");
  // No rotations, or none modulo 2 pi: an arm for every value.
  with("uint[3] k = uint[3](c); U(k * 0.3, 0.2, 0) q[0]; pow(0.5) @ p(k * 0.9) q[1]; h q;");
  with("angle[3] a = angle[3](c); ctrl @ rx(3 * a) q[0], q[1]; crz(-a) q[1], q[2]; h q;");
  with("gate g(a) p { rx(a) p; rz(a) p; } uint[3] k = uint[3](c); g(k * 0.3) q[0]; rx((k + 7) * 0.3) q[1];");
}

/// A random program: gates, measurements, resets, branches on bits.
std::string random_program(support::Random& random, int qubits, int lines) {
  std::string text = head + "qubit[" + std::to_string(qubits) + "] q; bit[3] c;\n";
  int splits = 0;
  const auto gate = [&] {
    const auto source = random_source(random, qubits, 1);
    // Only the last line of a text without definitions: the gate itself.
    if (source.text.find("gate ") != std::string::npos) return std::string("h q[0];\n");
    std::string line = source.text;
    line.pop_back();
    return line.substr(line.rfind('\n') + 1) + "\n";
  };
  for (int n = 0; n < lines; ++n) {
    const std::string q = "q[" + std::to_string(random.below(qubits)) + "]";
    const std::string c = "c[" + std::to_string(random.below(3)) + "]";
    switch (random.below(8)) {
      case 0:
        if (++splits > 5) break;
        text += c + " = measure " + q + ";\n";
        break;
      case 1:
        if (++splits > 5) break;
        text += "reset " + q + ";\n";
        break;
      case 2:
        text += "if (" + c + ") { " + gate() + gate() + "} else { " + gate() + "}\n";
        break;
      case 3:
        text += "if (!" + c + ") " + gate();
        break;
      default:
        text += gate();
    }
  }
  if (random.chance(0.5)) text += "c[0] = measure q[0];\n";
  if (random.chance(0.3)) text += "c[1] = measure q[1];\n";
  return text;
}

TEST_CASE("feed-forward: random programs") {
  support::Random random(61);
  for (int n = 0; n < 250; ++n) {
    const std::string source = random_program(random, random.between(2, 4), random.between(4, 14));
    PassContext context;
    context.effort = n % 3 == 0 ? Effort::steady : Effort::quick;
    context.promise.keep_bits_only = n % 5 == 4;
    const auto compiled = support::compile(source, context, n % 7 == 0 ? 1 : 0);
    RunOptions options;
    options.with_references = !compiled.promise.zero_start;
    const double d = support::difference(source, compiled.text, options, context.promise.keep_bits_only);
    if (d > 1e-8) {
      FAIL_CHECK("deviation " << d << ", program " << n << "\n" << source << "\n" << compiled.text);
      return;
    }
    const Circuit back = on_source_wires(support::circuit_of(compiled.text), compiled.source);
    const Verdict verdict = compare(compiled.source, back, compiled.promise);
    if (verdict.answer != Answer::same) {
      FAIL_CHECK("compiler's own check: " << verdict.explanation << "\n" << source << "\n" << compiled.text);
      return;
    }
  }
}

TEST_CASE("inputs: binding a plan gives the program of the bound source") {
  support::Random random(62);
  const auto angle = [&] {
    const char* inputs[] = {"a",      "b",   "2*a",  "a + c", "-c/2 + 0.3",
                            "pi - a", "0.7", "pi/4", "a - a", "sin(a)*c"};
    return std::string(inputs[random.below(10)]);
  };
  for (int n = 0; n < 150; ++n) {
    const int qubits = random.between(2, 4);
    std::string source =
        head + "input float a; input angle b; input float c;\nqubit[" + std::to_string(qubits) + "] q;\n";
    const int lines = random.between(3, 14);
    for (int k = 0; k < lines; ++k) {
      const auto w = random.distinct(2, qubits);
      const std::string one = "q[" + std::to_string(w[0]) + "]";
      const std::string two = one + ", q[" + std::to_string(w[1]) + "]";
      switch (random.below(8)) {
        case 0:
          source += "h " + one + ";\n";
          break;
        case 1:
          source += "rx(" + angle() + ") " + one + ";\n";
          break;
        case 2:
          source += "rz(" + angle() + ") " + one + ";\n";
          break;
        case 3:
          source += "ry(" + angle() + ") " + one + ";\n";
          break;
        case 4:
          source += "cx " + two + ";\n";
          break;
        case 5:
          source += "cp(" + angle() + ") " + two + ";\n";
          break;
        case 6:
          source += "crx(" + angle() + ") " + two + ";\n";
          break;
        default:
          source += "U(" + angle() + ", " + angle() + ", " + angle() + ") " + one + ";\n";
          break;
      }
    }
    PassContext context;
    context.effort = n % 2 == 0 ? Effort::steady : Effort::quick;
    auto compiled = support::compile(source, context);
    RunOptions options;
    options.inputs = {{"a", random.real(-4, 4)}, {"b", random.real(0, 6.2)}, {"c", random.real(-4, 4)}};
    options.with_references = true;
    const double plan = support::difference(source, compiled.text, options);
    Binder binder(compiled.placed.circuit);
    std::vector<std::vector<double>> values;
    for (const DeclaredInput& input : binder.inputs()) values.push_back({options.inputs.at(input.name)});
    Placed bound = compiled.placed;
    bound.circuit = binder.bind(values);
    const std::string text = native_program(bound, {"bound.qasm", "typical"});
    const double number = support::difference(source, text, options);
    if (plan > 1e-8 || number > 1e-8) {
      FAIL_CHECK("plan " << plan << ", bound " << number << ", program " << n << "\n"
                         << source << "\n"
                         << compiled.text << "\n"
                         << text);
      return;
    }
  }
}

}  // namespace
}  // namespace isinglass
