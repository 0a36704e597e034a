// Classical code that is only known while the program runs: expressions, statements and branches, as data.
//
// The language room builds it, the output room prints it back as OpenQASM 3, passes only ask which bits and
// which blocks it touches. Names are those of the native program (renamed already where the source collided).
#pragma once

#include <cstdint>
#include <string>
#include <vector>

namespace isinglass {

/// A tree of one run-time expression. `text` is the operator, the literal, the called name or the type of a
/// cast.
struct Expression {
  enum class Kind : std::uint8_t {
    literal,   // text = the literal as OpenQASM writes it
    variable,  // variable = index into Circuit::variables
    input,     // variable = index into Circuit::inputs
    index,     // arguments = {indexed, index...}; an index may be a range
    range,     // arguments = {first, step, last}
    unary,     // text = operator, one argument
    binary,    // text = operator, two arguments
    call,      // text = function, arguments
    cast,      // text = type, one argument
    set,       // arguments = the elements of {a, b, c}
  };
  Kind kind = Kind::literal;
  std::uint32_t variable = 0;
  std::string text;
  std::vector<Expression> arguments;
};

/// OpenQASM 3 text of the expression with the fewest parentheses that keep its meaning.
std::string printed(const Expression& expression, const struct Circuit& circuit);

/// One classical variable of the program (source or made while compiling), declared at the top of the native
/// program.
struct Variable {
  std::string name;             // in the native program
  std::string source;           // its name in the source; empty when the compiler made it
  std::string type;             // as OpenQASM writes it: "bit[4]", "uint[8]", "bool", "array[int[8], 3]"
  std::uint32_t bits = 0;       // for bit and bit[n]: how many flat bits it has; else 0
  std::uint32_t first_bit = 0;  // index of its bit 0 among the circuit's flat bits
  bool is_scalar = false;       // `bit c` rather than `bit[1] c`
  bool is_output = false;
};

/// target = value; or, with no target, a bare call of an extern. Payload of Kind::classical.
struct ClassicalStatement {
  enum class Kind : std::uint8_t { assign, call, leave_loop, next_round, end_program, raw };
  Kind kind = Kind::assign;
  Expression target;
  std::string operation = "=";  // "=", "+=", ...
  Expression value;
  std::string text;  // of raw: a pragma or annotation line that is passed on
};

/// A branch or loop over blocks of the circuit. Payload of Kind::branch.
struct Branch {
  enum class Kind : std::uint8_t { if_else, while_loop, for_loop, switch_case };
  struct Arm {
    std::vector<Expression> labels;  // switch: the case's values; empty for `default`
    std::uint32_t block = 0;         // index into Circuit::blocks
  };
  Kind kind = Kind::if_else;
  Expression condition;  // if, while: the condition; switch: the selector; for: a set, range or variable
  std::uint32_t variable = 0;  // for: the loop variable
  std::vector<Arm> arms;       // if: then [, else]; loops: one; switch: one a case
};

}  // namespace isinglass
