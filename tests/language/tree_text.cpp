// Printing of syntax trees; see tree_text.h.
#include "language/tree_text.h"

#include <fmt/format.h>

namespace isinglass::tree_text {

using namespace isinglass::syntax;

namespace {

template <typename List, typename Show>
std::string joined(const List& list, const char* between, Show show) {
  std::string text;
  for (const auto& one : list) text += (text.empty() ? "" : between) + show(one);
  return text;
}

std::string list(const std::vector<Expression>& expressions) {
  return joined(expressions, " ", [](const Expression& one) { return shown(one); });
}

std::string list(const std::vector<Name>& names) {
  return joined(names, " ", [](const Name& one) { return one.text; });
}

std::string block(const std::vector<Statement>& statements) {
  return joined(statements, "; ", [](const Statement& one) { return shown(one); });
}

std::string maybe(const std::optional<Expression>& expression) {
  return expression ? "[" + tree_text::shown(*expression) + "]" : "";
}

const char* unit(Unit unit) {
  constexpr const char* table[] = {"", "ns", "us", "ms", "s", "dt"};
  return table[static_cast<int>(unit)];
}

struct Show {
  std::string operator()(const Version& it) const { return fmt::format("version {}.{}", it.major, it.minor); }
  std::string operator()(const Include& it) const { return "include " + it.path; }
  std::string operator()(const Pragma& it) const { return "pragma " + it.text; }
  std::string operator()(const QubitDeclaration& it) const {
    return (it.old_form ? "qreg" : "qubit") + maybe(it.size) + " " + it.name.text;
  }
  std::string operator()(const Declaration& it) const {
    constexpr const char* roles[] = {"", "const ", "input ", "output "};
    return roles[static_cast<int>(it.role)] + shown(it.type) + " " + it.name.text +
           (it.value ? " = " + shown(*it.value) : "") + (it.old_form ? " (creg)" : "");
  }
  std::string operator()(const Alias& it) const { return "let " + it.name.text + " = " + shown(it.value); }
  std::string operator()(const GateDefinition& it) const {
    return fmt::format("{} {}({}) {} {}", it.opaque ? "opaque" : "gate", it.name.text, list(it.parameters),
                       list(it.qubits), it.opaque ? "" : shown(it.body));
  }
  std::string operator()(const Subroutine& it) const {
    const std::string parameters = joined(
        it.parameters, ", ", [](const Parameter& one) { return shown(one.type) + " " + one.name.text; });
    return fmt::format("def {}({}) -> {} {}", it.name.text, parameters, shown(it.result), shown(it.body));
  }
  std::string operator()(const Extern& it) const {
    const std::string types = joined(it.parameters, ", ", [](const Type& one) { return shown(one); });
    return fmt::format("extern {}({}) -> {}", it.name.text, types, shown(it.result));
  }
  std::string operator()(const GateCall& it) const {
    std::string text;
    for (const Modifier& one : it.modifiers) {
      constexpr const char* kinds[] = {"inv", "pow", "ctrl", "negctrl"};
      text += kinds[static_cast<int>(one.kind)];
      if (one.argument) text += "(" + shown(*one.argument) + ")";
      text += " @ ";
    }
    text += "call " + it.name.text;
    if (it.parentheses) text += "(" + list(it.angles) + ")";
    text += maybe(it.duration);
    return text + " " + list(it.operands);
  }
  std::string operator()(const Measurement& it) const {
    return "measure " + shown(it.qubits) + (it.target ? " -> " + shown(*it.target) : "");
  }
  std::string operator()(const Reset& it) const { return "reset " + shown(it.qubits); }
  std::string operator()(const Barrier& it) const { return "barrier " + list(it.operands); }
  std::string operator()(const Nop& it) const { return "nop " + list(it.operands); }
  std::string operator()(const Delay& it) const {
    return "delay[" + shown(it.length) + "] " + list(it.operands);
  }
  std::string operator()(const Box& it) const { return "box" + maybe(it.length) + " " + shown(it.body); }
  std::string operator()(const Assignment& it) const {
    return fmt::format("{} {}= {}", shown(it.target), spelling(it.op), shown(it.value));
  }
  std::string operator()(const ExpressionStatement& it) const { return shown(it.value); }
  std::string operator()(const Return& it) const {
    return "return" + (it.value ? " " + shown(*it.value) : "");
  }
  std::string operator()(const Break&) const { return "break"; }
  std::string operator()(const Continue&) const { return "continue"; }
  std::string operator()(const End&) const { return "end"; }
  std::string operator()(const If& it) const {
    return fmt::format("if {} {}", shown(it.condition), shown(it.then)) +
           (it.otherwise ? " else " + shown(*it.otherwise) : "");
  }
  std::string operator()(const For& it) const {
    return fmt::format("for {} {} in {} {}", shown(it.type), it.name.text, shown(it.over), shown(it.body));
  }
  std::string operator()(const While& it) const {
    return "while " + shown(it.condition) + " " + shown(it.body);
  }
  std::string operator()(const Switch& it) const {
    std::string text = "switch " + shown(it.selector);
    for (const Switch::Case& one : it.cases) {
      text += one.labels.empty() ? " default " : " case " + list(one.labels) + " ";
      text += shown(one.body);
    }
    return text;
  }
  std::string operator()(const Body& it) const { return tree_text::shown(it); }
  std::string operator()(const Calibration& it) const {
    constexpr const char* kinds[] = {"cal", "defcal", "defcalgrammar"};
    return kinds[static_cast<int>(it.kind)] + (" <" + it.text + ">");
  }
};

}  // namespace

std::string shown(const Expression& it) {
  using Kind = Expression::Kind;
  switch (it.kind) {
    case Kind::integer:
    case Kind::real:
    case Kind::boolean:
    case Kind::name:
    case Kind::hardware:
      return it.text;
    case Kind::imaginary:
      return it.text + "im";
    case Kind::timing:
      return it.text + unit(it.unit);
    case Kind::bit_string:
      return "\"" + it.text + "\"";
    case Kind::unary:
      return fmt::format("({} {})", spelling(it.op), shown(it.arguments[0]));
    case Kind::binary:
      return fmt::format("({} {})", spelling(it.op), list(it.arguments));
    case Kind::call:
      return fmt::format("{}({})", it.text, list(it.arguments));
    case Kind::cast:
      return fmt::format("{}({})", shown(it.type[0]), shown(it.arguments[0]));
    case Kind::index: {
      const std::vector<Expression> indices(it.arguments.begin() + 1, it.arguments.end());
      return fmt::format("{}[{}]", shown(it.arguments[0]), list(indices));
    }
    case Kind::range:
      return joined(it.arguments, ":", [](const Expression& one) { return shown(one); });
    case Kind::set:
      return "{" + list(it.arguments) + "}";
    case Kind::absent:
      return "_";
    case Kind::measure:
      return "measure " + shown(it.arguments[0]);
    case Kind::durationof:
      return "durationof{" + block(it.body) + "}";
    case Kind::defcal_call:
      return fmt::format("defcal_call {}({})", it.text, list(it.arguments));
  }
  return "?";
}

std::string shown(const Body& body) {
  return fmt::format(fmt::runtime(body.braces ? "{{{}}}" : "<{}>"), block(body.statements));
}

std::string shown(const Type& it) {
  constexpr const char* kinds[] = {"",        "bit",      "bool",    "int",   "uint",  "float", "angle",
                                   "complex", "duration", "stretch", "qubit", "array", "void"};
  constexpr const char* access[] = {"", "readonly ", "mutable "};
  std::string text = access[static_cast<int>(it.access)] + std::string(kinds[static_cast<int>(it.kind)]);
  for (const Expression& one : it.width) text += "[" + shown(one) + "]";
  for (const Type& one : it.element) text += "<" + shown(one) + ">";
  for (const Expression& one : it.dimension_count) text += "[#" + shown(one) + "]";
  if (!it.dimensions.empty()) text += "[" + list(it.dimensions) + "]";
  return text;
}

std::string shown(const Statement& statement) {
  std::string text;
  for (const Annotation& one : statement.annotations) text += fmt::format("@{}<{}> ", one.name, one.text);
  return text + std::visit(Show{}, statement.what);
}

bool Collector::plain_call(const PlainCall& call, const PlainNames& numbered) {
  if (!fast) return false;
  std::string text(numbered[call.gate]);
  text += call.parentheses ? "(" : "";
  text += joined(call.angles, " ", [](double angle) { return fmt::format("{}", angle); });
  text += call.parentheses ? ") " : " ";
  text += joined(call.operands, " ", [&](const PlainOperand& one) {
    return std::string(numbered[one.name]) + (one.index < 0 ? "" : fmt::format("[{}]", one.index));
  });
  plain.push_back(text);
  return true;
}

void Collector::statement(Statement&& statement) {
  statements.push_back(std::move(statement));
}

void Collector::syntax_message(Message message, std::vector<std::string> skipped) {
  messages.push_back(std::move(message));
  names.insert(names.end(), skipped.begin(), skipped.end());
}

Collector read(std::string text, int version, bool fast) {
  Sources sources;
  Collector collector;
  collector.version = version;
  collector.fast = fast;
  read_statements(sources, sources.keep("test.qasm", std::move(text)), collector);
  return collector;
}

std::string shown(std::string text, int version) {
  const Collector collector = read(std::move(text), version);
  std::string result = block(collector.statements);
  for (const Message& one : collector.messages) {
    result += fmt::format(" !{}:{} {}", one.place.line, one.place.column, one.text);
  }
  return result;
}

std::string complaints(std::string text, int version) {
  return joined(read(std::move(text), version).messages, "\n", [](const Message& one) {
    return fmt::format("{}:{} {}", one.place.line, one.place.column, one.text);
  });
}

}  // namespace isinglass::tree_text
