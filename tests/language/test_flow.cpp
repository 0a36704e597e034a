// Control flow: what is known is run by the reader, what is measured stays in the program. Programs with
// feed-forward are compared, over all outcomes, with the tests' own interpreter running the source.
#include <doctest/doctest.h>
#include <fmt/format.h>

#include <random>

#include "language/meaning.h"

using namespace isinglass;
using meaning::circuit_of;
using meaning::deviation;
using meaning::errors_of;

namespace {

const std::string heading = "OPENQASM 3.1;\ninclude \"stdgates.inc\";\n";

/// The operands of the operations of the program's body, for programs that stay straight-line.
std::string wires_of(const std::string& body) {
  const Circuit circuit = circuit_of(heading + "qubit[8] q; qubit a;\n" + body);
  CHECK(circuit.branches.empty());
  std::string text;
  for (const Operation& op : circuit.body()) {
    for (const std::uint32_t wire : circuit.operands(op)) text += std::to_string(wire);
    text += ' ';
  }
  return text.empty() ? text : text.substr(0, text.size() - 1);
}

std::vector<std::string> errors_in(const std::string& body) {
  return errors_of(heading + "qubit[4] q; bit[4] c;\n" + body);
}

}  // namespace

TEST_CASE("for: ranges, sets, registers, arrays, aliases") {
  CHECK(wires_of("for int i in [0:2] x q[i];") == "0 1 2");
  CHECK(wires_of("for int i in [0:3:7] { x q[i]; }") == "0 3 6");
  CHECK(wires_of("for int i in [5:-2:0] { x q[i]; }") == "5 3 1");
  CHECK(wires_of("for uint i in {4, 0, 4} { x q[i]; }") == "4 0 4");
  CHECK(wires_of("int n = 0; for int i in [0:n-1] { x q[i]; }") == "");
  CHECK(wires_of("for bit b in \"0110\" { if (b) x q[1]; else x q[0]; }") == "0 1 1 0");
  CHECK(wires_of("array[int[8], 3] v = {2, 0, 1}; for int[8] k in v { x q[k]; }") == "2 0 1");
  CHECK(wires_of("array[int[8], 3] v = {2, 0, 1}; for int[8] k in v[1:2] { x q[k]; }") == "0 1");
  CHECK(wires_of("bit[2] u = \"10\"; bit[2] v = \"01\"; let w = u ++ v; for bit b in w { if (b) x q[1]; else "
                 "x q[0]; }") == "0 1 1 0");
  // Assigning to the variable does not change how often the loop runs.
  CHECK(wires_of("for int i in [0:2] { x q[i]; i = 7; }") == "0 1 2");
  CHECK(errors_in("for int i in [0:2] { int i = 3; }").size() == 1);
  CHECK(errors_in("for int i in [0:0:2] { }").size() == 1);
  CHECK(errors_in("for int i in q { }").size() == 1);
}

TEST_CASE("while, if, switch on known values; break, continue, end") {
  CHECK(wires_of("int i = 0; while (i < 3) { x q[i]; i += 1; }") == "0 1 2");
  CHECK(wires_of("for int i in [0:7] { if (i == 2) continue; if (i == 4) break; x q[i]; }") == "0 1 3");
  CHECK(wires_of("int i = 0; while (true) { i += 1; if (i > 5) break; if (i % 2 == 0) continue; x q[i]; }") ==
        "1 3 5");
  CHECK(wires_of("if (1 > 0) if (false) x q[0]; else x q[1];") == "1");  // else belongs to the nearest if
  CHECK(wires_of("int k = 2; switch (k) { case 0, 1 { x q[0]; } case 2 { x q[2]; } default { x q[3]; } }") ==
        "2");
  CHECK(wires_of("int k = 9; switch (k) { case 0, 1 { x q[0]; } default { x q[3]; } }") == "3");
  CHECK(wires_of("for int i in [0:4] { switch (i) { case 2 { break; } default { x q[i]; } } }") ==
        "0 1");  // of the loop
  CHECK(wires_of("x q[0]; end; x q[1];") == "0");
  CHECK(wires_of("for int i in [0:4] { x q[i]; if (i == 1) end; } x q[7];") == "0 1");
  CHECK(errors_in("break;").size() == 1);
  CHECK(errors_in("continue;").size() == 1);
  CHECK(errors_in("int k = 1; switch (k) { case 1 { } case 1 { } }").size() == 1);
  CHECK(errors_in("int k = 1; switch (k) { default { } default { } }").size() == 1);
  CHECK(errors_in("int k = 1; int j = 1; switch (k) { case j { } }").size() == 1);
  CHECK(errors_in("switch (1.5) { case 1 { } }").size() == 1);
}

TEST_CASE("endless loops, recursions and growing numbers end in a message") {
  ReadOptions options;
  options.most_steps = 10'000;
  options.most_operations = 10'000;
  const auto error = [&](const std::string& body) {
    const Reading reading = read("f.qasm", heading + "qubit q;\n" + body, options);
    CHECK_FALSE(reading.ok());
    return reading.messages.empty() ? std::string() : reading.messages.back().text;
  };
  CHECK(error("while (true) { }") == "more than 10000 steps while compiling");
  CHECK(error("int i = 0; while (i >= 0) { i += 1; }") == "more than 10000 steps while compiling");
  CHECK(error("for int i in [0:1000000000000] { }") == "more than 10000 steps while compiling");
  CHECK(error("for int i in [0:20000] x q;").find("more than") == 0);
  CHECK(error("def f(qubit a) { f(a); } f(q);") == "calls nest deeper than 256");
  CHECK(error("def f(qubit a) { bit b = measure a; if (b) { f(a); } } f(q);") ==
        "calls nest deeper than 256");
  CHECK(error("int i = 3; while (true) { i = i * i; }") == "the number grows beyond 65,536 bits");
  CHECK(error("const int i = 2**100000000000;") == "the number grows beyond 65,536 bits");
  CHECK(error("gate g0 a { x a; x a; } " +
              [] {
                std::string text;
                for (int k = 1; k < 40; ++k)
                  text += fmt::format("gate g{0} a {{ g{1} a; g{1} a; }} ", k, k - 1);
                return text + "g39 q;";
              }())
            .find("unrolls to more than") != std::string::npos);
}

TEST_CASE("scopes: shadowing, what gates and subroutines see") {
  CHECK(wires_of("int i = 1; { int i = 2; x q[i]; } x q[i];") == "2 1");
  CHECK(wires_of("int i = 1; { i = 2; } x q[i];") == "2");
  CHECK(wires_of("const int k = 3; def f(qubit b) { for int i in [1:k] x b; } f(a);") == "8 8 8");
  CHECK(errors_in("int i = 1; int i = 2;").size() == 1);
  CHECK(errors_in("{ int i = 1; } x q[i];").size() == 1);
  CHECK(errors_in("int k = 3; def f(qubit b) { for int i in [1:k] x b; } f(q[0]);").size() == 1);
  CHECK(errors_in("def f() { x q[0]; } f();").size() == 1);
  CHECK(errors_in("x q[i]; int i = 1;").size() == 1);
  CHECK(errors_in("{ qubit r; }").size() == 1);
  CHECK(errors_in("def f() { qubit r; } f();").size() == 1);
  CHECK(errors_in("int x = 1;").empty());
}

TEST_CASE("subroutines: qubits by reference, scalars by value, arrays by reference, recursion") {
  CHECK(wires_of("def f(qubit b, qubit[2] r) { x b; cx r[0], r[1]; } f(a, q[3:4]);") == "8 34");
  CHECK(wires_of("def f(int k) -> int { k += 1; return k; } int k = 2; x q[f(k)]; x q[k];") == "3 2");
  CHECK(wires_of("def f(int n) -> int { if (n < 2) { return 1; } return n * f(n - 1); } x q[f(3)];") == "6");
  CHECK(
      wires_of(
          "def f(mutable array[int[8], 2] v) { v[0] = 5; } array[int[8], 2] v = {1, 2}; f(v); x q[v[0]];") ==
      "5");
  CHECK(wires_of("def f(readonly array[int[8], #dim = 1] v) -> int { return v[1]; } array[int[8], 2] v = {1, "
                 "2}; x q[f(v)];") == "2");
  CHECK(wires_of("def f(qubit b) { x b; return; x b; } f(a);") == "8");
  CHECK(wires_of("let r = q[1:2] ++ q[5:5]; def f(qubit[3] s) { x s[2]; x s[0]; } f(r);") == "5 1");
  CHECK(errors_in("def f(qubit a, qubit b) { } f(q[0], q[0]);").size() == 1);
  CHECK(errors_in("def f(qubit[2] a) { } f(q);").size() == 1);
  CHECK(errors_in("def f(qubit[2] a) { } f(q[0:0] ++ q[1:1]);").size() == 1);
  CHECK(errors_in("def f(int a) { } f();").size() == 1);
  CHECK(errors_in("def f(readonly array[int[8], 2] v) { v[0] = 1; } array[int[8], 2] v; f(v);").size() == 1);
  CHECK(errors_in("def f() -> int { } int k = f();").size() == 1);
  CHECK(errors_in("def f() { return 3; } f();").size() == 1);
  CHECK(errors_in("def f() { g(); } def g() { } f();").size() == 1);  // no forward reference
  CHECK(errors_in("g(); def g() { }").size() == 1);
  CHECK(errors_in("{ def g() { } }").size() == 1);
  CHECK(errors_in("return;").size() == 1);
}

TEST_CASE("qubit indices: negative ones, ranges as they are written, sets") {
  CHECK(wires_of("x q[-1];") == "7");
  CHECK(wires_of("x q[-4:-1];") == "4 5 6 7");
  CHECK(wires_of("x q[1:2:5];") == "1 3 5");
  CHECK(wires_of("x q[5:-2:1];") == "5 3 1");
  CHECK(wires_of("x q[:1];") == "0 1");
  CHECK(wires_of("x q[6:];") == "6 7");
  CHECK(wires_of("let r = q[0:2:6]; x r[1:2]; let s = r[{3, 0}]; x s;") == "2 4 6 0");
  CHECK(wires_of("x $0; x $3; x $0;") == "9 10 9");
  CHECK(wires_of("def f() { x $7; } f(); x $07; x $999999;") == "9 9 10");
  CHECK(errors_in("x $1000000;").size() == 1);
  CHECK(errors_in("x $99999999999999999999;").size() == 1);
  CHECK(errors_in("x q[0:-1];").size() == 1);  // empty as it is written
  CHECK(errors_in("x q[-1:-3];").size() == 1);
  CHECK(errors_in("x q[2:4];").size() == 1);
  CHECK(errors_in("x q[-5];").size() == 1);
  CHECK(errors_in("let r = q[0:1] ++ q[1:2];").size() == 1);
  CHECK(errors_in("let r = $0;").size() == 1);
  CHECK(errors_in("x c[0];").size() == 1);
}

TEST_CASE("measurement: forms and sizes") {
  const auto bits = [](const std::string& body) {
    std::string text;
    const Circuit circuit = circuit_of(heading + "qubit[3] q; qubit a; bit[3] c; bit b;\n" + body);
    for (const Operation& op : circuit.body()) {
      if (op.kind == Kind::measure)
        text +=
            fmt::format("{}>{} ", op.operand[0], op.payload == no_bit ? -1 : static_cast<int>(op.payload));
    }
    return text;
  };
  CHECK(bits("c = measure q;") == "0>0 1>1 2>2 ");
  CHECK(bits("measure q -> c;") == "0>0 1>1 2>2 ");
  CHECK(bits("measure q;") == "0>-1 1>-1 2>-1 ");
  CHECK(bits("b = measure a; bit d = measure q[1];") == "3>3 1>4 ");
  CHECK(bits("c[0:1] = measure q[1:2];") == "1>0 2>1 ");
  CHECK(bits("let d = c[{2, 0}]; d = measure q[0:1];") == "0>2 1>0 ");
  CHECK(errors_in("c[0] = measure q;").size() == 1);
  CHECK(errors_in("c = measure q[0];").size() == 1);
  CHECK(errors_in("c[0:1] = measure q;").size() == 1);
  CHECK(errors_in("qubit[1] r; bit b; b = measure r;").size() == 1);  // a register of one is no bit
  CHECK(errors_in("int k = 2 * measure q[0];").size() == 1);
  CHECK(errors_in("if (measure q[0]) x q[1];").size() == 1);
  CHECK(errors_in("const bit b = measure q[0];").size() == 1);
}

TEST_CASE("barrier, reset, delay, box, durations") {
  const Circuit circuit =
      circuit_of(heading +
                 "qubit[3] q; barrier; barrier q[0:1], q[1]; reset q; delay[1.5us] q[0], q[2]; nop q[0];\n"
                 "const duration d = 2 * 100ns + 1us; delay[d - 0.2us] q; stretch s; delay[s] q[0];\n"
                 "box[1ms] { x q[0]; cx q[0], q[1]; }");
  const Block& body = circuit.body();
  REQUIRE(body.size() == 13);
  CHECK(body[0].operand_count == 3);
  CHECK(body[1].operand_count == 2);
  CHECK(body[2].kind == Kind::reset);
  CHECK(body[5].kind == Kind::delay);
  CHECK(body[5].value[0] == doctest::Approx(1.5));
  CHECK(body[5].operand_count == 2);
  CHECK(body[6].value[0] == doctest::Approx(1.0));
  CHECK(body[7].value[0] == 0);
  CHECK(body[8].kind == Kind::barrier);
  CHECK(body[11].kind == Kind::delay);  // what is left of the box
  CHECK(body[11].value[0] == doctest::Approx(1000 - 215));
  CHECK(body[12].kind == Kind::barrier);
  CHECK(body[12].operand_count == 2);
  CHECK(meaning::holds("d / 100ns == 2.5", "duration d = 0.25us;"));
  CHECK(meaning::holds("durationof({ x q; }) > 0ns"));
  CHECK(meaning::holds("1 µs == 1us && 1000ms == 1s"));
  CHECK(errors_in("delay[-1ns] q;").size() == 1);
  CHECK(errors_in("delay[5] q;").size() == 1);
  CHECK(errors_in("duration d = 3;").size() == 1);
  CHECK(errors_in("duration d = 1ns * 1ns;").size() == 1);
}

TEST_CASE("running indices that may meet: nothing is done where they do") {
  const std::string body = "qubit[3] q; bit[2] c; c = measure q[0:1]; uint[2] k = uint[2](c);\n";
  const Circuit circuit = circuit_of(heading + body + "cx q[k], q[(k + 1) % 3];");
  std::size_t gates = 0;
  for (const Block& block : circuit.blocks) {
    for (const Operation& op : block) gates += op.kind == Kind::x ? 1 : 0;
  }
  CHECK(gates == 6);  // all ordered pairs
  CHECK(errors_of(heading + body + "cx q[1], q[1];").size() == 1);
}

TEST_CASE("running angles: conditional gates for rotations, arms for the rest, a limit") {
  const auto branches = [](const std::string& body) {
    const Circuit circuit =
        circuit_of(heading + "qubit[2] q; bit[2] c; uint[16] k; bit[16] r; r[0] = measure q[0];\n" +
                   "k = uint[16](r); extern f() -> uint[16]; extern g() -> float; extern few() -> "
                   "uint[2];\n" +
                   body);
    std::size_t arms = 0;
    for (const Branch& branch : circuit.branches) arms += branch.arms.size();
    return std::to_string(circuit.branches.size()) + " " + std::to_string(arms);
  };
  CHECK(branches("rz(k * pi / 7) q[0];") == "16 16");
  CHECK(branches("rz(k * pi / 7) q;") == "16 16");
  CHECK(branches("rz(f() * pi / 7) q[0];") == "16 16");
  CHECK(branches("U(few() * 0.1, 0, 0.2) q[0];") == "1 4");
  const std::string reads = "def m(qubit p) -> uint[2] { bit[2] d; d[0] = measure p; return uint[2](d); }\n";
  CHECK(branches(reads + "rx(m(q[1]) * 0.6) q[0];") == "2 2");
  CHECK(branches(reads + "U(m(q[1]) * 0.6, 0, 0.2) q[0];") == "1 4");
  CHECK(branches(reads + "x q[m(q[1]) % 2];") == "1 2");
  CHECK(branches("array[uint[16], 2, 2] a; a[1, 0] = k; rz(a[1, 0] * pi / 7) q[0];") == "16 16");
  CHECK(branches("array[uint[2], 2] a; a[1] = uint[2](r[0:1]); U(a[1] * 0.1, 0, 0.2) q[0];") == "1 4");
  CHECK(branches("array[uint[2], 2] a; a[1] = 3; U(a[1] * 0.1, 0, 0.2) q[0];") == "0 0");
  CHECK(branches("input float t; ry(t + k * 0.1) q[0];") == "16 16");
  CHECK(branches("c[0] = measure q[0]; c[1] = measure q[1]; rz(c[0] * pi) q[0]; U(c[0] * 0.1, c[1] * pi, 0) "
                 "q[0];") == "4 8");
  const auto refused = [](const std::string& body) {
    const auto errors = errors_in(
        "uint[16] k; bit[16] r; r[0] = measure q[0]; k = uint[16](r); extern f() -> uint[16];"
        "extern g() -> float;" +
        body);
    return errors.size() == 1 ? errors[0] : "";
  };
  CHECK(refused("U(k * 0.1, 0, 0.2) q[0];").find("cannot be compiled") != std::string::npos);
  CHECK(refused("U(f() * 0.1, 0, 0.2) q[0];").find("cannot be compiled") != std::string::npos);
  CHECK(refused("rz(g()) q[0];").find("cannot be compiled") != std::string::npos);
  CHECK(refused("rz((k + 1) * 0.1) q[0];").find("cannot be compiled") != std::string::npos);
  CHECK(refused("angle[16] a = angle[16](r); crz(2 * a) q[0], q[1];").find("cannot be compiled") !=
        std::string::npos);
}

TEST_CASE("what is not supported says so") {
  CHECK(errors_in("cal { }").size() == 1);
  CHECK(errors_in("defcal x $0 { }").size() == 1);
  CHECK(errors_in("defcalgrammar \"openpulse\";").size() == 1);
}

TEST_CASE("running conditions: feed-forward equals the source over all outcomes") {
  const std::vector<std::string> programs = {
      // teleportation
      "qubit[3] q; bit[2] c; h q[1]; cx q[1], q[2]; cx q[0], q[1]; h q[0]; c[0] = measure q[0]; c[1] = "
      "measure q[1];\n"
      "if (c[1]) x q[2]; if (c[0]) { z q[2]; }",
      // else, nesting, registers compared with numbers
      "qubit[3] q; bit[2] c; h q; c = measure q[0:1]; if (uint[2](c) == 3) { x q[2]; } else if (c[0]) { y "
      "q[2]; } else { h q[2]; }",
      // switch
      "qubit[3] q; bit[2] c; h q; c = measure q[0:1]; switch (uint[2](c)) { case 0 { x q[2]; } case 1, 2 { h "
      "q[2]; } default { s q[2]; } }",
      // a variable that both paths assign
      "qubit[2] q; bit c; int[8] k = 1; h q[0]; c = measure q[0]; if (c) { k = 3; x q[1]; } else { k += 4; } "
      "if (k == 5) h q[1];",
      // repeat until success, bounded by counting
      "qubit[2] q; bit c; uint[4] n = 0; h q[0]; c = measure q[0]; while (c && n < 3) { n += 1; h q[0]; c = "
      "measure q[0]; rx(0.3) q[1]; }",
      // break and continue out of a loop that is unrolled
      "qubit[2] q; bit[4] c; for int i in [0:3] { h q[0]; c[i] = measure q[0]; if (c[i]) break; ry(0.4) "
      "q[1]; }",
      "qubit[2] q; bit[3] c; for int i in [0:2] { h q[0]; c[i] = measure q[0]; if (c[i]) { x q[0]; continue; "
      "} ry(0.4) q[1]; } h q[1];",
      // break out of a running loop
      "qubit[2] q; bit c; uint[4] n = 0; while (true) { h q[0]; c = measure q[0]; n += 1; if (c) { break; } "
      "if (n == 3) break; rx(0.3) q[1]; }",
      // a running qubit index
      "qubit[3] q; bit[1] c; h q[0]; c[0] = measure q[0]; uint[1] k = uint[1](c); x q[k + 1];",
      // a running angle: phase estimation's correction
      "qubit[2] q; bit[2] c; h q[0]; c[0] = measure q[0]; h q[0]; c[1] = measure q[0]; rz(-pi * uint[2](c) / "
      "4) q[1];",
      // end under a condition
      "qubit[2] q; bit c; h q[0]; c = measure q[0]; if (c) { x q[1]; end; } h q[1];",
      // a loop over measured bits
      "qubit[3] q; bit[2] c; h q; c = measure q[0:1]; for bit b in c { if (b) rx(0.4) q[2]; }",
      // assignments that copy bits
      "qubit[2] q; bit[2] c; bit d; h q; c = measure q; d = c[0]; c[0] = c[1]; c[1] = d; if (c[0] ^ d) { "
      "reset q[0]; }",
      // bits of numbers and slices
      "qubit[3] q; bit[3] c; uint[3] k = 0; h q; c = measure q; k[0:1] = c[1:2]; k[2] = c[0]; if (k > 4) { "
      "reset q; }",
  };
  for (const std::string& program : programs) {
    CHECK(deviation(heading + program) < 1e-12);
  }
}

TEST_CASE("inlined calls that branch: early returns on measured bits") {
  // The tests' interpreter has no subroutines: each program stands beside its equal without them.
  const std::vector<std::pair<std::string, std::string>> pairs = {
      {"def f(qubit a) -> bit { h a; return measure a; } qubit[2] q; bit c; c = f(q[0]); if (c) x q[1];",
       "qubit[2] q; bit c; h q[0]; c = measure q[0]; if (c) x q[1];"},
      {"def f(qubit a, qubit b) -> bit { bit m = measure a; if (m) { x b; return 1; } h b; return measure b; "
       "}\n"
       "qubit[2] q; bit c; h q[0]; c = f(q[0], q[1]);",
       "qubit[2] q; bit c; bit m; h q[0]; m = measure q[0]; if (m) { x q[1]; c = 1; } else { h q[1]; c = "
       "measure q[1]; }"},
      {"def f(qubit a) -> bit { bit m; for int i in [0:2] { h a; m = measure a; if (m) { return 1; } } "
       "return 0; }\n"
       "qubit[2] q; bit c; c = f(q[0]); if (c) x q[1];",
       "qubit[2] q; bit c; bit m; h q[0]; m = measure q[0]; if (!m) { h q[0]; m = measure q[0]; } if (!m) { "
       "h q[0]; m = measure q[0]; }\n"
       "c = m; if (c) x q[1];"},
      {"def f(qubit a, bit b) { if (b) { x a; } } qubit[2] q; bit c; h q[0]; c = measure q[0]; f(q[1], c); "
       "f(q[1], !c);",
       "qubit[2] q; bit c; h q[0]; c = measure q[0]; x q[1];"},
      {"def f(qubit a) -> int[8] { bit m = measure a; int[8] k = 2; if (m) { k = 5; } return k; }\n"
       "qubit[2] q; int[8] s; h q; s = f(q[0]) * 3 + f(q[1]);",
       "qubit[2] q; int[8] s; bit m; h q; m = measure q[0]; s = 8; if (m) s += 9; m = measure q[1]; if (m) s "
       "+= 3;"},
      {"def f(qubit a) -> bit { bit m; uint[4] n = 0; while (true) { h a; m = measure a; n += 1; if (m) { "
       "return 1; } if (n == 2) return 0; } return 0; }\n"
       "qubit q; bit c; c = f(q);",
       "qubit q; bit c; h q; c = measure q; if (!c) { h q; c = measure q; }"},
  };
  for (const auto& [source, equal] : pairs) {
    const std::string written = meaning::program_of(circuit_of(heading + source));
    INFO(written);
    CHECK(meaning::difference_of(heading + equal, written) < 1e-12);
  }
}

TEST_CASE("known, symbolic, running: it is clear which") {
  const Circuit circuit = circuit_of(heading +
                                     "input int[8] n; input float t; qubit[2] q; bit c; int k = 3;\n"
                                     "if (k == 3) x q[0];\n"
                                     "if (n == 3) x q[1];\n"
                                     "rz(t * k) q[0]; rz(n * pi) q[0];\n"
                                     "c = measure q[0]; if (c) x q[0];");
  CHECK(circuit.branches.size() == 2);
  CHECK(printed(circuit.branches[0].condition, circuit) == "n == 3");
  CHECK(printed(circuit.branches[1].condition, circuit) == "c");
  CHECK(circuit.body()[0].kind == Kind::x);
}

TEST_CASE("extern calls are kept, called once each") {
  const Circuit circuit = circuit_of(
      heading +
      "extern decide(bit[2], int[8]) -> bit; extern log_it(int[8]); qubit[2] q; bit[2] c; c = measure q;\n"
      "bit d = decide(c, 3); if (d) x q[0]; log_it(4);");
  REQUIRE(circuit.externs.size() == 2);
  CHECK(circuit.externs[0] == "extern decide(bit[2], int[8]) -> bit;");
  CHECK(printed(circuit.statements[0].value, circuit) == "decide(c, int[8](3))");
  CHECK(circuit.statements.back().kind == ClassicalStatement::Kind::call);
  CHECK(errors_in("extern f(float) -> float; rz(f(1.0)) q[0];").size() == 1);  // a float
  CHECK(errors_in("extern f(float) -> float; float a = f();").size() == 1);
}

TEST_CASE("inputs and outputs") {
  const Circuit circuit = circuit_of(
      heading +
      "input float t; input array[float[64], 2] a; output bit[2] c; output int[8] k; qubit[2] q; bit d;\n"
      "rz(t) q[0]; rz(a[1]) q[0]; d = measure q[0]; c = measure q; k = 7;");
  CHECK(circuit.inputs[1].type == "array[float[64], 2]");
  CHECK(printed(circuit.inputs[2].expression, circuit) == "a[1]");
  CHECK(circuit.variables[0].is_output);
  CHECK_FALSE(circuit.variables[1].is_output);
  // What an output holds at the end is told to the running program.
  CHECK(printed(circuit.statements.back().target, circuit) == "k");
  CHECK(errors_in("input float t = 3;").size() >= 1);
  CHECK(errors_in("input float t; t = 3;").size() == 1);
  CHECK(errors_in("{ input float t; }").size() == 1);
}
