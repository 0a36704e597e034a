// The parser: every form of statement and expression becomes the right tree. Expected trees are from the
// standard's text (OpenQASM 3.1 and 2.0), written out by hand.
#include <doctest/doctest.h>

#include "language/tree_text.h"

using isinglass::tree_text::read;
using isinglass::tree_text::shown;

TEST_CASE("operators nest by the standard's table of precedence") {
  CHECK(shown("x = a + b * c ** d;") == "x = (+ a (* b (** c d)))");
  CHECK(shown("x = -2 ** 2;") == "x = (- (** 2 2))");  // the power binds tighter than the sign
  CHECK(shown("x = 2 ** -2;") == "x = (** 2 (- 2))");
  CHECK(shown("x = 2 ** 3 ** 4;") == "x = (** 2 (** 3 4))");
  CHECK(shown("x = 2 ** -3 ** 4;") == "x = (** 2 (- (** 3 4)))");
  CHECK(shown("x = a - b - c;") == "x = (- (- a b) c)");
  CHECK(shown("x = a / b * c % d;") == "x = (% (* (/ a b) c) d)");
  CHECK(shown("x = a & b == c;") == "x = (& a (== b c))");
  CHECK(shown("x = a | b ^ c & d;") == "x = (| a (^ b (& c d)))");
  CHECK(shown("x = a || b && c | d;") == "x = (|| a (&& b (| c d)))");
  CHECK(shown("x = a < b == c >= d;") == "x = (== (< a b) (>= c d))");
  CHECK(shown("x = a << b + c;") == "x = (<< a (+ b c))");
  CHECK(shown("x = !a && ~b - -c;") == "x = (&& (! a) (- (~ b) (- c)))");
  CHECK(shown("x = (a + b) * c;") == "x = (* (+ a b) c)");
  CHECK(shown("x = -a[1];") == "x = (- a[1])");
  CHECK(shown("let x = a ++ b ++ c[0:1];") == "let x = (++ (++ a b) c[0:_:1])");
}

TEST_CASE("in version 2 a caret is a power") {
  CHECK(shown("x = 2 * a ^ 2;", 2) == "x = (* 2 (** a 2))");
  CHECK(shown("x = 2 * a ^ 2;", 3) == "x = (^ (* 2 a) 2)");
}

TEST_CASE("literals") {
  CHECK(shown("x = 1_000;") == "x = 1000");
  CHECK(shown("x = 0xAf_0;") == "x = 0xAf0");
  CHECK(shown("x = 0b1_0 + 0B1 + 0o17 + 0X1;") == "x = (+ (+ (+ 0b10 0B1) 0o17) 0X1)");
  CHECK(shown("x = 1. + .5 + 2e10 + 2.0E-1;") == "x = (+ (+ (+ 1. .5) 2e10) 2.0E-1)");
  CHECK(shown("x = 2 im + 2.5im;") == "x = (+ 2im 2.5im)");
  CHECK(shown("x = \"0010_1010\";") == "x = \"00101010\"");
  CHECK(shown("x = true || false;") == "x = (|| true false)");
  CHECK(shown("delay[1.5ns + 2 us + 3\tms + 4s + 5 dt] q;") ==
        "delay[(+ (+ (+ (+ 1.5ns 2us) 3ms) 4s) 5dt)] q");
  CHECK(shown("delay[1\u00B5s + 1 \u03BCs] q;") == "delay[(+ 1us 1us)] q");
  const std::string huge(400, '7');
  CHECK(shown("x = " + huge + ";") == "x = " + huge);
}

TEST_CASE("names are Unicode and are not normalised") {
  CHECK(shown("x = \u03D5 + \u03C6 + \u2107 + _a1 + \u00E9t\u00E9;") ==
        "x = (+ (+ (+ (+ \u03D5 \u03C6) \u2107) _a1) \u00E9t\u00E9)");
  CHECK(shown("pragmatic q;") == "call pragmatic q");
  CHECK(shown("U(1, 2, 3) q; sin q; sizeof q;") == "call U(1 2 3) q; call sin q; call sizeof q");
}

TEST_CASE("declarations") {
  CHECK(shown("qubit q; qubit[n + 1] r;") == "qubit q; qubit[(+ n 1)] r");
  CHECK(shown("qreg q[2]; qreg r; creg c[3];") == "qreg[2] q; qreg r; bit[3] c (creg)");
  CHECK(shown("bit b; bit[2] c = \"01\"; int i = 3; uint[8] u;") ==
        "bit b; bit[2] c = \"01\"; int i = 3; uint[8] u");
  CHECK(shown("float f; float[32] g; angle a; angle[20] h; bool t;") ==
        "float f; float[32] g; angle a; angle[20] h; bool t");
  CHECK(shown("complex c; complex[float[32]] d; duration e = 2ns; stretch s;") ==
        "complex c; complex<float[32]> d; duration e = 2ns; stretch s");
  CHECK(shown("const int n = 2 * m;") == "const int n = (* 2 m)");
  CHECK(shown("input angle[8] t; output bit[2] b; input array[int, 3] a;") ==
        "input angle[8] t; output bit[2] b; input array<int>[3] a");
  CHECK(shown("array[int[8], 2, 3] a = {{1, 2, 3}, {4, 5, 6,}};") ==
        "array<int[8]>[2 3] a = {{1 2 3} {4 5 6}}");
  CHECK(shown("let a = q[{0, 2}]; let b = q[0:2:6]; let c = q[-4:-1]; let d = q[:];") ==
        "let a = q[{0 2}]; let b = q[0:2:6]; let c = q[(- 4):_:(- 1)]; let d = q[_:_:_]");
  CHECK(shown("let a = q[::2]; let b = q[1:]; let c = q[:3]; let d = q[1:2:];") ==
        "let a = q[_:_:2]; let b = q[1:_:_]; let c = q[_:_:3]; let d = q[1:2:_]");
}

TEST_CASE("gates, subroutines and externs") {
  CHECK(shown("gate g(a, b,) x, y { U(a, b, 0) x; cx x, y; }") ==
        "gate g(a b) x y {call U(a b 0) x; call cx x y}");
  CHECK(shown("gate g x { } gate h() x { }") == "gate g() x {}; gate h() x {}");
  CHECK(shown("opaque magic(a) x, y; opaque dust x;", 2) == "opaque magic(a) x y ; opaque dust() x ");
  CHECK(shown("def f(qubit[2] q, int[8] n, bit b) -> bit { return measure q[0]; }") ==
        "def f(qubit[2] q, int[8] n, bit b) -> bit {return measure q[0]}");
  CHECK(shown("def f() { return; } def g(qreg q[2], creg c[3], qubit r) { }") ==
        "def f() ->  {return}; def g(qubit[2] q, bit[3] c, qubit r) ->  {}");
  CHECK(shown("def f(readonly array[int[8], 2, 3] a, mutable array[float, #dim = 2] b) { }") ==
        "def f(readonly array<int[8]>[2 3] a, mutable array<float>[#2] b) ->  {}");
  CHECK(shown("extern f(int[8], float) -> bool; extern g();") ==
        "extern f(int[8], float) -> bool; extern g() -> ");
}

TEST_CASE("gate calls and modifiers") {
  CHECK(shown("h q; cx q[0], r; rx(pi / 2) $0; g() q;") ==
        "call h q; call cx q[0] r; call rx((/ pi 2)) $0; call g() q");
  CHECK(shown("ctrl @ x a, b; ctrl(2) @ negctrl @ inv @ pow(1/2) @ rz(t) a, b, c, d;") ==
        "ctrl @ call x a b; ctrl(2) @ negctrl @ inv @ pow((/ 1 2)) @ call rz(t) a b c d");
  CHECK(shown("ctrl @x a, b; inv@s q; pow(f(2))@x q;") ==
        "ctrl @ call x a b; inv @ call s q; pow(f(2)) @ call x q");
  CHECK(shown("gphase(pi); inv @ gphase(a); ctrl @ gphase(a) q;") ==
        "call gphase(pi) ; inv @ call gphase(a) ; ctrl @ call gphase(a) q");
  CHECK(shown("rx(1)[20ns] q; x[d] q;") == "call rx(1)[20ns] q; call x[d] q");
  CHECK(shown("cx q[0:2], r[{1, 2}];") == "call cx q[0:_:2] r[{1 2}]");
}

TEST_CASE("measurement has one form in the tree") {
  CHECK(shown("measure q; measure q[0] -> c[0]; c = measure q; bit b = measure $1;") ==
        "measure q; measure q[0] -> c[0]; measure q -> c; bit b = measure $1");
}

TEST_CASE("other quantum statements") {
  CHECK(shown("reset q; barrier; barrier q, r[0]; nop; nop q; delay[2ns]; delay[d] q, r;") ==
        "reset q; barrier ; barrier q r[0]; nop ; nop q; delay[2ns] ; delay[d] q r");
  CHECK(shown("box { x q; } box[10us] { }") == "box {call x q}; box[10us] {}");
  CHECK(shown("duration d = durationof({ x q; y q; }) * 2;") ==
        "duration d = (* durationof{call x q; call y q} 2)");
}

TEST_CASE("expressions as statements, and assignments") {
  CHECK(shown("f(a, b,); g(); a; a[0];") == "f(a b); g(); a; a[0]");
  CHECK(shown("a = 1; a[0, 1] = b; a[2:3] += 1; a **= 2; a <<= 1;") ==
        "a = 1; a[0 1] = b; a[2:_:3] += 1; a **= 2; a <<= 1");
  CHECK(shown("a = {1, {2}};") == "a = {1 {2}}");
  CHECK(shown("b = f(3) $0; b = g q;") == "b = defcal_call f({3} $0); b = defcal_call g({} q)");
  CHECK(shown("x = int[32](a) + float(b) * bit[2](c);") == "x = (+ int[32](a) (* float(b) bit[2](c)))");
  CHECK(shown("x = a[0][1:2];") == "x = a[0][1:_:2]");
}

TEST_CASE("control") {
  CHECK(shown("if (a == 1) x q; else { y q; }") == "if (== a 1) <call x q> else {call y q}");
  CHECK(shown("if (a) if (b) x q; else y q;") == "if a <if b <call x q> else <call y q>>");
  CHECK(shown("if (a) while (b) if (c) x q; else y q;") ==
        "if a <while b <if c <call x q> else <call y q>>>");
  CHECK(shown("if (a) { if (b) x q; } else y q;") == "if a {if b <call x q>} else <call y q>");
  CHECK(shown("if (a) { } else if (b) { } else { }") == "if a {} else <if b {} else {}>");
  CHECK(shown("for int i in [0:2:10] x q[i];") == "for int i in 0:2:10 <call x q[i]>");
  CHECK(shown("for uint[8] i in {1, 2, 3} { }") == "for uint[8] i in {1 2 3} {}");
  CHECK(shown("for bit b in c { break; continue; end; }") == "for bit b in c {break; continue; end}");
  CHECK(shown("for int i in a x q;") == "for int i in a <call x q>");
  CHECK(shown("switch (i) { case 1, 2 { x q; } case n { } default { y q; } }") ==
        "switch i case 1 2 {call x q} case n {} default {call y q}");
  CHECK(shown("{ x q; { y q; } }") == "{call x q; {call y q}}");
  CHECK(shown("if(c==3) x q[0];", 2) == "if (== c 3) <call x q[0]>");
}

TEST_CASE("file level: version, include, pragma, annotation, calibration") {
  CHECK(shown("OPENQASM 3.1; OPENQASM 3; OPENQASM 2.0;") == "version 3.1; version 3.0; version 2.0");
  CHECK(shown("include \"stdgates.inc\"; include 'a/b.inc';") == "include stdgates.inc; include a/b.inc");
  CHECK(shown("pragma keep this; as it is\nx q;") == "pragma keep this; as it is; call x q");
  CHECK(shown("#pragma old\r\npragma\nx q;") == "pragma old; pragma ; call x q");
  CHECK(shown("@note some text; here\n@a.b\nx q;") == "@note<some text; here> @a.b<> call x q");
  CHECK(shown("if (a) @n\n x q;") == "if a <@n<> call x q>");
  CHECK(shown("if (a) { @n\n x q; }") == "if a {@n<> call x q}");
  CHECK(shown("cal { play(a); { b } }") == "cal <{ play(a); { b } }>");
  CHECK(shown("defcal x(a) $0 -> bit { c { d; } }\nx q;") ==
        "defcal <x(a) $0 -> bit { c { d; } }>; call x q");
  CHECK(shown("defcalgrammar \"mine\";") == "defcalgrammar <\"mine\";>");
}

TEST_CASE("comments") {
  CHECK(shown("// x q;\nx /* y */ q; /* a\nb **/ y q; // end") == "call x q; call y q");
  CHECK(shown("/* a /* b */ x q;") == "call x q");
  CHECK(shown("") == "");
  CHECK(shown("\xEF\xBB\xBFx q;") == "call x q");
}

TEST_CASE("each version has its own reserved words") {
  CHECK(shown("qreg box[2]; gate let a { } let box[0]; int box[1]; cal box[0];", 2) ==
        "qreg[2] box; gate let() a {}; call let box[0]; call int box[1]; call cal box[0]");
  CHECK(shown("opaque q; x opaque;", 3) == "call opaque q; call x opaque");
}

TEST_CASE("places count lines, and columns in characters") {
  const auto it = read("// \u00E9\n/* \u03C6\u03C6 */ x q;  \u03C6 q;\n\n  if (a) {\n  y q;\n}\n");
  REQUIRE(it.statements.size() == 3);
  CHECK(it.statements[0].at.line == 2);
  CHECK(it.statements[0].at.column == 10);
  CHECK(it.statements[0].at.length == 4);
  CHECK(it.statements[1].at.column == 16);
  CHECK(it.statements[1].at.length == 4);
  CHECK(it.statements[2].at.line == 4);
  CHECK(it.statements[2].at.column == 3);
  CHECK(it.statements[2].at.length == 8);
  const auto& inner = std::get<isinglass::syntax::If>(it.statements[2].what).then.statements.at(0);
  CHECK(inner.at.line == 5);
  CHECK(inner.at.column == 3);
}
