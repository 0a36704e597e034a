// The syntax tree of one statement of OpenQASM 3 or 2, as the parser hands it on: plain values, no meaning
// yet.
//
// What is written is kept (names, literals, which form of a statement); what it means (types, scopes, values,
// which of several readings of a call holds) is decided where the tree is consumed. Only two things are
// settled here: operators are nested by their precedence, and in OpenQASM 2 `^` is a power.
//
// Every depth is bounded (max_nesting in parser.h), so recursion over a tree is safe.
#pragma once

#include <cstdint>
#include <optional>
#include <string>
#include <variant>
#include <vector>

namespace isinglass::syntax {

/// A stretch of source text. `source` and `offset` find the text again (see source.h); line and column count
/// from 1, column and length in Unicode characters; a length never reaches beyond the first line.
struct Span {
  std::uint32_t offset = 0;  // of the first byte
  std::uint32_t line = 0;    // 0 = nowhere
  std::uint32_t column = 0;
  std::uint16_t length = 1;
  std::uint16_t source = 0;  // index in Sources
};

/// A name where it is declared or called.
struct Name {
  std::string text;
  Span at;
};

enum class Operator : std::uint8_t {
  none,
  power,
  negate,
  logical_not,
  bit_not,
  times,
  divide,
  remainder,
  plus,
  minus,
  shift_left,
  shift_right,
  less,
  less_equal,
  greater,
  greater_equal,
  equal,
  not_equal,
  bit_and,
  bit_xor,
  bit_or,
  logical_and,
  logical_or,
  concatenate,  // `++`
};

/// As written: "**", "-", "<<", ...; empty for none.
const char* spelling(Operator op);

enum class Unit : std::uint8_t { none, ns, us, ms, s, dt };

struct Type;

/// One expression. What the fields hold depends on the kind; those not named are empty.
struct Expression {
  enum class Kind : std::uint8_t {
    integer,      // text = as written, without `_`: "42", "0x1F", "0b10", of any size
    real,         // text = as written, without `_`: "1.", ".5", "2e10"
    imaginary,    // text = the number before `im`
    timing,       // text = the number, unit
    boolean,      // text = "true" or "false"
    bit_string,   // text = the characters 0 and 1 without `_`, rightmost = index 0
    name,         // text = identifier (pi and the other built-in names too)
    hardware,     // text = "$0"
    unary,        // op, arguments = {operand}
    binary,       // op, arguments = {left, right}
    call,         // text = function, arguments; sizeof, sin, real and popcount too
    cast,         // type, arguments = {value}
    index,        // arguments = {indexed, index...}: `a[i, j]` has three; `a[i][j]` nests
    range,        // arguments = {first, step, last}, as in `first:step:last`; an omitted one is `absent`
    set,          // arguments = the elements of `{a, b, c}`, in a for, an index or an array literal
    absent,       // an omitted part of a range
    measure,      // arguments = {qubits}; as value of a declaration or return
    durationof,   // body: the block
    defcal_call,  // text = name, arguments = {set of the parameters, operand...}: `b = f(x) $0;`
  };
  Kind kind = Kind::absent;
  Operator op = Operator::none;
  Unit unit = Unit::none;
  Span at;
  std::string text;
  std::vector<Expression> arguments;
  std::vector<Type> type;              // of a cast: exactly one
  std::vector<struct Statement> body;  // of durationof
};

/// A type as written.
struct Type {
  enum class Kind : std::uint8_t {
    none,  // no type was written
    bit,
    boolean,
    integer,
    uinteger,
    real,
    angle,
    complex,  // element = {real} or empty
    duration,
    stretch,
    qubit,
    array,    // element = {scalar}, dimensions or dimension_count, access
    nothing,  // `void`
  };
  enum class Access : std::uint8_t { none, readonly_, mutable_ };

  Kind kind = Kind::none;
  Access access = Access::none;
  Span at;
  std::vector<Expression> width;            // `[w]` of bit, int, uint, float, angle, qubit: none or one
  std::vector<Type> element;                // of complex and array
  std::vector<Expression> dimensions;       // of an array with explicit sizes
  std::vector<Expression> dimension_count;  // of `#dim = n`: one
};

/// The statements of `{ ... }`, or the one statement that stands in its place.
struct Body {
  std::vector<Statement> statements;
  bool braces = true;
  Span at;
};

/// `OPENQASM major.minor;`
struct Version {
  unsigned major = 3;
  unsigned minor = 0;
};

struct Include {
  std::string path;
  Span path_at;
};

/// The rest of the line after `pragma`, without surrounding blanks.
struct Pragma {
  std::string text;
};

/// `qubit[size] name;` or `qreg name[size];`
struct QubitDeclaration {
  Name name;
  std::optional<Expression> size;
  bool old_form = false;  // qreg
};

/// A classical variable or constant, `creg`, `input` and `output`.
struct Declaration {
  enum class Role : std::uint8_t { variable, constant, input, output };
  Role role = Role::variable;
  Type type;  // of creg: bit[size]
  Name name;
  std::optional<Expression> value;  // may be a measure, a set (array literal) or a defcal_call
  bool old_form = false;            // creg
};

/// `let name = value;`
struct Alias {
  Name name;
  Expression value;
};

/// `gate name(parameters) qubits { body }`, or `opaque name(parameters) qubits;`
struct GateDefinition {
  Name name;
  std::vector<Name> parameters;
  std::vector<Name> qubits;
  Body body;
  bool opaque = false;
};

struct Parameter {
  Type type;  // `qreg q[n]` and `creg c[n]` appear as qubit[n] and bit[n]
  Name name;
};

/// `def name(parameters) -> result { body }`
struct Subroutine {
  Name name;
  std::vector<Parameter> parameters;
  Type result;  // kind none when there is no arrow
  Body body;
};

/// `extern name(types) -> result;`
struct Extern {
  Name name;
  std::vector<Type> parameters;
  Type result;
};

/// `inv @`, `pow(k) @`, `ctrl @`, `ctrl(n) @`, `negctrl(n) @`
struct Modifier {
  enum class Kind : std::uint8_t { inv, pow, ctrl, negctrl };
  Kind kind = Kind::inv;
  std::optional<Expression> argument;
  Span at;
};

/// A gate applied to operands; U, CX and gphase too. In the source's order: modifiers outermost first.
/// `f(a) q;`, the obsolete form of a subroutine call, looks the same.
struct GateCall {
  std::vector<Modifier> modifiers;
  Name name;
  std::vector<Expression> angles;
  bool parentheses = false;            // `g()` rather than `g`
  std::optional<Expression> duration;  // `g(a)[d] q;`
  std::vector<Expression> operands;
};

/// `target = measure qubits;`, `measure qubits -> target;` or `measure qubits;`
struct Measurement {
  Expression qubits;
  std::optional<Expression> target;
};

struct Reset {
  Expression qubits;
};

/// Without operands: all qubits.
struct Barrier {
  std::vector<Expression> operands;
};

struct Nop {
  std::vector<Expression> operands;
};

/// `delay[length] operands;`
struct Delay {
  Expression length;
  std::vector<Expression> operands;
};

/// `box[length] { body }`
struct Box {
  std::optional<Expression> length;
  Body body;
};

/// `target op= value;`; op = none for plain `=`. The value may be a set (array literal) or a defcal_call,
/// never a measure: that is a Measurement.
struct Assignment {
  Expression target;
  Operator op = Operator::none;
  Expression value;
};

/// An expression as a statement, for instance the call of a subroutine. `g;`, a gate call without operands,
/// appears here as a name.
struct ExpressionStatement {
  Expression value;
};

struct Return {
  std::optional<Expression> value;  // may be a measure
};

struct Break {};
struct Continue {};
struct End {};

struct If {
  Expression condition;
  Body then;
  std::optional<Body> otherwise;
};

/// `for type name in over body`; `over` is a range, a set, or any other expression.
struct For {
  Type type;
  Name name;
  Expression over;
  Body body;
};

struct While {
  Expression condition;
  Body body;
};

struct Switch {
  struct Case {
    std::vector<Expression> labels;  // empty for `default`
    Body body;
    Span at;
  };
  Expression selector;
  std::vector<Case> cases;  // in the source's order, `default` among them
};

/// `cal { }`, `defcal ... { }` and `defcalgrammar "...";`: kept as text.
struct Calibration {
  enum class Kind : std::uint8_t { block, definition, grammar };
  Kind kind = Kind::block;
  std::string text;  // what follows the keyword
};

struct Annotation {
  std::string name;  // without `@`
  std::string text;  // the rest of the line, without surrounding blanks
  Span at;
  std::uint32_t last_line = 0;  // of the statement that it stands above
};

struct Statement {
  Span at;
  std::vector<Annotation> annotations;
  std::variant<Version, Include, Pragma, QubitDeclaration, Declaration, Alias, GateDefinition, Subroutine,
               Extern, GateCall, Measurement, Reset, Barrier, Nop, Delay, Box, Assignment,
               ExpressionStatement, Return, Break, Continue, End, If, For, While, Switch, Body, Calibration>
      what;
};

}  // namespace isinglass::syntax
