// Parser and simulator of OpenQASM 3 programs for tests; see interpreter.h.
#include "support/interpreter.h"

#include <cmath>
#include <cstdlib>
#include <functional>
#include <optional>
#include <set>
#include <stdexcept>

#include "support/standard_gates.h"

namespace isinglass::support {

namespace {

[[noreturn]] void fail(const std::string& what) {
  throw std::runtime_error("tests' interpreter: " + what);
}

// ---- tokens ----

struct Token {
  enum class Kind { word, number, text, sign, pragma, end };
  Kind kind;
  std::string text;
};

std::vector<Token> tokens_of(const std::string& text) {
  static const char* signs[] = {"<<=", ">>=", "**=", "->", "==", "!=", "<=", ">=", "&&", "||", "<<",
                                ">>",  "**",  "++",  "+=", "-=", "*=", "/=", "&=", "|=", "^=", "%="};
  std::vector<Token> tokens;
  std::size_t k = 0;
  const auto is_word = [](char c) {
    return std::isalnum(static_cast<unsigned char>(c)) || c == '_' || (c & 0x80) != 0;
  };
  while (k < text.size()) {
    const char c = text[k];
    if (std::isspace(static_cast<unsigned char>(c))) {
      ++k;
    } else if (text.compare(k, 2, "//") == 0) {
      while (k < text.size() && text[k] != '\n') ++k;
    } else if (text.compare(k, 2, "/*") == 0) {
      k = text.find("*/", k) + 2;
    } else if (text.compare(k, 7, "pragma ") == 0) {
      const std::size_t end = std::min(text.find('\n', k), text.size());
      tokens.push_back({Token::Kind::pragma, text.substr(k + 7, end - k - 7)});
      k = end;
    } else if (std::isdigit(static_cast<unsigned char>(c)) ||
               (c == '.' && k + 1 < text.size() && std::isdigit(static_cast<unsigned char>(text[k + 1])))) {
      std::size_t end = k;
      const bool is_based = c == '0' && k + 1 < text.size() &&
                            std::isalpha(static_cast<unsigned char>(text[k + 1])) && text[k + 1] != 'e' &&
                            text[k + 1] != 'E';
      while (end < text.size() && (is_word(text[end]) || text[end] == '.' ||
                                   (!is_based && (text[end] == '+' || text[end] == '-') &&
                                    (text[end - 1] == 'e' || text[end - 1] == 'E')))) {
        ++end;
      }
      tokens.push_back({Token::Kind::number, text.substr(k, end - k)});
      k = end;
    } else if (is_word(c)) {
      std::size_t end = k;
      while (end < text.size() && is_word(text[end])) ++end;
      tokens.push_back({Token::Kind::word, text.substr(k, end - k)});
      k = end;
    } else if (c == '"') {
      const std::size_t end = text.find('"', k + 1);
      tokens.push_back({Token::Kind::text, text.substr(k + 1, end - k - 1)});
      k = end + 1;
    } else {
      std::string sign(1, c);
      for (const char* longer : signs) {
        if (text.compare(k, std::string(longer).size(), longer) == 0) {
          sign = longer;
          break;
        }
      }
      tokens.push_back({Token::Kind::sign, sign});
      k += sign.size();
    }
  }
  tokens.push_back({Token::Kind::end, ""});
  return tokens;
}

// ---- values ----

enum class Type { boolean, bits, integer, natural, real, angle };

struct Value {
  Type type = Type::boolean;
  int width = 1;
  std::uint64_t pattern = 0;
  double x = 0;
};

std::uint64_t low_bits(int width) {
  return width >= 64 ? ~0ull : (1ull << width) - 1;
}

std::int64_t signed_of(const Value& v) {
  if (v.type == Type::real) return static_cast<std::int64_t>(v.x);
  if (v.type == Type::integer && v.width < 64 && (v.pattern >> (v.width - 1) & 1)) {
    return static_cast<std::int64_t>(v.pattern | ~low_bits(v.width));
  }
  return static_cast<std::int64_t>(v.pattern);
}

double real_of(const Value& v) {
  if (v.type == Type::real) return v.x;
  if (v.type == Type::angle) return static_cast<double>(v.pattern) * std::ldexp(2 * pi, -v.width);
  if (v.type == Type::integer) return static_cast<double>(signed_of(v));
  return static_cast<double>(v.pattern);
}

bool is_true(const Value& v) {
  return v.type == Type::real ? v.x != 0 : v.pattern != 0;
}

Value make_real(double x) {
  return {Type::real, 64, 0, x};
}
Value make_integer(std::int64_t n, int width = 64) {
  return {Type::integer, width, static_cast<std::uint64_t>(n) & low_bits(width), 0};
}
Value make_boolean(bool b) {
  return {Type::boolean, 1, b ? 1u : 0u, 0};
}

Value converted(const Value& v, Type type, int width) {
  if (type == Type::real) return make_real(real_of(v));
  if (type == Type::boolean) return make_boolean(is_true(v));
  if (type == Type::angle) {
    if (v.type == Type::angle && v.width != width) {
      return {type, width, v.width < width ? v.pattern << (width - v.width) : v.pattern >> (v.width - width),
              0};
    }
    if (v.type == Type::real || v.type == Type::integer) {
      double turns = real_of(v) / (2 * pi);
      turns -= std::floor(turns);
      const double steps = std::nearbyint(std::ldexp(turns, width));
      return {type, width, steps >= std::ldexp(1.0, width) ? 0 : static_cast<std::uint64_t>(steps), 0};
    }
    return {type, width, v.pattern & low_bits(width), 0};
  }
  return {type, width, static_cast<std::uint64_t>(signed_of(v)) & low_bits(width), 0};
}

// ---- syntax ----

struct Tree {
  std::string kind;  // number, text, name, index, range, set, call, cast, measure, or an operator
  std::string text;
  std::vector<Tree> parts;
};

struct TypeName {
  Type type = Type::boolean;
  std::optional<Tree> width;
  bool is_bit = false;
};

struct Modifier {
  std::string name;
  std::optional<Tree> argument;
};

struct Statement {
  std::string kind;
  std::string name;
  TypeName type;
  std::vector<Tree> trees;          // parameters, conditions, operands: by kind
  std::vector<Tree> operands;       // qubits
  std::vector<Modifier> modifiers;  // leftmost first
  std::vector<std::vector<Statement>> blocks;
  std::vector<std::vector<Tree>> labels;  // of switch cases; empty for default
};

struct Definition {
  std::vector<std::string> parameters;
  std::vector<std::string> qubits;
  std::vector<Statement> body;
};

}  // namespace

struct Syntax {
  std::vector<Statement> statements;
  std::map<std::string, Definition> gates;
  std::vector<std::string> pragmas;
};

namespace {

class Parser {
 public:
  explicit Parser(const std::string& text) : tokens_(tokens_of(text)) {}

  Syntax program() {
    Syntax syntax;
    while (tokens_[at_].kind != Token::Kind::end) {
      if (tokens_[at_].kind == Token::Kind::pragma) {
        syntax.pragmas.push_back(tokens_[at_++].text);
      } else if (take("OPENQASM") || take("include")) {
        ++at_;
        expect(";");
      } else if (take("gate")) {
        const std::string name = word();
        syntax.gates[name] = definition();
      } else {
        syntax.statements.push_back(statement());
      }
    }
    return syntax;
  }

 private:
  bool peek(const std::string& text) const {
    return tokens_[at_].text == text && tokens_[at_].kind != Token::Kind::text &&
           tokens_[at_].kind != Token::Kind::pragma;
  }
  bool take(const std::string& text) {
    if (!peek(text)) return false;
    ++at_;
    return true;
  }
  void expect(const std::string& text) {
    if (!take(text)) fail("expected " + text + " before " + tokens_[at_].text);
  }
  std::string word() {
    if (tokens_[at_].kind != Token::Kind::word) fail("expected a name, not " + tokens_[at_].text);
    return tokens_[at_++].text;
  }

  Definition definition() {
    Definition gate;
    if (take("(")) {
      while (!take(")")) {
        gate.parameters.push_back(word());
        take(",");
      }
    }
    while (!peek("{")) {
      gate.qubits.push_back(word());
      take(",");
    }
    gate.body = block();
    return gate;
  }

  std::vector<Statement> block() {
    std::vector<Statement> statements;
    if (!take("{")) {
      statements.push_back(statement());
      return statements;
    }
    while (!take("}")) statements.push_back(statement());
    return statements;
  }

  bool at_type() const {
    for (const char* name : {"bit", "bool", "int", "uint", "float", "angle", "creg"}) {
      if (peek(name)) return true;
    }
    return false;
  }

  TypeName type() {
    static const std::map<std::string, Type> types = {
        {"bit", Type::bits},     {"creg", Type::bits},  {"bool", Type::boolean}, {"int", Type::integer},
        {"uint", Type::natural}, {"float", Type::real}, {"angle", Type::angle}};
    TypeName result;
    const std::string name = word();
    result.type = types.at(name);
    result.is_bit = name == "bit" || name == "creg";
    if (take("[")) {
      result.width = expression();
      expect("]");
    }
    return result;
  }

  Statement declaration(std::string kind) {
    Statement s;
    s.kind = std::move(kind);
    s.type = type();
    s.name = word();
    if (s.type.is_bit && take("[")) {  // creg c[4]
      s.type.width = expression();
      expect("]");
    }
    if (take("=")) s.trees.push_back(right_side());
    expect(";");
    return s;
  }

  Tree right_side() {
    if (!take("measure")) return expression();
    return {"measure", "", {expression()}};
  }

  Statement statement() {
    Statement s;
    if (tokens_[at_].kind == Token::Kind::pragma) {
      ++at_;
      s.kind = "nothing";
      return s;
    }
    if (take("input")) return declaration("input");
    if (take("output") || take("const")) return declaration("declare");
    if (at_type()) return declaration("declare");
    if (take("qubit") || take("qreg")) {
      s.kind = "qubit";
      if (take("[")) {
        s.trees.push_back(expression());
        expect("]");
      }
      s.name = word();
      if (take("[")) {
        s.trees.push_back(expression());
        expect("]");
      }
    } else if (take("reset") || take("barrier")) {
      s.kind = tokens_[at_ - 1].text;
      while (!peek(";")) {
        s.operands.push_back(expression());
        take(",");
      }
    } else if (take("delay")) {
      s.kind = "nothing";
      while (!peek(";")) ++at_;
    } else if (take("measure")) {
      s.kind = "measure";
      s.operands.push_back(expression());
      if (take("->")) s.trees.push_back(expression());
    } else if (take("if")) {
      s.kind = "if";
      expect("(");
      s.trees.push_back(expression());
      expect(")");
      s.blocks.push_back(block());
      if (take("else")) s.blocks.push_back(block());
      return s;
    } else if (take("while")) {
      s.kind = "while";
      expect("(");
      s.trees.push_back(expression());
      expect(")");
      s.blocks.push_back(block());
      return s;
    } else if (take("for")) {
      s.kind = "for";
      s.type = type();
      s.name = word();
      expect("in");
      s.trees.push_back(expression());
      s.blocks.push_back(block());
      return s;
    } else if (take("switch")) {
      s.kind = "switch";
      expect("(");
      s.trees.push_back(expression());
      expect(")");
      expect("{");
      while (!take("}")) {
        s.labels.emplace_back();
        if (!take("default")) {
          expect("case");
          do s.labels.back().push_back(expression());
          while (take(","));
        }
        s.blocks.push_back(block());
      }
      return s;
    } else if (peek("{")) {
      s.kind = "block";
      s.blocks.push_back(block());
      return s;
    } else if (take("break") || take("continue") || take("end")) {
      s.kind = tokens_[at_ - 1].text;
    } else {
      return call_or_assignment();
    }
    expect(";");
    return s;
  }

  Statement call_or_assignment() {
    Statement s;
    while (peek("ctrl") || peek("negctrl") || peek("inv") || peek("pow")) {
      Modifier modifier{word(), {}};
      if (take("(")) {
        modifier.argument = expression();
        expect(")");
      }
      expect("@");
      s.modifiers.push_back(std::move(modifier));
    }
    const std::size_t before = at_;
    s.kind = "gate";
    s.name = word();
    if (s.modifiers.empty() && s.name != "gphase") {
      at_ = before;
      Tree target = postfix();
      static const std::set<std::string> assigns = {
          "=", "+=", "-=", "*=", "/=", "&=", "|=", "^=", "%=", "<<=", ">>=", "**="};
      if (assigns.contains(tokens_[at_].text)) {
        s.kind = "assign";
        s.name = tokens_[at_++].text;
        s.trees = {std::move(target), right_side()};
        expect(";");
        return s;
      }
      at_ = before + 1;
    }
    if (take("(")) {
      while (!take(")")) {
        s.trees.push_back(expression());
        take(",");
      }
    }
    while (!peek(";")) {
      s.operands.push_back(expression());
      take(",");
    }
    expect(";");
    return s;
  }

  // Precedence from the weakest operator up.
  Tree expression(std::size_t level = 0) {
    static const std::vector<std::vector<std::string>> levels = {
        {"||"},       {"&&"},           {"|"},          {"^"}, {"&"}, {"==", "!="}, {"<", "<=", ">", ">="},
        {"<<", ">>"}, {"+", "-", "++"}, {"*", "/", "%"}};
    if (level == levels.size()) return unary();
    Tree left = expression(level + 1);
    while (true) {
      bool found = false;
      for (const std::string& sign : levels[level]) {
        if (tokens_[at_].kind != Token::Kind::sign || !take(sign)) continue;
        left = {sign, "binary", {std::move(left), expression(level + 1)}};
        found = true;
        break;
      }
      if (!found) return left;
    }
  }

  Tree unary() {
    for (const char* sign : {"-", "!", "~"}) {
      if (tokens_[at_].kind == Token::Kind::sign && take(sign)) return {sign, "unary", {unary()}};
    }
    Tree base = postfix();
    if (take("**")) return {"**", "binary", {std::move(base), unary()}};
    return base;
  }

  Tree range_or_expression() {
    Tree first = peek(":") ? Tree{"number", "0", {}} : expression();
    if (!take(":")) return first;
    Tree second = expression();
    if (!take(":")) return {"range", "", {std::move(first), {"number", "1", {}}, std::move(second)}};
    return {"range", "", {std::move(first), std::move(second), expression()}};
  }

  Tree postfix() {
    Tree tree = atom();
    while (take("[")) {
      Tree index{"index", "", {std::move(tree)}};
      do index.parts.push_back(range_or_expression());
      while (take(","));
      expect("]");
      tree = std::move(index);
    }
    return tree;
  }

  Tree atom() {
    const Token token = tokens_[at_];
    if (token.kind == Token::Kind::number) {
      ++at_;
      return {"number", token.text, {}};
    }
    if (token.kind == Token::Kind::text) {
      ++at_;
      return {"text", token.text, {}};
    }
    if (take("(")) {
      Tree inner = expression();
      expect(")");
      return inner;
    }
    if (take("{")) {
      Tree set{"set", "", {}};
      while (!take("}")) {
        set.parts.push_back(expression());
        take(",");
      }
      return set;
    }
    if (take("[")) {
      Tree range = range_or_expression();
      expect("]");
      return range;
    }
    if (at_type()) {
      const TypeName to = type();
      Tree cast{"cast", std::to_string(static_cast<int>(to.type)), {}};
      expect("(");
      cast.parts.push_back(expression());
      expect(")");
      if (to.width) cast.parts.push_back(*to.width);
      return cast;
    }
    const std::string name = word();
    if (!take("(")) return {"name", name, {}};
    Tree call{"call", name, {}};
    while (!take(")")) {
      call.parts.push_back(expression());
      take(",");
    }
    return call;
  }

  std::vector<Token> tokens_;
  std::size_t at_ = 0;
};

// ---- running ----

struct Variable {
  TypeName type;
  Value value;
  bool is_register = false;
  bool is_input = false;
};

/// What a path carries besides its place in the program.
struct World {
  State state;
  std::map<std::string, Variable> variables;
  std::vector<bool> is_measured;
};

enum class Flow { on, leave_loop, next_round, end };

/// Runs statements over a set of worlds: each statement maps worlds to worlds with a flow.
struct Arrival {
  World world;
  Flow flow = Flow::on;
};

class Interpreter {
 public:
  Interpreter(const Program& program, const RunOptions& options)
      : syntax_(program.syntax()), options_(options) {
    for (std::size_t k = 0; k < program.qubits().size(); ++k) wire_[program.qubits()[k]] = k;
  }

  std::vector<Arrival> run(World world) { return block(syntax_.statements, std::move(world)); }

 private:
  using Wires = std::vector<std::uint32_t>;

  std::vector<Arrival> block(const std::vector<Statement>& statements, World world) {
    std::vector<Arrival> done;
    std::vector<Arrival> going;
    going.push_back({std::move(world), Flow::on});
    for (const Statement& s : statements) {
      std::vector<Arrival> next;
      for (Arrival& arrival : going) {
        for (Arrival& after : statement(s, std::move(arrival.world))) {
          (after.flow == Flow::on ? next : done).push_back(std::move(after));
        }
      }
      going = std::move(next);
    }
    for (Arrival& arrival : going) done.push_back(std::move(arrival));
    return done;
  }

  static std::vector<Arrival> one(World world, Flow flow = Flow::on) {
    std::vector<Arrival> result;
    result.push_back({std::move(world), flow});
    return result;
  }

  std::vector<Arrival> statement(const Statement& s, World world) {
    if (s.kind == "nothing" || s.kind == "barrier" || s.kind == "qubit") return one(std::move(world));
    if (s.kind == "break") return one(std::move(world), Flow::leave_loop);
    if (s.kind == "continue") return one(std::move(world), Flow::next_round);
    if (s.kind == "end") return one(std::move(world), Flow::end);
    if (s.kind == "block") return block(s.blocks[0], std::move(world));
    if (s.kind == "input" || s.kind == "declare") return declare(s, std::move(world));
    if (s.kind == "gate") {
      gate_call(s, world, {}, {});
      return one(std::move(world));
    }
    if (s.kind == "assign") {
      if (s.trees[1].kind == "measure") return measure(s.trees[1].parts[0], &s.trees[0], std::move(world));
      Value value = evaluate(s.trees[1], world);
      if (s.name != "=") {
        value = binary(s.name.substr(0, s.name.size() - 1), evaluate(s.trees[0], world), value);
      }
      assign(s.trees[0], value, world);
      return one(std::move(world));
    }
    if (s.kind == "measure") {
      return measure(s.operands[0], s.trees.empty() ? nullptr : &s.trees[0], std::move(world));
    }
    if (s.kind == "reset") {
      std::vector<Arrival> going = one(std::move(world));
      for (const Tree& operand : s.operands) {
        for (const auto wire : wires(operand, going[0].world)) {
          std::vector<Arrival> next;
          for (Arrival& arrival : going) {
            for (auto& [outcome, split] : split_by(wire, std::move(arrival.world))) {
              if (outcome) split.state.apply(pauli_x(), Wires{wire});
              split.is_measured[wire] = false;
              next.push_back({std::move(split), Flow::on});
            }
          }
          going = std::move(next);
        }
      }
      return going;
    }
    if (s.kind == "if") {
      const bool yes = is_true(evaluate(s.trees[0], world));
      if (yes) return block(s.blocks[0], std::move(world));
      if (s.blocks.size() > 1) return block(s.blocks[1], std::move(world));
      return one(std::move(world));
    }
    if (s.kind == "switch") return chosen(s, std::move(world));
    if (s.kind == "while") return while_loop(s, std::move(world));
    if (s.kind == "for") return for_loop(s, std::move(world));
    fail("statement " + s.kind);
  }

  std::vector<Arrival> declare(const Statement& s, World world) {
    Variable variable;
    variable.type = s.type;
    int width = s.type.type == Type::boolean || s.type.is_bit ? 1 : 64;
    if (s.type.width) width = static_cast<int>(signed_of(evaluate(*s.type.width, world)));
    variable.is_register = s.type.is_bit && s.type.width.has_value();
    variable.value = {s.type.type, width, 0, 0};
    variable.is_input = s.kind == "input";
    if (s.kind == "input") {
      variable.value = converted(make_real(options_.inputs.at(s.name)), s.type.type, width);
    }
    const bool measures = !s.trees.empty() && s.trees[0].kind == "measure";
    if (!s.trees.empty() && !measures)
      variable.value = converted(evaluate(s.trees[0], world), s.type.type, width);
    world.variables[s.name] = variable;
    if (!measures) return one(std::move(world));
    const Tree target{"name", s.name, {}};
    return measure(s.trees[0].parts[0], &target, std::move(world));
  }

  std::vector<Arrival> chosen(const Statement& s, World world) {
    const std::int64_t selector = signed_of(evaluate(s.trees[0], world));
    std::optional<std::size_t> otherwise;
    for (std::size_t k = 0; k < s.blocks.size(); ++k) {
      if (s.labels[k].empty()) otherwise = k;
      for (const Tree& label : s.labels[k]) {
        if (signed_of(evaluate(label, world)) == selector) return block(s.blocks[k], std::move(world));
      }
    }
    if (otherwise) return block(s.blocks[*otherwise], std::move(world));
    return one(std::move(world));
  }

  std::vector<Arrival> while_loop(const Statement& s, World world) {
    std::vector<Arrival> done;
    std::vector<World> going;
    going.push_back(std::move(world));
    while (!going.empty()) {
      World here = std::move(going.back());
      going.pop_back();
      if (here.state.norm2() < options_.least_weight) continue;
      if (!is_true(evaluate(s.trees[0], here))) {
        done.push_back({std::move(here), Flow::on});
        continue;
      }
      for (Arrival& after : block(s.blocks[0], std::move(here))) {
        if (after.flow == Flow::end) {
          done.push_back(std::move(after));
        } else if (after.flow == Flow::leave_loop) {
          done.push_back({std::move(after.world), Flow::on});
        } else {
          going.push_back(std::move(after.world));
        }
      }
    }
    return done;
  }

  std::vector<Arrival> for_loop(const Statement& s, World world) {
    std::vector<Value> values;
    const Tree& over = s.trees[0];
    if (over.kind == "range" || over.kind == "set") {
      values = listed(over, world);
    } else {
      const Value bits = evaluate(over, world);
      for (int k = 0; k < bits.width; ++k) values.push_back({Type::bits, 1, bits.pattern >> k & 1, 0});
    }
    std::vector<Arrival> done;
    std::vector<World> going;
    going.push_back(std::move(world));
    for (const Value& value : values) {
      std::vector<World> next;
      for (World& here : going) {
        int width = 64;
        if (s.type.width) width = static_cast<int>(signed_of(evaluate(*s.type.width, here)));
        Variable variable;
        variable.type = s.type;
        variable.value = converted(value, s.type.type, s.type.type == Type::boolean ? 1 : width);
        here.variables[s.name] = variable;
        for (Arrival& after : block(s.blocks[0], std::move(here))) {
          if (after.flow == Flow::end) {
            done.push_back(std::move(after));
          } else if (after.flow == Flow::leave_loop) {
            done.push_back({std::move(after.world), Flow::on});
          } else {
            next.push_back(std::move(after.world));
          }
        }
      }
      going = std::move(next);
    }
    for (World& here : going) done.push_back({std::move(here), Flow::on});
    for (Arrival& arrival : done) arrival.world.variables.erase(s.name);
    return done;
  }

  // -- measuring --

  std::vector<std::pair<bool, World>> split_by(std::uint32_t wire, World world) {
    std::vector<std::pair<bool, World>> result;
    World other = world;
    if (world.state.project(wire, false) >= options_.least_weight)
      result.emplace_back(false, std::move(world));
    if (other.state.project(wire, true) >= options_.least_weight) result.emplace_back(true, std::move(other));
    return result;
  }

  std::vector<Arrival> measure(const Tree& operand, const Tree* target, World world) {
    const Wires measured = wires(operand, world);
    std::vector<std::pair<std::uint64_t, World>> going;
    going.emplace_back(0, std::move(world));
    for (std::size_t k = 0; k < measured.size(); ++k) {
      std::vector<std::pair<std::uint64_t, World>> next;
      for (auto& [pattern, here] : going) {
        for (auto& [outcome, split] : split_by(measured[k], std::move(here))) {
          split.is_measured[measured[k]] = true;
          next.emplace_back(pattern | std::uint64_t(outcome) << k, std::move(split));
        }
      }
      going = std::move(next);
    }
    std::vector<Arrival> result;
    for (auto& [pattern, here] : going) {
      if (target != nullptr)
        assign(*target, {Type::bits, static_cast<int>(measured.size()), pattern, 0}, here);
      result.push_back({std::move(here), Flow::on});
    }
    return result;
  }

  // -- gates --

  using Scope = std::map<std::string, std::uint32_t>;  // qubit arguments of a gate
  using Numbers = std::map<std::string, double>;       // its parameters

  void gate_call(const Statement& s, World& world, const Scope& scope, const Numbers& numbers) {
    World* with = &world;
    World inner;
    if (!numbers.empty()) {  // parameters hide variables
      inner.variables = world.variables;
      for (const auto& [name, x] : numbers) inner.variables[name].value = make_real(x);
      with = &inner;
    }
    std::vector<Wires> operands;
    std::size_t repeat = 1;
    for (const Tree& operand : s.operands) {
      if (operand.kind == "name" && scope.contains(operand.text)) {
        operands.push_back({scope.at(operand.text)});
      } else {
        operands.push_back(wires(operand, *with));
      }
      repeat = std::max(repeat, operands.back().size());
    }
    std::vector<double> parameters;
    for (const Tree& tree : s.trees) parameters.push_back(real_of(evaluate(tree, *with)));
    const Matrix matrix = modified(s, parameters, *with);
    for (std::size_t k = 0; k < repeat; ++k) {
      Wires targets;
      for (const Wires& list : operands) targets.push_back(list.size() == 1 ? list[0] : list.at(k));
      if ((Eigen::Index(1) << targets.size()) != matrix.rows()) fail("operands of " + s.name);
      world.state.apply(matrix, targets);
      for (const auto wire : targets) world.is_measured[wire] = false;
    }
  }

  Matrix modified(const Statement& s, const std::vector<double>& parameters, const World& world) {
    Matrix matrix = plain_gate(s.name, parameters);
    for (std::size_t k = s.modifiers.size(); k-- > 0;) {
      const Modifier& modifier = s.modifiers[k];
      const double argument = modifier.argument ? real_of(evaluate(*modifier.argument, world)) : 1;
      if (modifier.name == "inv") matrix = matrix.adjoint().eval();
      if (modifier.name == "pow") matrix = power(matrix, argument);
      for (int c = 0; c < static_cast<int>(argument); ++c) {
        if (modifier.name == "ctrl") matrix = controlled(matrix);
        if (modifier.name == "negctrl") matrix = negatively_controlled(matrix);
      }
    }
    return matrix;
  }

  Matrix plain_gate(const std::string& name, const std::vector<double>& parameters) {
    const auto found = syntax_.gates.find(name);
    if (found == syntax_.gates.end()) return standard_gate(name, parameters);
    const Definition& gate = found->second;
    if (gate.parameters.size() != parameters.size()) fail("parameters of " + name);
    Numbers numbers;
    for (std::size_t k = 0; k < parameters.size(); ++k) numbers[gate.parameters[k]] = parameters[k];
    Scope scope;
    for (std::size_t k = 0; k < gate.qubits.size(); ++k)
      scope[gate.qubits[k]] = static_cast<std::uint32_t>(k);
    const Eigen::Index size = Eigen::Index(1) << gate.qubits.size();
    Matrix matrix(size, size);
    for (Eigen::Index column = 0; column < size; ++column) {
      World world{State(static_cast<unsigned>(gate.qubits.size()), static_cast<std::uint64_t>(column)),
                  {},
                  std::vector<bool>(gate.qubits.size())};
      for (const Statement& s : gate.body) {
        if (s.kind != "gate") fail("a statement in the gate " + name);
        gate_call(s, world, scope, numbers);
      }
      matrix.col(column) = Eigen::Map<const Eigen::VectorXcd>(world.state.amplitudes.data(), size);
    }
    return matrix;
  }

  Wires wires(const Tree& tree, const World& world) {
    if (tree.kind == "name") {
      if (wire_.contains(tree.text)) return {static_cast<std::uint32_t>(wire_.at(tree.text))};
      Wires all;
      for (std::size_t k = 0; wire_.contains(tree.text + "[" + std::to_string(k) + "]"); ++k) {
        all.push_back(static_cast<std::uint32_t>(wire_.at(tree.text + "[" + std::to_string(k) + "]")));
      }
      if (all.empty()) fail("no qubits " + tree.text);
      return all;
    }
    if (tree.kind != "index" || tree.parts[0].kind != "name") fail("qubits that are no register");
    const Wires all = wires(tree.parts[0], world);
    Wires result;
    for (std::int64_t k : positions(tree.parts[1], world, static_cast<int>(all.size()))) {
      result.push_back(all.at(static_cast<std::size_t>(k)));
    }
    return result;
  }

  // -- classical --

  std::vector<Value> listed(const Tree& tree, const World& world) {
    std::vector<Value> values;
    if (tree.kind == "set") {
      for (const Tree& part : tree.parts) values.push_back(evaluate(part, world));
      return values;
    }
    const std::int64_t first = signed_of(evaluate(tree.parts[0], world));
    const std::int64_t step = signed_of(evaluate(tree.parts[1], world));
    const std::int64_t last = signed_of(evaluate(tree.parts[2], world));
    for (std::int64_t k = first; step > 0 ? k <= last : k >= last; k += step)
      values.push_back(make_integer(k));
    return values;
  }

  std::vector<std::int64_t> positions(const Tree& tree, const World& world, int width) {
    std::vector<std::int64_t> result;
    if (tree.kind == "range" || tree.kind == "set") {
      for (const Value& v : listed(tree, world)) result.push_back(signed_of(v));
    } else {
      result.push_back(signed_of(evaluate(tree, world)));
    }
    for (std::int64_t& k : result) {
      if (k < 0) k += width;
      if (k < 0 || k >= width) fail("an index out of range");
    }
    return result;
  }

  void assign(const Tree& target, const Value& value, World& world) {
    if (target.kind == "name") {
      Variable& variable = world.variables.at(target.text);
      variable.value = converted(value, variable.value.type, variable.value.width);
      return;
    }
    if (target.kind != "index" || target.parts[0].kind != "name") fail("an assignment");
    Variable& variable = world.variables.at(target.parts[0].text);
    const auto at = positions(target.parts[1], world, variable.value.width);
    for (std::size_t k = 0; k < at.size(); ++k) {
      const std::uint64_t bit = 1ull << at[k];
      variable.value.pattern =
          value.pattern >> k & 1 ? variable.value.pattern | bit : variable.value.pattern & ~bit;
    }
  }

  static Value number(std::string text) {
    std::erase(text, '_');
    if (text.size() > 1 && text[0] == '0' && std::isalpha(static_cast<unsigned char>(text[1])) &&
        text[1] != 'e') {
      const int base = std::tolower(text[1]) == 'x' ? 16 : std::tolower(text[1]) == 'b' ? 2 : 8;
      return make_integer(static_cast<std::int64_t>(std::strtoull(text.c_str() + 2, nullptr, base)));
    }
    if (text.find_first_of(".eE") == std::string::npos) {
      return make_integer(static_cast<std::int64_t>(std::strtoull(text.c_str(), nullptr, 10)));
    }
    return make_real(std::strtod(text.c_str(), nullptr));
  }

  Value evaluate(const Tree& tree, const World& world) {
    if (tree.text == "binary") {
      const Value a = evaluate(tree.parts[0], world);
      if (tree.kind == "&&" && !is_true(a)) return make_boolean(false);
      if (tree.kind == "||" && is_true(a)) return make_boolean(true);
      return binary(tree.kind, a, evaluate(tree.parts[1], world));
    }
    if (tree.text == "unary") {
      const Value v = evaluate(tree.parts[0], world);
      if (tree.kind == "!") return make_boolean(!is_true(v));
      if (tree.kind == "~") return {v.type, v.width, ~v.pattern & low_bits(v.width), 0};
      if (v.type == Type::real) return make_real(-v.x);
      if (v.type == Type::boolean || v.type == Type::bits) return make_integer(-signed_of(v));
      return {v.type, v.width, (0 - v.pattern) & low_bits(v.width), 0};
    }
    if (tree.kind == "number") return number(tree.text);
    if (tree.kind == "text") {
      Value v{Type::bits, 0, 0, 0};
      for (const char c : tree.text) {
        if (c == '_') continue;
        v.pattern = v.pattern << 1 | static_cast<std::uint64_t>(c == '1');
        ++v.width;
      }
      return v;
    }
    if (tree.kind == "name") {
      if (tree.text == "true" || tree.text == "false") return make_boolean(tree.text == "true");
      if (const auto found = world.variables.find(tree.text); found != world.variables.end()) {
        return found->second.value;
      }
      if (tree.text == "pi" || tree.text == "π") return make_real(pi);
      if (tree.text == "tau" || tree.text == "τ") return make_real(2 * pi);
      if (tree.text == "euler" || tree.text == "ℇ") return make_real(std::exp(1.0));
      fail("no variable " + tree.text);
    }
    if (tree.kind == "index") {
      Value v = evaluate(tree.parts[0], world);
      Value result{Type::bits, 0, 0, 0};
      for (const std::int64_t k : positions(tree.parts[1], world, v.width)) {
        result.pattern |= (v.pattern >> k & 1) << result.width++;
      }
      return result;
    }
    if (tree.kind == "cast") {
      const auto type = static_cast<Type>(std::stoi(tree.text));
      int width = type == Type::boolean || type == Type::bits ? 1 : 64;
      if (tree.parts.size() > 1) width = static_cast<int>(signed_of(evaluate(tree.parts[1], world)));
      return converted(evaluate(tree.parts[0], world), type, width);
    }
    if (tree.kind == "call") return function(tree, world);
    fail("the expression " + tree.kind);
  }

  Value function(const Tree& tree, const World& world) {
    static const std::map<std::string, double (*)(double)> functions = {
        {"sin", std::sin},     {"cos", std::cos},     {"tan", std::tan},     {"arcsin", std::asin},
        {"arccos", std::acos}, {"exp", std::exp},     {"arctan", std::atan}, {"log", std::log},
        {"sqrt", std::sqrt},   {"floor", std::floor}, {"ceiling", std::ceil}};
    const Value v = evaluate(tree.parts.at(0), world);
    if (const auto found = functions.find(tree.text); found != functions.end())
      return make_real(found->second(real_of(v)));
    if (tree.text == "mod") return binary("%", v, evaluate(tree.parts.at(1), world));
    if (tree.text == "popcount") {
      std::int64_t count = 0;
      for (int k = 0; k < 64; ++k) count += static_cast<std::int64_t>(v.pattern >> k & 1);
      return {Type::natural, 64, static_cast<std::uint64_t>(count), 0};
    }
    if (tree.text == "rotl" || tree.text == "rotr") {
      const std::int64_t n = signed_of(evaluate(tree.parts.at(1), world)) * (tree.text == "rotl" ? 1 : -1);
      Value result = v;
      result.pattern = 0;
      for (int k = 0; k < v.width; ++k) {
        const auto to = ((k + n) % v.width + v.width) % v.width;
        result.pattern |= (v.pattern >> k & 1) << to;
      }
      return result;
    }
    fail("the function " + tree.text);
  }

  static Value binary(const std::string& sign, const Value& a, const Value& b) {
    if (sign == "&&" || sign == "||") return make_boolean(is_true(b));
    if (sign == "==" || sign == "!=" || sign == "<" || sign == "<=" || sign == ">" || sign == ">=") {
      const bool reals = a.type == Type::real || b.type == Type::real;
      const double d = reals ? real_of(a) - real_of(b) : 0;
      const std::int64_t x = signed_of(a);
      const std::int64_t y = signed_of(b);
      const int order = reals ? (d > 0) - (d < 0) : (x > y) - (x < y);
      if (sign == "==") return make_boolean(order == 0);
      if (sign == "!=") return make_boolean(order != 0);
      if (sign == "<") return make_boolean(order < 0);
      if (sign == "<=") return make_boolean(order <= 0);
      if (sign == ">") return make_boolean(order > 0);
      return make_boolean(order >= 0);
    }
    Value result = a;
    if (sign == "&" || sign == "|" || sign == "^") {
      if (b.width > a.width) result = b;
      result.pattern = sign == "&"   ? a.pattern & b.pattern
                       : sign == "|" ? a.pattern | b.pattern
                                     : a.pattern ^ b.pattern;
      return result;
    }
    if (sign == "<<" || sign == ">>") {
      const std::uint64_t n = b.pattern;
      result.pattern = n >= 64 ? 0 : sign == "<<" ? a.pattern << n & low_bits(a.width) : a.pattern >> n;
      return result;
    }
    if (sign == "++") return {Type::bits, a.width + b.width, a.pattern | b.pattern << a.width, 0};
    if (a.type == Type::angle || b.type == Type::angle) return of_angles(sign, a, b);
    if (a.type == Type::real || b.type == Type::real) {
      const double x = real_of(a);
      const double y = real_of(b);
      if (sign == "+") return make_real(x + y);
      if (sign == "-") return make_real(x - y);
      if (sign == "*") return make_real(x * y);
      if (sign == "/") return make_real(x / y);
      if (sign == "%") return make_real(std::fmod(x, y));
      if (sign == "**") return make_real(std::pow(x, y));
      fail("the operator " + sign);
    }
    const std::int64_t x = signed_of(a);
    const std::int64_t y = signed_of(b);
    std::int64_t n = 0;
    if (sign == "+") n = x + y;
    if (sign == "-") n = x - y;
    if (sign == "*") n = x * y;
    if ((sign == "/" || sign == "%") && y == 0) fail("division by zero");
    if (sign == "/") n = x / y;
    if (sign == "%") n = x % y;
    if (sign == "**") {
      n = 1;
      for (std::int64_t k = 0; k < y; ++k) n *= x;
    }
    const bool is_natural = a.type == Type::natural || b.type == Type::natural;
    const int width = std::max(a.type == Type::boolean ? 1 : a.width, b.type == Type::boolean ? 1 : b.width);
    return {is_natural ? Type::natural : Type::integer, width,
            static_cast<std::uint64_t>(n) & low_bits(width), 0};
  }

  static Value of_angles(const std::string& sign, const Value& a, const Value& b) {
    // The standard leaves a float times an angle open; compiled plans use it as the product of the numbers.
    if ((sign == "*" || sign == "/") && (a.type == Type::real || b.type == Type::real)) {
      return make_real(sign == "*" ? real_of(a) * real_of(b) : real_of(a) / real_of(b));
    }
    const int width = a.type == Type::angle ? a.width : b.width;
    const std::uint64_t x = a.type == Type::real ? converted(a, Type::angle, width).pattern : a.pattern;
    const std::uint64_t y = b.type == Type::real ? converted(b, Type::angle, width).pattern : b.pattern;
    std::uint64_t n = 0;
    if (sign == "+") n = x + y;
    if (sign == "-") n = x - y;
    if (sign == "*") n = x * y;
    if (sign == "/") {
      if (y == 0) fail("division by zero");
      n = x / y;
      if (a.type == b.type) return {Type::natural, width, n, 0};
    }
    return {Type::angle, width, n & low_bits(width), 0};
  }

  const Syntax& syntax_;
  const RunOptions& options_;
  std::map<std::string, std::size_t> wire_;
};

std::string printed(const std::map<std::string, Variable>& variables,
                    const std::map<std::string, std::string>& names, const std::set<std::string>& shown) {
  std::map<std::string, std::string> values;
  for (const auto& [name, variable] : variables) {
    if (variable.is_input) continue;
    const auto renamed = names.find(name);
    const std::string source = renamed == names.end() ? name : renamed->second;
    if (!shown.empty() && !shown.contains(source)) continue;
    const Value& v = variable.value;
    std::string text;
    if (v.type == Type::real) {
      text = std::to_string(v.x);
    } else {
      for (int k = v.width; k-- > 0;) text += v.pattern >> k & 1 ? '1' : '0';
    }
    values[source] = text;
  }
  std::string all;
  for (const auto& [name, text] : values) all += name + "=" + text + ";";
  return all;
}

}  // namespace

Program::Program(const std::string& text) {
  auto syntax = std::make_shared<Syntax>(Parser(text).program());
  pragmas_ = syntax->pragmas;
  for (const Statement& s : syntax->statements) {
    if (s.kind != "qubit") continue;
    if (s.trees.empty()) {
      qubits_.push_back(s.name);
      continue;
    }
    if (s.trees[0].kind != "number") fail("a register whose size is no number");
    const int size = std::stoi(s.trees[0].text);
    for (int k = 0; k < size; ++k) qubits_.push_back(s.name + "[" + std::to_string(k) + "]");
  }
  syntax_ = std::move(syntax);
}

Placement placement_of(const Program& compiled, const Program& source) {
  Placement placement;
  const auto index = [](const std::vector<std::string>& names, const std::string& name) {
    for (std::size_t k = 0; k < names.size(); ++k) {
      if (names[k] == name) return k;
    }
    fail("no qubit " + name);
  };
  const std::size_t unset = ~std::size_t(0);
  placement.start.assign(source.qubits().size(), unset);
  placement.end = placement.start;
  for (const std::string& pragma : compiled.pragmas()) {
    std::vector<std::string> words;
    std::string word;
    for (const char c : pragma + " ") {
      if (!std::isspace(static_cast<unsigned char>(c))) {
        word += c;
      } else if (!word.empty()) {
        words.push_back(word);
        word.clear();
      }
    }
    if (words.size() != 4 || words[0] != "isinglass") continue;
    if (words[1] == "start") {
      placement.start[index(source.qubits(), words[2])] = index(compiled.qubits(), words[3]);
    } else if (words[1] == "end") {
      placement.end[index(source.qubits(), words[2])] = index(compiled.qubits(), words[3]);
    } else if (words[1] == "name") {
      placement.names[words[3]] = words[2];
    }
  }
  for (std::size_t q = 0; q < placement.start.size(); ++q) {
    if (placement.start[q] == unset || placement.end[q] == unset)
      fail("no placement of " + source.qubits()[q]);
  }
  return placement;
}

std::vector<Path> run(const Program& program, const std::vector<std::size_t>& start,
                      const RunOptions& options, const std::map<std::string, std::string>& names) {
  const std::size_t wires = program.qubits().size();
  const std::size_t all = wires + (options.with_references ? start.size() : 0);
  World world{State(static_cast<unsigned>(all)), {}, std::vector<bool>(all)};
  if (options.with_references) {
    world.state.amplitudes[0] = 0;
    for (std::uint64_t k = 0; k < 1ull << start.size(); ++k) {
      std::uint64_t index = k << wires;
      for (std::size_t q = 0; q < start.size(); ++q) index |= (k >> q & 1) << start[q];
      world.state.amplitudes[index] = std::pow(2.0, -0.5 * static_cast<double>(start.size()));
    }
  }
  std::vector<Path> paths;
  for (Arrival& arrival : Interpreter(program, options).run(std::move(world))) {
    Path path;
    path.bits = printed(arrival.world.variables, names, {});
    path.state = std::move(arrival.world.state);
    path.is_measured = std::move(arrival.world.is_measured);
    paths.push_back(std::move(path));
  }
  return paths;
}

namespace {

/// Density matrix of the kept qubits and references, the rest traced out, added to `sum`.
void add_density(const Path& path, const std::vector<std::uint32_t>& kept, Matrix& sum) {
  const std::uint64_t size = 1ull << kept.size();
  std::map<std::uint64_t, Eigen::VectorXcd> by_rest;
  for (std::uint64_t k = 0; k < path.state.amplitudes.size(); ++k) {
    if (path.state.amplitudes[k] == 0.0) continue;
    std::uint64_t inner = 0;
    std::uint64_t rest = k;
    for (std::size_t j = 0; j < kept.size(); ++j) {
      inner |= (k >> kept[j] & 1) << j;
      rest &= ~(1ull << kept[j]);
    }
    auto& vector = by_rest[rest];
    if (vector.size() == 0) vector = Eigen::VectorXcd::Zero(static_cast<Eigen::Index>(size));
    vector[static_cast<Eigen::Index>(inner)] = path.state.amplitudes[k];
  }
  for (const auto& [rest, vector] : by_rest) sum += vector * vector.adjoint();
}

/// The names of the variables in "b=01;c=1;".
std::set<std::string> names_in(const std::string& bits) {
  std::set<std::string> names;
  std::string word;
  for (const char c : bits) {
    if (c == '=') names.insert(word);
    word = c == ';' || c == '=' ? "" : word + c;
  }
  return names;
}

std::string only(const std::string& bits, const std::set<std::string>& names) {
  std::string result;
  std::size_t begin = 0;
  while (begin < bits.size()) {
    const std::size_t end = bits.find(';', begin);
    const std::string part = bits.substr(begin, end - begin + 1);
    if (names.contains(part.substr(0, part.find('=')))) result += part;
    begin = end + 1;
  }
  return result;
}

}  // namespace

Matrix unitary(const Program& program, const Placement& placement,
               const std::map<std::string, double>& inputs) {
  RunOptions options;
  options.inputs = inputs;
  options.with_references = true;
  const std::vector<Path> paths = run(program, placement.start, options);
  if (paths.size() != 1) fail("a program that measures has no unitary");
  const std::size_t qubits = placement.start.size();
  const Eigen::Index size = Eigen::Index(1) << qubits;
  Matrix m(size, size);
  for (Eigen::Index row = 0; row < size; ++row) {
    std::uint64_t index = 0;
    for (std::size_t q = 0; q < qubits; ++q)
      index |= (static_cast<std::uint64_t>(row) >> q & 1) << placement.end[q];
    for (Eigen::Index column = 0; column < size; ++column) {
      m(row, column) =
          paths[0].state.amplitudes[index | static_cast<std::uint64_t>(column) << program.qubits().size()] *
          std::sqrt(static_cast<double>(size));
    }
  }
  return m;
}

double difference(const Program& source, const Program& compiled, const RunOptions& options, bool bits_only) {
  const std::size_t qubits = source.qubits().size();
  const Placement placement = placement_of(compiled, source);
  std::vector<std::size_t> start(qubits);
  for (std::size_t q = 0; q < qubits; ++q) start[q] = q;
  const std::vector<Path> left = run(source, start, options);
  std::vector<Path> right = run(compiled, placement.start, options, placement.names);
  const std::set<std::string> shown = left.empty() ? std::set<std::string>() : names_in(left[0].bits);
  // A qubit counts given some bits if on some path with them it was not measured last.
  std::map<std::string, std::vector<bool>> kept_by_bits;
  for (const Path& path : left) {
    auto& kept = kept_by_bits[path.bits];
    kept.resize(qubits);
    for (std::size_t q = 0; q < qubits; ++q) kept[q] = !bits_only && (kept[q] || !path.is_measured[q]);
  }
  std::map<std::string, std::pair<Matrix, Matrix>> by_bits;
  double worst = 0;
  const std::size_t references = options.with_references ? qubits : 0;
  const auto add = [&](const Path& path, const std::string& bits, bool is_left) {
    const auto found = kept_by_bits.find(bits);
    if (found == kept_by_bits.end()) {
      worst = std::max(worst, path.state.norm2());
      return;
    }
    std::vector<std::uint32_t> wires;
    for (std::size_t q = 0; q < qubits; ++q) {
      if (found->second[q]) wires.push_back(static_cast<std::uint32_t>(is_left ? q : placement.end[q]));
    }
    const std::size_t own = is_left ? qubits : compiled.qubits().size();
    for (std::size_t k = 0; k < references; ++k) wires.push_back(static_cast<std::uint32_t>(own + k));
    auto& [a, b] = by_bits[bits];
    Matrix& sum = is_left ? a : b;
    const Eigen::Index size = Eigen::Index(1) << wires.size();
    if (a.size() == 0) a = Matrix::Zero(size, size);
    if (b.size() == 0) b = Matrix::Zero(size, size);
    add_density(path, wires, sum);
    // Ions that no pragma names end in |0>.
    if (!is_left && !bits_only) {
      std::set<std::size_t> named(placement.end.begin(), placement.end.end());
      for (std::size_t w = 0; w < own; ++w) {
        if (named.contains(w)) continue;
        State copy = path.state;
        worst = std::max(worst, copy.project(static_cast<std::uint32_t>(w), true));
      }
    }
  };
  for (const Path& path : left) add(path, path.bits, true);
  for (const Path& path : right) add(path, only(path.bits, shown), false);
  for (const auto& [bits, pair] : by_bits) {
    worst = std::max(worst, (pair.first - pair.second).cwiseAbs().maxCoeff());
  }
  return worst;
}

double difference(const std::string& source, const std::string& compiled, const RunOptions& options,
                  bool bits_only) {
  return difference(Program(source), Program(compiled), options, bits_only);
}

}  // namespace isinglass::support
