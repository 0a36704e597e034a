// Printing of run-time expressions as OpenQASM 3; see classical.h.
#include "circuit/classical.h"

#include <array>
#include <string_view>
#include <utility>

#include "circuit/circuit.h"

namespace isinglass {

namespace {

/// How strongly an operator binds, from the table of the OpenQASM 3 standard.
constexpr int strength_of_power = 12;
constexpr int strength_of_unary = 11;
constexpr int strength_of_names = 13;

int binary_strength(std::string_view op) {
  constexpr std::array<std::pair<std::string_view, int>, 19> table = {{{"**", strength_of_power},
                                                                       {"*", 10},
                                                                       {"/", 10},
                                                                       {"%", 10},
                                                                       {"+", 9},
                                                                       {"-", 9},
                                                                       {"<<", 8},
                                                                       {">>", 8},
                                                                       {"<", 7},
                                                                       {"<=", 7},
                                                                       {">", 7},
                                                                       {">=", 7},
                                                                       {"==", 6},
                                                                       {"!=", 6},
                                                                       {"&", 5},
                                                                       {"^", 4},
                                                                       {"|", 3},
                                                                       {"&&", 2},
                                                                       {"||", 1}}};
  for (const auto& [text, strength] : table) {
    if (text == op) return strength;
  }
  return 1;
}

int strength(const Expression& e) {
  if (e.kind == Expression::Kind::binary) return binary_strength(e.text);
  if (e.kind == Expression::Kind::unary) return strength_of_unary;
  if (e.kind == Expression::Kind::literal && e.text.starts_with('-')) return strength_of_unary;
  if (e.kind == Expression::Kind::range) return 0;
  return strength_of_names;
}

struct Printer {
  const Circuit& circuit;
  std::string text;

  /// In parentheses if it binds less strongly than `least`.
  void print(const Expression& e, int least) {
    const bool needs_parentheses = strength(e) < least;
    if (needs_parentheses) text += "(";
    print(e);
    if (needs_parentheses) text += ")";
  }

  void print_list(const Expression& e, std::size_t first, std::string_view separator) {
    for (std::size_t i = first; i < e.arguments.size(); ++i) {
      if (i > first) text += separator;
      print(e.arguments[i]);
    }
  }

  void print(const Expression& e) {
    switch (e.kind) {
      case Expression::Kind::literal:
        text += e.text;
        break;
      case Expression::Kind::variable:
        text += circuit.variables[e.variable].name;
        break;
      case Expression::Kind::input:
        text += circuit.inputs[e.variable].name;
        break;
      case Expression::Kind::index:
        print(e.arguments[0], strength_of_names);
        text += "[";
        print_list(e, 1, ", ");
        text += "]";
        break;
      case Expression::Kind::range:
        print_list(e, 0, ":");
        break;
      case Expression::Kind::unary:
        text += e.text;
        print(e.arguments[0], strength_of_unary);
        break;
      case Expression::Kind::binary: {
        const int own = binary_strength(e.text);
        const bool is_power = own == strength_of_power;  // the only one that groups from the right
        print(e.arguments[0], is_power ? own + 1 : own);
        text += " " + e.text + " ";
        print(e.arguments[1], is_power ? own : own + 1);
        break;
      }
      case Expression::Kind::call:
      case Expression::Kind::cast:
        text += e.text + "(";
        print_list(e, 0, ", ");
        text += ")";
        break;
      case Expression::Kind::set:
        text += "{";
        print_list(e, 0, ", ");
        text += "}";
        break;
    }
  }
};

}  // namespace

std::string printed(const Expression& expression, const Circuit& circuit) {
  Printer printer{circuit, {}};
  printer.print(expression);
  return std::move(printer.text);
}

}  // namespace isinglass
