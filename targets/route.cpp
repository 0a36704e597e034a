// Movement by swaps; see route.h.
//
//     before  xx a c            (only a-b and b-c reachable)
//     after   swap a b, xx b c
//
// Where along the way the two meet is chosen by what comes next: the operations that follow, weighted less
// the further away they are, should find their ions near each other (the look-ahead of Li, Ding and Xie,
// "Tackling the qubit mapping problem for NISQ-era quantum devices", ASPLOS 2019, in its simplest form).
#include "targets/route.h"

#include <fmt/format.h>

#include <algorithm>
#include <numeric>
#include <optional>

#include "circuit/long_list.h"
#include "circuit/message.h"
#include "circuit/physical.h"

namespace isinglass {

Routes::Routes(const Target& target, const std::vector<std::uint32_t>& held) : ions_(target.ions) {
  if (!held.empty()) held_.assign(ions_, false);
  for (const std::uint32_t ion : held) held_[ion] = true;
  if (target.pairs.empty()) return;
  error_.assign(ions_ * ions_, unconnected);
  next_.assign(ions_ * ions_, 0);
  // Floyd, "Algorithm 97: shortest path" (1962): lengths are the errors of a swap on each pair.
  for (std::uint32_t a = 0; a < ions_; ++a) {
    error_[a * ions_ + a] = 0;
    for (std::uint32_t b = 0; b < ions_; ++b) {
      if (a == b || !target.ion[a].addressed || !target.ion[b].addressed) continue;
      if (!target.pair(a, b).reachable) {
        is_complete_ = false;
        continue;
      }
      error_[a * ions_ + b] = 3 * std::max(target.pair(a, b).error(pi / 2), 1e-9);
      next_[a * ions_ + b] = b;
    }
  }
  for (std::uint32_t k = 0; k < ions_ && !is_complete_; ++k) {
    if (is_held(k)) continue;
    for (std::size_t a = 0; a < ions_; ++a) {
      const double first = error_[a * ions_ + k];
      if (first >= unconnected) continue;
      for (std::size_t b = 0; b < ions_; ++b) {
        const double through = first + error_[k * ions_ + b];
        if (through < error_[a * ions_ + b] && through < unconnected) {
          error_[a * ions_ + b] = through;
          next_[a * ions_ + b] = next_[a * ions_ + k];
        }
      }
    }
  }
}

std::vector<std::uint32_t> Routes::way(std::uint32_t a, std::uint32_t b) const {
  if (!is_connected(a, b)) return {};
  std::vector<std::uint32_t> ions = {a};
  while (a != b) {
    a = next_[a * ions_ + b];
    ions.push_back(a);
  }
  return ions;
}

namespace {

/// Renames the operands of one operation from wires to ions.
void put_on_ions(Circuit& circuit, Operation& op, const std::vector<std::uint32_t>& ion_of) {
  if (op.operand_count <= 3) {
    for (std::uint32_t k = 0; k < op.operand_count; ++k) op.operand[k] = ion_of[op.operand[k]];
    return;
  }
  std::vector<std::uint32_t> ions;
  for (const std::uint32_t wire : circuit.operands(op)) ions.push_back(ion_of[wire]);
  circuit.set_operands(op, ions);
}

/// The circuit as it is, and where its wires begin.
Placed begun(Circuit circuit, const Target& target, const std::vector<std::uint32_t>& ion_of) {
  Placed placed;
  placed.in_use.assign(target.ions, false);
  for (const std::uint32_t ion : ion_of) placed.in_use[ion] = true;
  placed.start.assign(ion_of.begin(), ion_of.begin() + circuit.source_qubits);
  placed.circuit = std::move(circuit);
  return placed;
}

}  // namespace

Placed settled(Circuit circuit, const Target& target, const std::vector<std::uint32_t>& ion_of) {
  Placed placed = begun(std::move(circuit), target, ion_of);
  Circuit& here = placed.circuit;
  here.wires = target.ions;
  for (Block& block : here.blocks) {
    for (Operation& op : block) put_on_ions(here, op, ion_of);
  }
  for (std::uint32_t& wire : here.end_wire) wire = ion_of[wire];
  return placed;
}

namespace {

constexpr std::size_t look_ahead = 20;
constexpr double fading = 0.8;

class Router {
 public:
  Router(const Circuit& circuit, const Target& target, const Routes& routes,
         std::vector<std::uint32_t> ion_of)
      : source_(circuit), target_(target), routes_(routes), ion_of_(std::move(ion_of)) {
    wire_on_.assign(target.ions, nobody);
    for (std::uint32_t w = 0; w < ion_of_.size(); ++w) wire_on_[ion_of_[w]] = w;
    placed_ = begun(circuit, target, ion_of_);
  }

  Placed run() {
    Circuit& circuit = placed_.circuit;
    circuit.wires = target_.ions;
    bool may_stop_early = false;
    for (const ClassicalStatement& statement : circuit.statements) {
      if (statement.kind == ClassicalStatement::Kind::end_program) may_stop_early = true;
    }
    for (std::uint32_t b = static_cast<std::uint32_t>(circuit.blocks.size()); b-- > 1;) route(b, false);
    route(0, !may_stop_early);
    for (std::uint32_t& wire : circuit.end_wire) wire = ion_of_[wire];
    return std::move(placed_);
  }

 private:
  static constexpr std::uint32_t nobody = 0xffffffffu;

  /// Rewrites one block onto ions; but for the whole program everybody is back in place at its end.
  void route(std::uint32_t block, bool may_end_elsewhere) {
    const Block& from = source_.blocks[block];
    out_.clear();
    reserve_long(out_, from.size());
    std::vector<std::pair<std::uint32_t, std::uint32_t>> undo;
    for (std::size_t i = 0; i < from.size(); ++i) {
      Operation op = from[i];
      if (op.kind == Kind::xx) bring_together(from, i, undo);
      if (op.kind == Kind::branch || may_jump(op)) move_back(undo, op.origin);
      put_on_ions(placed_.circuit, op, ion_of_);
      if (op.kind == Kind::branch) claim_ions_of_arms(op);
      out_.push_back(op);
    }
    if (!may_end_elsewhere) move_back(undo, from.empty() ? Origin{} : from.back().origin);
    placed_.circuit.blocks[block] = std::move(out_);
  }

  bool may_jump(const Operation& op) const {
    return op.kind == Kind::classical &&
           source_.statements[op.payload].kind != ClassicalStatement::Kind::assign;
  }

  /// Movement within the arms of a branch touches ions that the source did not name.
  void claim_ions_of_arms(Operation& branch) {
    const Circuit& circuit = placed_.circuit;
    const auto named = circuit.operands(branch);
    std::vector<std::uint32_t> ions(named.begin(), named.end());
    for (const Branch::Arm& arm : circuit.branches[branch.payload].arms) {
      for (const Operation& op : circuit.blocks[arm.block]) {
        const auto operands = circuit.operands(op);
        ions.insert(ions.end(), operands.begin(), operands.end());
      }
    }
    std::sort(ions.begin(), ions.end());
    ions.erase(std::unique(ions.begin(), ions.end()), ions.end());
    placed_.circuit.set_operands(branch, ions);
  }

  void bring_together(const Block& block, std::size_t at,
                      std::vector<std::pair<std::uint32_t, std::uint32_t>>& undo) {
    const Operation& op = block[at];
    const std::uint32_t a = ion_of_[op.operand[0]];
    const std::uint32_t b = ion_of_[op.operand[1]];
    if (target_.pair(a, b).reachable) return;
    const auto way = routes_.way(a, b);
    if (way.empty() || (routes_.is_held(a) && routes_.is_held(b))) refuse(op, a, b);

    // The pair way[m], way[m+1] is where they meet; who is held does not move.
    const std::size_t first = routes_.is_held(b) ? way.size() - 2 : 0;
    const std::size_t last = routes_.is_held(a) ? 0 : way.size() - 2;
    std::size_t best = first;
    double least = 0;
    for (std::size_t m = first; m <= last; ++m) {
      const double cost = cost_of_meeting(block, at, way, m);
      if (m == first || cost < least) {
        best = m;
        least = cost;
      }
    }
    for (std::size_t k = 0; k < best; ++k) swap(way[k], way[k + 1], op.origin, undo);
    for (std::size_t k = way.size() - 1; k > best + 1; --k) swap(way[k], way[k - 1], op.origin, undo);
  }

  /// Error of the swaps and of the interaction, and of moving for what follows.
  double cost_of_meeting(const Block& block, std::size_t at, const std::vector<std::uint32_t>& way,
                         std::size_t meeting) {
    std::vector<std::uint32_t> moved(target_.ions);  // where the content of each ion would be
    std::iota(moved.begin(), moved.end(), 0u);
    std::vector<std::uint32_t> content = moved;
    double cost = 0;
    const auto exchange = [&](std::uint32_t x, std::uint32_t y) {
      cost += 3 * target_.pair(x, y).error(pi / 2);
      std::swap(content[x], content[y]);
    };
    for (std::size_t k = 0; k < meeting; ++k) exchange(way[k], way[k + 1]);
    for (std::size_t k = way.size() - 1; k > meeting + 1; --k) exchange(way[k], way[k - 1]);
    for (std::uint32_t ion = 0; ion < content.size(); ++ion) moved[content[ion]] = ion;
    cost += target_.pair(way[meeting], way[meeting + 1]).error(block[at].value[0]);

    double weight = 1;
    std::size_t seen = 0;
    for (std::size_t i = at + 1; i < block.size() && seen < look_ahead; ++i) {
      if (block[i].kind != Kind::xx) continue;
      const std::uint32_t x = moved[ion_of_[block[i].operand[0]]];
      const std::uint32_t y = moved[ion_of_[block[i].operand[1]]];
      if (!target_.pair(x, y).reachable) cost += weight * routes_.movement_error(x, y);
      weight *= fading;
      ++seen;
    }
    return cost;
  }

  void move_back(std::vector<std::pair<std::uint32_t, std::uint32_t>>& undo, Origin origin) {
    const auto swaps = std::move(undo);
    undo.clear();
    std::vector<std::pair<std::uint32_t, std::uint32_t>> ignored;
    for (std::size_t k = swaps.size(); k-- > 0;) swap(swaps[k].first, swaps[k].second, origin, ignored);
  }

  /// swap = e^{i pi/4} exp(-i pi/4 (XX + YY + ZZ)): three interactions that commute, the last one between
  /// pulses that turn z into x.
  void swap(std::uint32_t a, std::uint32_t b, Origin origin,
            std::vector<std::pair<std::uint32_t, std::uint32_t>>& undo) {
    Circuit& circuit = placed_.circuit;
    const auto interact = [&](double phase) {
      out_.push_back(circuit.make(Kind::xx, {a, b}, {{pi / 2}, {phase}, {phase}}, origin));
    };
    const auto turn = [&](double phase) {
      for (const std::uint32_t ion : {a, b}) {
        out_.push_back(circuit.make(Kind::r, {ion}, {{pi / 2}, {phase}}, origin));
      }
    };
    interact(0);
    interact(pi / 2);
    turn(-pi / 2);
    interact(0);
    turn(pi / 2);
    std::swap(wire_on_[a], wire_on_[b]);
    if (wire_on_[a] != nobody) ion_of_[wire_on_[a]] = a;
    if (wire_on_[b] != nobody) ion_of_[wire_on_[b]] = b;
    placed_.in_use[a] = placed_.in_use[b] = true;
    undo.emplace_back(a, b);
    ++placed_.moves;
  }

  [[noreturn]] void refuse(const Operation& op, std::uint32_t a, std::uint32_t b) const {
    const auto lines = source_.origins.lines(op.origin);
    const char* reason = "no chain of reachable pairs joins them";
    if (routes_.is_held(a) && routes_.is_held(b)) {
      reason = "this pair is not reachable, and physical qubits do not move";
    } else if (has_pinned(source_)) {
      reason = "no chain of reachable pairs joins them without moving a physical qubit";
    }
    throw Failure(
        Exit::target_cannot,
        fmt::format("the machine {} cannot bring ions {} and {} together ({} and {}{}): {}", target_.name, a,
                    b, source_.wire_name(op.operand[0]), source_.wire_name(op.operand[1]),
                    lines.empty() ? "" : fmt::format(", line {} of the source", lines.front()), reason));
  }

  const Circuit& source_;
  const Target& target_;
  const Routes& routes_;
  std::vector<std::uint32_t> ion_of_;
  std::vector<std::uint32_t> wire_on_;
  Placed placed_;
  Block out_;
};

}  // namespace

Placed routed(const Circuit& circuit, const Target& target, const Routes& routes,
              const std::vector<std::uint32_t>& ion_of) {
  return Router(circuit, target, routes, ion_of).run();
}

namespace {

/// Errors of all pulses and interactions.
double cost_of(const Placed& placed, const Target& target) {
  double sum = 0;
  for (const Block& block : placed.circuit.blocks) {
    for (const Operation& op : block) {
      if (op.kind == Kind::r) sum += target.ion[op.operand[0]].pulse_error.value;
      if (op.kind == Kind::measure) sum += target.ion[op.operand[0]].measure_error.value;
      if (op.kind != Kind::xx) continue;
      sum += target.pair(op.operand[0], op.operand[1]).error(op.form[0] == 0 ? op.value[0] : pi / 2);
    }
  }
  return sum;
}

/// The interactions of the program alone, in either direction, with every wire's end to be told.
Circuit interactions_of(const Circuit& circuit, bool backwards) {
  Circuit bare;
  add_register(bare, "w", circuit.wires);
  bare.forms = circuit.forms;
  for (const Operation& op : circuit.body()) {
    if (op.kind == Kind::xx) bare.body().push_back(op);
  }
  if (backwards) std::reverse(bare.body().begin(), bare.body().end());
  return bare;
}

}  // namespace

Placed best_routed(const Circuit& circuit, const Target& target, const Routes& routes,
                   const std::vector<std::vector<std::uint32_t>>& beginnings) {
  constexpr std::size_t long_program = 100'000;  // then the first beginning must do
  constexpr int most_turns = 3;
  const Circuit forth = interactions_of(circuit, false);
  const Circuit back = interactions_of(circuit, true);
  const bool is_long = forth.body().size() > long_program;

  std::optional<Placed> best;
  double least = 0;
  const auto compete = [&](const std::vector<std::uint32_t>& beginning) {
    Placed candidate = routed(circuit, target, routes, beginning);
    const double cost = cost_of(candidate, target);
    if (best && cost >= least - 1e-12) return false;
    least = cost;
    best = std::move(candidate);
    return true;
  };
  std::optional<Failure> refusal;  // of the best beginning that no way leads on from
  for (std::size_t i = 0; i < beginnings.size() && !(is_long && best); ++i) {
    std::vector<std::uint32_t> beginning = beginnings[i];
    try {
      compete(beginning);
    } catch (const Failure& failure) {
      if (!refusal) refusal = failure;
      continue;
    }
    for (int turn = 0; turn < most_turns && best->moves > 0 && !is_long; ++turn) {
      const auto there = routed(forth, target, routes, beginning).circuit.end_wire;
      beginning = routed(back, target, routes, there).circuit.end_wire;
      if (!compete(beginning)) break;
    }
  }
  if (!best) throw *refusal;
  return std::move(*best);
}

}  // namespace isinglass
