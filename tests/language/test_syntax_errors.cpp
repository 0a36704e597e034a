// Text that breaks the grammar: where the message points, what it says, and that reading goes on.
#include <doctest/doctest.h>

#include <chrono>

#include "language/tree_text.h"

using isinglass::printed;
using isinglass::tree_text::complaints;
using isinglass::tree_text::read;
using isinglass::tree_text::shown;

TEST_CASE("a missing semicolon is reported where it belongs, and nothing else is lost") {
  CHECK(shown("h q\nx q;") == "call x q !1:4 missing ';' after 'q'");
  CHECK(shown("h q measure q;") == "measure q !1:4 missing ';' after 'q'");
  CHECK(shown("{ h q }") == "{} !1:6 missing ';' after 'q'");
  CHECK(shown("h q") == " !1:4 missing ';' after 'q'");
  CHECK(shown("int i = 3\nfor int j in [0:1] { x q }\ny q;") ==
        "for int j in 0:_:1 {}; call y q !1:10 missing ';' after '3' !2:25 missing ';' after 'q'");
}

TEST_CASE("malformed words") {
  CHECK(complaints("x = 3__4;") == "1:5 '3__4' is not a number");
  CHECK(complaints("x = 3_;") == "1:5 '3_' is not a number");
  CHECK(complaints("x = 12af;") == "1:5 '12af' is not a number");
  CHECK(complaints("x = 0O7;") == "1:5 '0O7' is not a number");
  CHECK(complaints("x = 0b12;") == "1:5 '0b12' is not a number");
  CHECK(complaints("int 3x = 4;\ny q") == "1:5 '3x' is not a number\n2:4 missing ';' after 'q'");
  CHECK(complaints("include \"abc;\nx q;") == "1:9 this text has no closing quote on its line");
  CHECK(complaints("x q; /* never\nclosed") == "1:6 this comment is never closed");
  CHECK(complaints("x /* a /* b */ */ q;") == "1:16 '*/' closes no comment");
  CHECK(complaints("x \u00A7 q;") == "1:3 the character '\u00A7' has no meaning here");
  CHECK(complaints("x = \"012\";") == "1:5 a text is no value here");
  CHECK(complaints("x = \"0__1\";") == "1:5 a text is no value here");
  CHECK(complaints("x = '01';") == "1:5 a text is no value here");
}

TEST_CASE("what stands in the wrong place is named, with what would fit") {
  CHECK(complaints("x = 5 +;") == "1:8 expected an expression, found ';'");
  CHECK(complaints("rx(1, 2;") == "1:8 expected ')', found ';'");
  CHECK(complaints("cx q[0] q[1];") == "1:9 expected ',' or ';' before 'q'");
  CHECK(complaints("let = 3;") == "1:5 expected a name, found '='");
  CHECK(complaints("const x = 3;") == "1:7 expected a type, found 'x'");
  CHECK(complaints("reset ;") == "1:7 expected an operand, found ';'");
  CHECK(complaints("qubit box;") == "1:7 'box' is a reserved word and cannot be a name");
  CHECK(complaints("gate end q { }") == "1:6 'end' is a reserved word and cannot be a name");
  CHECK(complaints("OPENQASM three;") == "1:10 expected the version of the language, found 'three'");
  CHECK(complaints("OPENQASM 3.x;") == "1:10 '3.x' is not a number");
  CHECK(complaints("while a { }") == "1:7 expected '(', found 'a'");
  CHECK(complaints("gate g { }") == "1:6 the gate 'g' names no qubits to act on");
  CHECK(complaints("f(x) = 3;") == "1:1 only a variable can be assigned to");
  CHECK(complaints("a + b = 3;") == "1:1 only a variable can be assigned to");
  CHECK(complaints("a += measure q;") == "1:6 a measurement is assigned with '='");
  CHECK(complaints("@\nx q;") == "1:1 an annotation needs a name directly after '@'");
  CHECK(complaints("@note\n") == "2:1 an annotation must be followed by a statement");
  CHECK(complaints("x = gphase(2);") == "1:5 expected an expression, found 'gphase'");
  CHECK(complaints("\"abc\";") == "1:1 a statement cannot begin with '\"abc\"'");
  CHECK(complaints("x = a ~= b;") == "1:7 expected ';', found '~'");
}

TEST_CASE("habits from other languages get an answer of their own") {
  const auto helped = [](const char* text, const char* help) {
    const auto it = read(text);
    REQUIRE(it.messages.size() == 1);
    REQUIRE(it.messages[0].notes.size() == 1);
    return it.messages[0].notes[0].find(help) != std::string::npos;
  };
  CHECK(helped("if (true);", "no empty statement"));
  CHECK(helped("qubit q[3];", "qubit[2] q;"));
  CHECK(helped("for i in [0:3] { }", "for int i in"));
  CHECK(helped("for (int i = 0; i < 3; i++) { x q; }", "for int i in"));
  CHECK(helped("if (a = 3) { x q; } else { y q; }", "'==' compares"));
  CHECK(helped("i++;", "i += 1"));
  CHECK(helped("x = 2 * measure q;", "measure into a bit first"));
  CHECK(helped("if (measure q) x q;", "measure into a bit first"));
  CHECK(helped("include stdgates.inc;", "include \"stdgates.inc\""));
  CHECK(helped("gate h(float a) q { }", "gate g(angle1)"));
  CHECK(helped("def f(a, b) { }", "qubit q"));
}

TEST_CASE("all independent errors in one run, in blocks too") {
  CHECK(complaints("gate g a { h a; ) x a; y 3; z a; }\nreset;\nx q;\ny q[;\nz q;") ==
        "1:17 a statement cannot begin with ')'\n"
        "1:26 expected ';', found '3'\n"
        "2:6 expected an operand, found ';'\n"
        "4:5 expected an expression or ':', found ';'");
  CHECK(shown("if x { a q; } else { b q; }\nc q;") == "call c q !1:4 expected '(', found 'x'");
  CHECK(shown("a = {1, 2 3};\nc q;") == "call c q !1:11 expected '}' or ',', found '3'");
  CHECK(shown("x q; } y q;") == "call x q; call y q !1:6 this '}' closes nothing");
  CHECK(shown("else x q; y q;") == "call y q !1:1 'else' without an 'if' before it");
  CHECK(shown("a = 'b;\nc q;") == "call c q !1:5 this text has no closing quote on its line");
}

TEST_CASE("an unclosed block is reported once, at its brace") {
  CHECK(complaints("x q;\nif (a) {\n  if (b) {\n y q;\n") == "3:10 this '{' is never closed");
  CHECK(complaints("cal { a { b }") == "1:5 this '{' is never closed");
  CHECK(complaints("rx(1,\n2\n") == "3:1 expected ')', found the end of the file");
}

TEST_CASE("the names of a skipped statement are handed on") {
  const auto it = read("qubit[2 q;\ngate foo a { h a }");
  REQUIRE(it.messages.size() == 2);
  CHECK(it.names == std::vector<std::string>{"q", "h", "a"});
}

TEST_CASE("a message shows its line, also when the line is huge") {
  const auto it = read("// \u03C6\n\u03C6 = 2 +;\r\n");
  REQUIRE(it.messages.size() == 1);
  CHECK(printed(it.messages[0]) ==
        "test.qasm:2:8: error: expected an expression, found ';'\n    \u03C6 = 2 +;\n           ^\n");
  const auto long_line = read(std::string(10000000, 'a') + " = 2 +; x q;");
  REQUIRE(long_line.messages.size() == 1);
  CHECK(long_line.messages[0].place.column == 10000007);
  CHECK(printed(long_line.messages[0]).size() < 300);
}

TEST_CASE("what is no text is refused with one message") {
  CHECK(complaints(std::string("x q;\n\0 y", 8)) ==
        "0:0 this is no text file: byte 5 is the control character 0x00 (line 2)");
  CHECK(complaints("x q;\n\xFFy q;") == "0:0 this is no UTF-8 text: byte 5 is 0xff (line 2)");
  CHECK(complaints("\xC0\xAF") == "0:0 this is no UTF-8 text: byte 0 is 0xc0 (line 1)");
  CHECK(complaints("\xED\xA0\x80") == "0:0 this is no UTF-8 text: byte 0 is 0xed (line 1)");
  CHECK(complaints("x\xE2\x84") == "0:0 this is no UTF-8 text: byte 1 is 0xe2 (line 1)");
}

namespace {

std::string repeated(const char* text, std::size_t times) {
  std::string result;
  for (std::size_t i = 0; i < times; ++i) result += text;
  return result;
}

}  // namespace

TEST_CASE("depth and length have limits that end in a message") {
  const std::size_t many = 100000;
  const char* deep[] = {"(", "{", "f(", "a[", "int(", "2*(", "durationof({x = "};
  for (const char* one : deep) {
    INFO(std::string(one));
    CHECK(complaints("x = " + repeated(one, many)).find("nested too deeply") != std::string::npos);
  }
  CHECK(complaints(repeated("{", many)) == "1:257 this is nested too deeply to be read");
  CHECK(complaints(repeated("if (a) ", many)).find("nested too deeply") != std::string::npos);
  CHECK(complaints(repeated("if (a) x q; else ", many)).find("nested too deeply") != std::string::npos);
  CHECK(complaints("x = " + repeated("-", many) + "1;") == "1:5 this expression has too many operators");
  CHECK(complaints("x = " + repeated("1+", many) + "1;") == "1:5 this expression has too many operators");
  CHECK(complaints("x = " + repeated("2**", many) + "1;") == "1:5 this expression has too many operators");
  CHECK(complaints("x = a" + repeated("[0]", 1000) + ";") == "1:5 this expression has too many operators");
  CHECK(complaints("x = {" + repeated("1,", many * 10) + "};").find("too long") != std::string::npos);
  CHECK(complaints("x = " + repeated("1+", 300) + "1;").empty());
  CHECK(complaints("x = " + repeated("(", 200) + "1" + repeated(")", 200) + ";").empty());
  CHECK(complaints(repeated("{", 200) + repeated("}", 200)).empty());
}

TEST_CASE("reading stops after a hundred errors") {
  const auto it = read(repeated(";", 100000));
  CHECK(it.messages.size() == 100);
  CHECK(it.messages.back().notes.back() == "note: too many errors; the rest is not read");
}
