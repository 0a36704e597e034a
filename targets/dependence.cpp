// Dependences within a block; see dependence.h.
#include "targets/dependence.h"

#include <algorithm>
#include <charconv>
#include <optional>

#include "circuit/long_list.h"

namespace isinglass {

namespace {

std::optional<std::uint32_t> plain_number(const Expression& e) {
  std::uint32_t number = 0;
  if (e.kind != Expression::Kind::literal) return std::nullopt;
  const char* end = e.text.data() + e.text.size();
  const auto [stop, trouble] = std::from_chars(e.text.data(), end, number);
  if (trouble != std::errc() || stop != end) return std::nullopt;
  return number;
}

struct Collector {
  const Circuit& circuit;
  Touched& touched;

  void variable(std::uint32_t index) {
    const Variable& v = circuit.variables[index];
    if (v.bits == 0) touched.variables.push_back(index);
    for (std::uint32_t bit = 0; bit < v.bits; ++bit) touched.bits.push_back(v.first_bit + bit);
  }

  void expression(const Expression& e) {
    if (e.kind == Expression::Kind::variable) return variable(e.variable);
    if (e.kind == Expression::Kind::index && e.arguments.size() == 2 &&
        e.arguments[0].kind == Expression::Kind::variable) {
      const Variable& v = circuit.variables[e.arguments[0].variable];
      const auto place = plain_number(e.arguments[1]);
      if (place && *place < v.bits) {
        touched.bits.push_back(v.first_bit + *place);
        return;
      }
    }
    for (const Expression& argument : e.arguments) expression(argument);
  }

  void statement(const ClassicalStatement& s) {
    const bool is_plain = s.kind == ClassicalStatement::Kind::assign;
    if (!is_plain) touched.everything = true;
    expression(s.target);
    expression(s.value);
  }

  void branch(const Branch& b) {
    expression(b.condition);
    if (b.kind == Branch::Kind::for_loop) variable(b.variable);
    for (const Branch::Arm& arm : b.arms) {
      for (const Expression& label : arm.labels) expression(label);
      for (const Operation& op : circuit.blocks[arm.block]) operation(op);
    }
  }

  void operation(const Operation& op) {
    if (op.kind == Kind::measure && op.payload != no_bit) touched.bits.push_back(op.payload);
    if (op.kind == Kind::classical) statement(circuit.statements[op.payload]);
    if (op.kind == Kind::branch) branch(circuit.branches[op.payload]);
  }
};

void make_unique(std::vector<std::uint32_t>& list) {
  std::sort(list.begin(), list.end());
  list.erase(std::unique(list.begin(), list.end()), list.end());
}

}  // namespace

Touched classical_touches(const Circuit& circuit, const Operation& op) {
  Touched touched;
  Collector{circuit, touched}.operation(op);
  make_unique(touched.bits);
  make_unique(touched.variables);
  return touched;
}

Dependences::Dependences(const Circuit& circuit, const Block& block) : predecessors(block.size(), 0) {
  constexpr std::uint32_t nobody = 0xffffffffu;
  const std::uint32_t first_bit = circuit.wires;
  const std::uint32_t first_variable = first_bit + circuit.bits;
  const auto things = first_variable + static_cast<std::uint32_t>(circuit.variables.size());
  std::vector<std::uint32_t> last(things, nobody);  // who touched each wire, bit and variable last

  struct Edge {
    std::uint32_t from;
    std::uint32_t to;
  };
  std::vector<Edge> edges;
  reserve_long(edges, 2 * block.size());
  const auto touch = [&](std::uint32_t thing, std::uint32_t op) {
    if (last[thing] != nobody && last[thing] != op) {
      edges.push_back({last[thing], op});
      ++predecessors[op];
    }
    last[thing] = op;
  };

  std::uint32_t last_fence = nobody;  // orders what touches everything even where nothing is declared
  for (std::uint32_t i = 0; i < block.size(); ++i) {
    const Operation& op = block[i];
    for (const std::uint32_t wire : circuit.operands(op)) touch(wire, i);
    if (op.kind == Kind::measure && op.payload != no_bit) touch(first_bit + op.payload, i);
    if (op.kind != Kind::classical && op.kind != Kind::branch) continue;
    const Touched touched = classical_touches(circuit, op);
    if (touched.everything) {
      for (std::uint32_t thing = 0; thing < things; ++thing) touch(thing, i);
      if (last_fence != nobody) {
        edges.push_back({last_fence, i});
        ++predecessors[i];
      }
      last_fence = i;
    } else {
      for (const std::uint32_t bit : touched.bits) touch(first_bit + bit, i);
      for (const std::uint32_t variable : touched.variables) touch(first_variable + variable, i);
    }
  }

  first_.assign(block.size() + 1, 0);
  for (const Edge& edge : edges) ++first_[edge.from + 1];
  for (std::size_t i = 0; i < block.size(); ++i) first_[i + 1] += first_[i];
  reserve_long(follower_, edges.size());
  follower_.resize(edges.size());
  std::vector<std::size_t> next(first_.begin(), first_.end() - 1);
  for (const Edge& edge : edges) follower_[next[edge.from]++] = edge.to;
}

}  // namespace isinglass
