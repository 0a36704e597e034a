// Messages: at the right place, all independent ones in one run, with help where a name is one slip away, and
// warnings for what the standard leaves undefined.
#include <doctest/doctest.h>

#include <fstream>

#include "language/meaning.h"

using namespace isinglass;
using meaning::errors_of;
using meaning::warnings_of;

namespace {

const std::string heading = "OPENQASM 3.1;\ninclude \"stdgates.inc\";\nqubit[4] q; bit[4] c;\n";

std::vector<std::string> errors_in(const std::string& body) {
  return errors_of(heading + body);
}
std::vector<std::string> warnings_in(const std::string& body) {
  return warnings_of(heading + body);
}

using Lines = std::vector<std::string>;

}  // namespace

TEST_CASE("every malformed thing at its place") {
  CHECK(errors_in("x r[0];") == Lines{"4:3: error: qubit `r` is not declared"});
  CHECK(errors_in("cx q[0], q[0];") == Lines{"4:10: error: qubit `q[0]` is given twice"});
  CHECK(errors_in("foo q[0];") == Lines{"4:1: error: gate `foo` is not declared"});
  CHECK(errors_in("cx q[0];") == Lines{"4:1: error: `cx` takes 2 qubits, not 1"});
  CHECK(errors_in("ctrl @ x q[0];") == Lines{"4:8: error: `x` with its controls takes 2 qubits, not 1"});
  CHECK(errors_in("rz(1, 2) q[0];") == Lines{"4:1: error: `rz` takes 1 angle, not 2"});
  CHECK(errors_in("x q[4];") == Lines{"4:5: error: index 4 is out of range: the register has 4 elements"});
  CHECK(errors_in("c[7] = measure q[0];") ==
        Lines{"4:3: error: index 7 is out of range: the register has 4 elements"});
  CHECK(errors_in("int k = 3 +\n  v;") == Lines{"5:3: error: variable `v` is not declared"});
  CHECK(errors_in("c = 3;") == Lines{"4:5: error: int does not convert to bit[4]"});
  CHECK(errors_in("q = 3;") == Lines{"4:1: error: a qubit cannot be assigned"});
}

TEST_CASE("all independent errors in one run, none that only follows from another") {
  const auto errors = errors_in(
      "x r[0];\ncx q[0], q[0];\nint[n] k = 3;\nk = 4;\nrz(k) q[0];\ngate g a { bar a; }\ng q[0];\n"
      "for int i in [0:3] { foo q[i]; x q[i]; baz q[i]; }\nx q[9];\n");
  CHECK(errors == Lines{"4:3: error: qubit `r` is not declared", "5:10: error: qubit `q[0]` is given twice",
                        "6:5: error: variable `n` is not declared", "9:12: error: gate `bar` is not declared",
                        "11:22: error: gate `foo` is not declared",
                        "11:40: error: gate `baz` is not declared",
                        "12:5: error: index 9 is out of range: the register has 4 elements"});
}

TEST_CASE("code that is not run is read nevertheless") {
  CHECK(errors_in("if (false) { foo q[0]; }") == Lines{"4:14: error: gate `foo` is not declared"});
  CHECK(errors_in("if (true) { } else { cx q[0]; }") == Lines{"4:22: error: `cx` takes 2 qubits, not 1"});
  CHECK(errors_in("def f(qubit a) {\n  x b;\n}") == Lines{"5:5: error: variable `b` is not declared"});
  CHECK(errors_in("while (false) { int k = v; k = 2; }") ==
        Lines{"4:25: error: variable `v` is not declared"});
  CHECK(errors_in("switch (1) { case 1 { } case 2 { y w; } }").size() == 1);
  CHECK(errors_in("for int i in [0:1000] { if (i > 2000) { foo q[0]; } }").size() == 1);
  CHECK(errors_in("if (false) { int k = 1; for int j in [0:k] { x q[j]; } let r = q[0:1]; x r; }").empty());
  CHECK(errors_in("def f(int n) -> int { return n < 1 ? 1 : 2; }").size() == 1);  // no such operator
}

TEST_CASE("code that is not run: types, counts and indices are checked") {
  const auto one = [](const std::string& body) {
    INFO(body);
    const Lines dead = errors_in("if (false) { " + body + " }");
    CHECK(dead.size() == 1);
    const Lines uncalled = errors_in("def f(qubit a, qubit[3] v, int n, bit[2] r, float w) { " + body + " }");
    CHECK(uncalled.size() >= 1);
  };
  for (const std::string body : {"int k = \"01\";",
                                 "uint[4] k = 1; k = k & 1.5;",
                                 "bit[2] b = \"011\";",
                                 "bool k = 2ns;",
                                 "const int k = 1.5;",
                                 "float y = sin(\"01\");",
                                 "float y = sin(1, 2);",
                                 "duration d = 3;",
                                 "int k = 2 * \"01\";",
                                 "rx(\"01\") $0;",
                                 "rx(2ns) $0;",
                                 "delay[5] $0;",
                                 "int k = sizeof(3, 4, 5) + q9;",
                                 "gphase(1) $0;",
                                 "gphase(1, 2);",
                                 "rx $0;",
                                 "cx $0;",
                                 "if (2ns) x $0;",
                                 "while (1 im) x $0;",
                                 "bit[3] b; b[3] = 1;",
                                 "bit[3] b; x $0; b[-4] = 1;",
                                 "int[8] k; k[0.5] = 1;",
                                 "int k; k = measure $0;",
                                 "int k; reset k;",
                                 "int k; x k;",
                                 "array[int[8], 2] k; reset $0;",
                                 "angle[4] k; k = k * 1.5;",
                                 "g9($0);",
                                 "uint[4] k = 3; k <<= 0.5;",
                                 "pi = 3;",
                                 "int k = 1; k += 2ns;"}) {
    one(body);
  }
  CHECK(errors_in("def f(int n) { } if (false) f();").size() == 1);
  CHECK(errors_in("def f(int n) { } if (false) f(1, 2);").size() == 1);
  CHECK(errors_in("extern f(int) -> int; if (false) { int k = f(1, 2); }").size() == 1);
  CHECK(errors_in("def f() -> int { return \"01\"; }").size() == 1);
  CHECK(errors_in("def f(qubit a) { x a[0]; }").size() == 1);
  CHECK(errors_in("if (false) { x q[9]; }").size() == 1);
  CHECK(errors_in("if (false) { c[7] = 1; }").size() == 1);
  // Once, although the subroutine is called as well.
  CHECK(errors_in("def f() -> int { int k = \"01\"; return k; } int m = f();").size() == 1);
}

TEST_CASE("code that is not run: what has a meaning with other values passes") {
  for (const std::string body :
       {"int k = 1 / 0;", "const int n = 0; rx(pi / n) q[0];",
        "uint[4] k = 3; for int i in [0:3] { k = k & i; }", "uint[4] k = 1; k <<= 9;",
        "float y = sqrt(-1.0); float z = arccos(2);", "bit[2] r; if (r == 3) x q[0];",
        "bit[2] r; uint[2] k = uint[2](r); int m = k % 2; rx(m * pi) q[0];",
        "duration d = 3ns; delay[2 * d - 1ns] q;",
        "angle[4] a = 0.3; a = 2 * a + pi; rz(a) q[0]; bit b = a[1];",
        "bit b = measure q[0]; bool d = b; d = !b;", "const int n = 3; bit[n] r; r[2] = 1; int[n] k = r[0];",
        "int k = 3; int m = -k ** 2;", "let a = q[0:1]; x a[0];", "complex z = 1 + 2 im; float y = real(z);",
        "bit[2] d = \"01\"; d ^= \"11\"; bit b = d[0] & d[1]; d[0] = b ^ 1;",
        "uint[8] k = 1; k[0:1] = \"11\"; bit d = k[7];"}) {
    INFO(body);
    CHECK(errors_in("if (false) { " + body + " }").empty());
  }
  CHECK(errors_in("array[int[8], 2, 3] v; if (false) { int k = v[1, 2] + v[0][1]; v[0] = v[1]; }").empty());
  CHECK(errors_in(
            "def f(readonly array[int[8], #dim = 2] v, mutable array[bit, 3] w) -> int { return v[0, 1]; }")
            .size() == 0);
}

TEST_CASE("help: names one slip away, missing includes, casts") {
  const auto notes = [](const std::string& text) {
    const Reading reading = read("f.qasm", text);
    REQUIRE(!reading.messages.empty());
    return reading.messages[0].notes;
  };
  CHECK(notes(heading + "hh q[0];") == Lines{"help: did you mean `h`?"});
  CHECK(notes(heading + "int count = 1; x q[coutn];") == Lines{"help: did you mean `count`?"});
  CHECK(notes("OPENQASM 3.1;\nqubit q; h q;") ==
        Lines{"help: it is a gate of stdgates.inc: write `include \"stdgates.inc\";`"});
  CHECK(notes("OPENQASM 2.0;\nqreg q[1]; h q[0];") ==
        Lines{"help: it is a gate of qelib1.inc: write `include \"qelib1.inc\";`"});
}

TEST_CASE("warnings: what the standard leaves undefined, or what is likely meant otherwise") {
  CHECK(warnings_of("qubit q; U(0, 0, 0) q;") ==
        Lines{"1:1: warning: the version line is missing; read as OpenQASM 3.1"});
  CHECK(warnings_in("if (c[1]) x q[0];") ==
        Lines{"4:5: warning: `c` is read before anything was assigned to it; taken as 0"});
  CHECK(warnings_in("c[0] = measure q[0]; if (c[1]) x q[0];") ==
        Lines{"4:26: warning: bit 1 of `c` is read before anything was assigned to it; taken as 0"});
  CHECK(warnings_in("int k; rz(k) q[0];") ==
        Lines{"4:11: warning: `k` is read before anything was assigned to it; taken as 0"});
  CHECK(warnings_in("c = measure q; if (c == 3) x q[0];") ==
        Lines{"4:20: warning: a register is compared with a number as the unsigned number that it holds"});
  CHECK(warnings_in("pow(1/2) @ x q[0];") ==
        Lines{"4:5: warning: integers divide to an integer: this power is 0, the identity"});
  CHECK(warnings_in("int[4] k = 9;") == Lines{"4:12: warning: the value changes when it becomes int[4]"});
  CHECK(warnings_in("int k = 1; k = 2.5;") == Lines{"4:16: warning: the value changes when it becomes int"});
  CHECK(warnings_in("int t = 1; rz(t) q[0];") ==
        Lines{"4:5: warning: `t` hides the gate `t` of the included library"});
  CHECK(warnings_in("c = measure q; uint[4] k = uint[4](c); if (k == 3) x q[0];").empty());
}

TEST_CASE("files: includes are spliced, found beside the file, and never twice or in a circle") {
  const auto write = [](const std::string& name, const std::string& text) {
    const std::string path = std::string("isinglass_test_") + name;
    std::ofstream(path) << text;
    return path;
  };
  const std::string inner = write("inner.inc", "gate g a { U(0.5, 0, 0) a; }\nconst int n = 2;\n");
  const Reading reading = read("main.qasm", "OPENQASM 3.1;\ninclude \"" + inner + "\";\nqubit[n] q; g q;");
  CHECK(reading.ok());
  const std::string circle = "isinglass_test_circle.inc";
  write("circle.inc", "include \"" + circle + "\";\n");
  CHECK(errors_of("OPENQASM 3.1;\ninclude \"" + circle + "\";").size() == 1);
  const std::string bad = write("bad.inc", "\nU(0, 0, 0) nowhere;\n");
  const Reading wrong = read("main.qasm", "OPENQASM 3.1;\ninclude \"" + bad + "\";");
  REQUIRE(wrong.messages.size() == 1);
  CHECK(wrong.messages[0].place.file == bad);
  CHECK(wrong.messages[0].place.line == 2);
  CHECK(errors_of("OPENQASM 3.1;\ninclude \"missing.inc\";") ==
        Lines{"2:9: error: cannot read the included file \"missing.inc\""});
  CHECK(errors_of("OPENQASM 3.1;\ninclude \"stdgates.inc\";\ninclude \"stdgates.inc\";").size() == 1);
  for (const std::string& path : {inner, circle, bad}) std::remove(path.c_str());
}

TEST_CASE("the version line: first, once, known") {
  CHECK(errors_of("qubit q;\nOPENQASM 3.1;").size() == 1);
  CHECK(errors_of("OPENQASM 3.1;\nOPENQASM 3.1;").size() == 1);
  CHECK(errors_of("OPENQASM 7;\nqubit q;").size() == 1);
  CHECK(errors_of("").size() == 1);
  CHECK(errors_of("// nothing but this\n").size() == 1);
}

TEST_CASE("pragmas are kept; annotations bind to the next statement and change nothing") {
  const Circuit circuit =
      meaning::circuit_of(heading + "pragma maker keep this\n@note anything here\nx q[0];");
  REQUIRE(circuit.pragmas.size() == 1);
  CHECK(circuit.pragmas[0] == "maker keep this");
  CHECK(circuit.body().size() == 1);
}

TEST_CASE("names of the native program: what collides is renamed and said") {
  const Circuit circuit = meaning::circuit_of("OPENQASM 3.1;\nqubit q; bit ion; bit xx; ion = measure q;");
  CHECK(circuit.variables[0].source == "ion");
  CHECK(circuit.variables[0].name == "ion_2");
  CHECK(warnings_of("OPENQASM 3.1;\nqubit q; bit ion;").size() == 1);
}

TEST_CASE("annotations: the lines of their statements, once however often these run") {
  const Reading reading =
      read("f.qasm",
           "OPENQASM 3.1;\nqubit q;\n@a\nint k = 0;\n@b.c  some words \nfor int i in [0:9]\n{\n"
           "  @d\n  U(i,\n    0, 0) q;\n}\ndef f(qubit p) {\n@e\nreset p;\n}\nf(q); f(q);\n");
  REQUIRE(reading.ok());
  std::string text;
  for (const Annotation& a : reading.annotations) {
    text += a.text + "|" + std::to_string(a.line) + "|" + std::to_string(a.first_line) + "-" +
            std::to_string(a.last_line) + "|" + a.declares + "\n";
  }
  CHECK(text == "@a|3|4-4|k\n@b.c some words|5|6-11|\n@d|8|9-10|\n@e|13|14-14|\n");
  const auto dropped = [](const std::string& body) {
    const Reading it = read("f.qasm", "OPENQASM 3.1;\n" + body);
    return it.ok() && it.annotations.empty() && it.messages.size() == 1 &&
           it.messages[0].text.ends_with("its statement is not part of the native program");
  };
  CHECK(dropped("@a\ngate g p { }"));
  CHECK(dropped("gate g p {\n@a\nU(0, 0, 0) p;\n}"));
  CHECK(dropped("@a\ndef f() { }"));
  CHECK(dropped("@a\nconst int n = 3;"));
  CHECK_FALSE(read("f.qasm", "OPENQASM 3.1;\nqubit q;\n@ a\nreset q;").ok());
}
