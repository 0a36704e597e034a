// The grammar is shaped so that prediction never needs the full context, which costs five times the time: a
// parser that is allowed to use it reads programs of every form without one attempt.
#include <doctest/doctest.h>

#include "OpenQasm3Parser.h"
#include "language/tokens.h"

using namespace isinglass;

namespace {

struct Count : antlr4::BaseErrorListener {
  std::size_t attempts = 0;
  std::size_t errors = 0;

  void syntaxError(antlr4::Recognizer*, antlr4::Token*, std::size_t, std::size_t, const std::string&,
                   std::exception_ptr) override {
    ++errors;
  }
  void reportAmbiguity(antlr4::Parser*, const antlr4::dfa::DFA&, std::size_t, std::size_t, bool,
                       const antlrcpp::BitSet&, antlr4::atn::ATNConfigSet*) override {
    ++attempts;
  }
  void reportAttemptingFullContext(antlr4::Parser*, const antlr4::dfa::DFA&, std::size_t, std::size_t,
                                   const antlrcpp::BitSet&, antlr4::atn::ATNConfigSet*) override {
    ++attempts;
  }
};

Count read(const std::string& text) {
  Count count;
  Tokens tokens(text);
  tokens.restart({}, 3);
  TokenWindow window(tokens);
  OpenQasm3Parser parser(&window);
  parser.removeErrorListeners();
  parser.addErrorListener(&count);
  while (window.LA(1) != antlr4::Token::EOF) parser.statement();
  parser.setContext(nullptr);
  parser.getTreeTracker().reset();
  return count;
}

const std::string program = R"(OPENQASM 3.1;
include "stdgates.inc";
pragma keep
const int n = 4; input angle[32] theta; output bit[4] out;
qubit[n] q; qubit a; bit[4] c = "0011"; creg d[2]; qreg r[2];
array[int[8], 2, 3,] table = {{1, 2, 3}, {4, 5, 6,},};
gate g(x, y,) a, b, { U(x/2, -y, pi) a; cx a, b; gphase(x); ctrl @ gphase(y) a; }
gate nothing a { }
def f(qubit[2] z, int[8] k, readonly array[int[8], #dim = 2] t,) -> bit[2] { return measure z; }
def h(qreg z[2]) { if (k == 1) { return; } }
extern e(int, float[32],) -> bool;
let al = q[0:2] ++ q[{3,}];
ctrl(2) @ negctrl @ inv @ pow(1/2) @ x q[0], q[1], q[2], a;
rx(pi/2)[100 ns] q[0]; h q; cx q[0], q[1],; rz(-3*pi/4 + 0.5) q[2]; gphase(pi/4);
for int i in [0:2:n-1] { h q[i]; if (i == 3) { x q[i]; } else if (i < 2) y q[0]; else z q[1]; }
for uint[8] j in {1, 2, 3} x q[j];
for bit k in c { continue; }
if (c[0]) if (c[1]) x a; else y a; else z a;
if (c[0]) while (c[1]) if (c[2]) x a; else y a;
while (!c[0] && c[1] == true || false) { break; }
switch (table[0, 1]) { case 1, 2, { x q[0]; } case 3 { } default { y q[0]; } }
measure q[0] -> c[0]; c[1] = measure q[1]; bit z = measure a; reset q; barrier; barrier q, a; nop;
delay[2.5us + 3 ms] q[0]; box[10ms] { x q[0]; } duration dd = durationof({ x $0; }) * 2;
table[0, 1] = 3; table[0][1] += -2 ** 2; x1 <<= 3; c[1:2] = "01"; f(q, 3); e(1, 2.0);
float w = float[32](sin(pi) + 2.e3 * .5); complex[float[64]] cc = 1 + 2 im;
angle[20] ang = ~x & 0xF3 == 1 ^ 2 | 3 << 1;
@note here
x q[0];
cal { a { b } } defcal x $0 { } b = k(3) $0;
{ int y; y = 3; { } }
end;
)";

}  // namespace

TEST_CASE("prediction needs no full context") {
  const Count count = read(program);
  CHECK(count.errors == 0);
  CHECK(count.attempts == 0);
}
