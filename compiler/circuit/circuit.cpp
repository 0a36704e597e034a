// Operations, operands and invariants of a circuit; see circuit.h.
#include "circuit/circuit.h"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <stdexcept>

namespace isinglass {

namespace {

struct KindFacts {
  std::string_view name;
  int targets;
  int angles;
};

constexpr std::array<KindFacts, 18> facts = {{{"phase", 0, 1},
                                              {"x", 1, 0},
                                              {"y", 1, 0},
                                              {"z", 1, 0},
                                              {"h", 1, 0},
                                              {"p", 1, 1},
                                              {"rz", 1, 1},
                                              {"r", 1, 2},
                                              {"u", 1, 3},
                                              {"swap", 2, 0},
                                              {"zz", 2, 1},
                                              {"xx", 2, 3},
                                              {"measure", 1, 0},
                                              {"reset", 1, 0},
                                              {"barrier", 0, 0},
                                              {"delay", 0, 1},
                                              {"classical", 0, 0},
                                              {"branch", 0, 0}}};

const KindFacts& facts_of(Kind kind) {
  return facts[static_cast<std::size_t>(kind)];
}

constexpr std::uint32_t in_place = 3;

std::string listed(Angle angle, const Circuit& circuit) {
  std::string text = fmt::format("{:.6g}", angle.constant);
  for (const Term& term : circuit.forms.terms(angle.form)) {
    text += fmt::format("{:+.6g}*{}", term.coefficient, circuit.inputs[term.input].name);
  }
  return text;
}

}  // namespace

bool is_unitary(Kind kind) {
  return kind <= Kind::xx;
}
int target_count(Kind kind) {
  return facts_of(kind).targets;
}
int angle_count(Kind kind) {
  return facts_of(kind).angles;
}
std::string_view name(Kind kind) {
  return facts_of(kind).name;
}

std::span<const std::uint32_t> Circuit::operands(const Operation& op) const {
  if (op.operand_count <= in_place) return {op.operand, op.operand_count};
  return {pool.data() + op.operand[0], op.operand_count};
}

std::span<const std::uint32_t> Circuit::controls(const Operation& op) const {
  return operands(op).first(static_cast<std::size_t>(op.control_count()));
}

std::span<const std::uint32_t> Circuit::targets(const Operation& op) const {
  return operands(op).last(static_cast<std::size_t>(target_count(op.kind)));
}

void Circuit::set_operands(Operation& op, std::span<const std::uint32_t> operands) {
  const auto count = static_cast<std::uint32_t>(operands.size());
  if (count <= in_place) {
    std::copy(operands.begin(), operands.end(), op.operand);
  } else {
    const std::vector<std::uint32_t> copy(operands.begin(), operands.end());  // may alias the pool
    op.operand[0] = static_cast<std::uint32_t>(pool.size());
    pool.insert(pool.end(), copy.begin(), copy.end());
  }
  op.operand_count = count;
}

Operation Circuit::make(Kind kind, std::span<const std::uint32_t> operands, std::span<const Angle> angles,
                        Origin origin) {
  Operation op;
  op.kind = kind;
  op.origin = origin;
  set_operands(op, operands);
  for (std::size_t i = 0; i < angles.size(); ++i) op.set_angle(static_cast<int>(i), angles[i]);
  return op;
}

Operation Circuit::make(Kind kind, std::initializer_list<std::uint32_t> operands,
                        std::initializer_list<Angle> angles, Origin origin) {
  return make(kind, std::span(operands.begin(), operands.size()), std::span(angles.begin(), angles.size()),
              origin);
}

bool Circuit::measures() const {
  for (const Block& block : blocks) {
    for (const Operation& op : block) {
      if (op.kind == Kind::measure) return true;
    }
  }
  return false;
}

std::string Circuit::wire_name(std::uint32_t wire) const {
  for (const Register& reg : registers) {
    if (wire < reg.first || wire >= reg.first + reg.size) continue;
    return reg.is_scalar ? reg.name : fmt::format("{}[{}]", reg.name, wire - reg.first);
  }
  return fmt::format("ancilla {}", wire - source_qubits);
}

const Register& add_register(Circuit& circuit, std::string name, std::uint32_t qubits, bool is_scalar) {
  circuit.registers.push_back({std::move(name), circuit.wires, qubits, is_scalar});
  for (std::uint32_t i = 0; i < qubits; ++i) circuit.end_wire.push_back(circuit.wires + i);
  circuit.wires += qubits;
  circuit.source_qubits += qubits;
  return circuit.registers.back();
}

std::uint32_t add_bits(Circuit& circuit, std::string name, std::uint32_t bits, bool is_scalar) {
  Variable variable;
  variable.source = name;
  variable.name = std::move(name);
  variable.type = is_scalar ? "bit" : fmt::format("bit[{}]", bits);
  variable.bits = bits;
  variable.first_bit = circuit.bits;
  variable.is_scalar = is_scalar;
  circuit.bits += bits;
  circuit.variables.push_back(std::move(variable));
  return static_cast<std::uint32_t>(circuit.variables.size() - 1);
}

void check_invariants(const Circuit& circuit) {
  const auto nowhere = [] { return std::string(); };
  // Where an operation stands is written only for a rule that is broken: most hold, for millions of them.
  const auto demand_at = [](bool holds, std::string_view rule, const auto& where) {
    if (!holds) throw std::logic_error(fmt::format("broken circuit: {}{}", rule, where()));
  };
  const auto demand = [&](bool holds, std::string_view rule) { demand_at(holds, rule, nowhere); };
  demand(circuit.end_wire.size() == circuit.source_qubits, "one end wire a source qubit");
  std::vector<bool> taken(circuit.wires);
  for (const std::uint32_t wire : circuit.end_wire) {
    demand(wire < circuit.wires && !taken[wire], "end wires are distinct wires");
    taken[wire] = true;
  }
  std::vector<std::uint64_t> seen(circuit.wires, 0);
  std::uint64_t stamp = 0;
  for (std::size_t b = 0; b < circuit.blocks.size(); ++b) {
    for (std::size_t i = 0; i < circuit.blocks[b].size(); ++i) {
      const Operation& op = circuit.blocks[b][i];
      const auto where = [&] { return fmt::format(" (block {}, operation {}, {})", b, i, name(op.kind)); };
      ++stamp;
      demand_at(op.operand_count <= in_place || op.operand[0] + op.operand_count <= circuit.pool.size(),
                "operands lie in the pool", where);
      for (const std::uint32_t wire : circuit.operands(op)) {
        demand_at(wire < circuit.wires, "operands are wires", where);
        demand_at(seen[wire] != stamp, "operands are distinct", where);
        seen[wire] = stamp;
      }
      if (op.is_unitary()) demand_at(op.control_count() >= 0, "a gate has all its targets", where);
      for (int a = 0; a < 3; ++a) {
        demand_at(op.form[a] < circuit.forms.size(), "angle forms exist", where);
        demand_at(std::isfinite(op.value[a]), "angles are finite", where);
      }
      if (op.kind == Kind::measure) {
        demand_at(op.operand_count == 1, "measure has one operand", where);
        demand_at(op.payload == no_bit || op.payload < circuit.bits, "measured bits exist", where);
      }
      if (op.kind == Kind::reset) demand_at(op.operand_count == 1, "reset has one operand", where);
      if (op.kind == Kind::classical)
        demand_at(op.payload < circuit.statements.size(), "statement exists", where);
      if (op.kind == Kind::branch) {
        demand_at(op.payload < circuit.branches.size(), "branch exists", where);
        for (const Branch::Arm& arm : circuit.branches[op.payload].arms) {
          demand_at(arm.block > b && arm.block < circuit.blocks.size(), "arms are later blocks", where);
        }
      }
    }
  }
}

std::string listed(const Circuit& circuit) {
  std::string text;
  for (std::size_t b = 0; b < circuit.blocks.size(); ++b) {
    if (b > 0) text += fmt::format("block {}:\n", b);
    for (const Operation& op : circuit.blocks[b]) {
      for (int c = 0; op.is_unitary() && c < op.control_count(); ++c) text += "c-";
      text += name(op.kind);
      if (op.kind == Kind::measure && op.payload != no_bit) text += fmt::format("->{}", op.payload);
      if (op.kind == Kind::classical || op.kind == Kind::branch) text += fmt::format("#{}", op.payload);
      for (int a = 0; a < angle_count(op.kind); ++a) {
        text += (a == 0 ? "(" : ", ") + listed(op.angle(a), circuit);
      }
      if (angle_count(op.kind) > 0) text += ")";
      for (const std::uint32_t wire : circuit.operands(op)) text += fmt::format(" {}", wire);
      text += "\n";
    }
  }
  text += "end:";
  for (const std::uint32_t wire : circuit.end_wire) text += fmt::format(" {}", wire);
  return text + "\n";
}

std::vector<std::complex<double>> matrix_of(const Operation& op) {
  using C = std::complex<double>;
  const C i(0, 1);
  const double a = op.value[0];
  const double c = std::cos(a / 2);
  const double s = std::sin(a / 2);
  switch (op.kind) {
    case Kind::phase:
      return {std::polar(1.0, a)};
    case Kind::x:
      return {0, 1, 1, 0};
    case Kind::y:
      return {0, -i, i, 0};
    case Kind::z:
      return {1, 0, 0, -1};
    case Kind::h:
      return {std::sqrt(0.5), std::sqrt(0.5), std::sqrt(0.5), -std::sqrt(0.5)};
    case Kind::p:
      return {1, 0, 0, std::polar(1.0, a)};
    case Kind::rz:
      return {std::polar(1.0, -a / 2), 0, 0, std::polar(1.0, a / 2)};
    case Kind::r:
      return {c, -i * s * std::polar(1.0, -op.value[1]), -i * s * std::polar(1.0, op.value[1]), c};
    case Kind::u: {
      const C g = std::polar(1.0, a / 2);
      return {g * c, -g * s * std::polar(1.0, op.value[2]), g * s * std::polar(1.0, op.value[1]),
              g * c * std::polar(1.0, op.value[1] + op.value[2])};
    }
    case Kind::swap:
      return {1, 0, 0, 0, 0, 0, 1, 0, 0, 1, 0, 0, 0, 0, 0, 1};
    case Kind::zz: {
      const C minus = std::polar(1.0, -a / 2);
      const C plus = std::polar(1.0, a / 2);
      return {minus, 0, 0, 0, 0, plus, 0, 0, 0, 0, plus, 0, 0, 0, 0, minus};
    }
    case Kind::xx: {
      // Row = output, column = input, index = first + 2 * second. Flipping ion k from 0 to 1 gives e^{+i
      // phi_k}.
      const C f = std::polar(1.0, op.value[1]);
      const C g = std::polar(1.0, op.value[2]);
      const C t = -i * s;
      return {c,
              0,
              0,
              t * std::conj(f * g),
              0,
              c,
              t * f * std::conj(g),
              0,
              0,
              t * std::conj(f) * g,
              c,
              0,
              t * f * g,
              0,
              0,
              c};
    }
    default:
      throw std::logic_error(fmt::format("{} has no matrix", name(op.kind)));
  }
}

}  // namespace isinglass
