// Finds Toffolis that arrive already expanded into Clifford and T gates.
//
//   before   h c; cx b c; tdg c; cx a c; t c; cx b c; tdg c; cx a c; t b; t c; h c; cx a b; t a; tdg b; cx a
//   b after    c-c-x a b c
//
// Idea. In the sum over paths a phase gate adds angle * (bit on its wire), wherever it stands. For any three
// bits f, g, h, a sign (-1)^{fgh} is pi/4 on f, g, h and f+g+h, and -pi/4 on f+g, f+h, g+h (sums modulo 2).
// So all phase gates of a stretch are collected by the bit they act on, and triples of bits that stand on
// three wires at the same time are sought for which taking out that pattern leaves fewer odd multiples of
// pi/4. Each becomes a doubly controlled z there; what remains of the phases goes back to where the bits
// first were. It does not matter how the gates were ordered, exchanged or merged before. The NOTs that only
// carried the phases then cancel in pairs, and h ... h around the z makes it a Toffoli.
//
// Papers: Selinger, "Quantum circuits of T-depth one", PRA 87, 042302 (the expansion); Amy, Maslov, Mosca,
// "Polynomial-time T-depth optimization of Clifford+T circuits via matroid partitioning", IEEE TCAD 33, 1476
// (phase polynomials). The search for triples was made for this program.
#include "passes/recover_toffolis.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <map>
#include <optional>
#include <set>
#include <span>
#include <unordered_set>

#include "passes/boolean_values.h"

namespace isinglass {

namespace {

using Value = BooleanValues::Value;

constexpr double eighth = pi / 4;
constexpr double tolerance = 1e-9;

bool is_phase_gate(const Operation& op) {
  const bool is_kind = op.kind == Kind::p || op.kind == Kind::rz || op.kind == Kind::z;
  return is_kind && op.operand_count == 1 && op.has_known_angles();
}
double angle_of(const Operation& op) {
  return op.kind == Kind::z ? pi : op.value[0];
}
bool is_odd_eighth(double angle) {
  return is_multiple(angle - eighth, 2 * eighth, tolerance);
}
bool is_fence(const Operation& op) {
  return op.kind == Kind::branch || op.kind == Kind::classical;
}
bool is_diagonal(Kind kind) {
  return kind == Kind::phase || kind == Kind::z || kind == Kind::p || kind == Kind::rz || kind == Kind::zz ||
         kind == Kind::barrier || kind == Kind::delay;
}

/// A sum of bits without its constant, and the constant.
struct Bit {
  Value value = 0;
  bool is_flipped = false;
};

/// Three bits on three wires at one time: before operation `position`.
struct Triple {
  std::size_t position = 0;
  std::array<std::uint32_t, 3> wires{};
  std::array<Bit, 7> bits{};  // the single bits, the sums of 0+1, 0+2, 1+2, and of all
};

/// What a sign on all three adds to the angle of sum i.
double share(const Triple& triple, std::size_t i) {
  const bool is_pair = i >= 3 && i < 6;
  return is_pair != triple.bits[i].is_flipped ? -eighth : eighth;
}

/// Where a phase can be put: on one wire, or on the sum of two.
struct Place {
  std::size_t position = 0;
  std::uint32_t wire = 0;
  std::optional<std::uint32_t> other;
  bool is_flipped = false;
};

/// One stretch of a block without classical control.
class Stretch {
 public:
  Stretch(Circuit& circuit, std::span<const Operation> operations, const PassContext& context)
      : circuit_(circuit), operations_(operations), context_(context) {}

  /// The stretch rewritten, or nothing where no triple is found in time.
  std::optional<Block> rewritten() {
    follow_bits();
    for (const auto& [value, angle] : phases_) {
      if (is_odd_eighth(angle)) odd_marks_.insert(values_.mark(value));
    }
    if (odd_marks_.empty()) return std::nullopt;
    find_triples();
    if (context_.out_of_time()) return std::nullopt;
    choose();
    if (chosen_.empty()) return std::nullopt;
    return written();
  }

 private:
  // ---- the bits on the wires ----

  void follow_bits() {
    for (std::uint32_t w = 0; w < circuit_.wires; ++w) start_.push_back(values_.fresh());
    on_wire_ = start_;
    changes_.resize(operations_.size());
    shared_at_.resize(circuit_.wires);
    for (std::size_t i = 0; i < operations_.size(); ++i) {
      const Operation& op = operations_[i];
      const auto operands = circuit_.operands(op);
      if (op.is_unitary() && operands.size() > 1) {
        for (const std::uint32_t wire : operands) shared_at_[wire].push_back(i);
      }
      if (is_phase_gate(op)) {
        const Bit bit = canonical(on_wire_[operands[0]]);
        phases_[bit.value] += bit.is_flipped ? -angle_of(op) : angle_of(op);
        places_.try_emplace(bit.value, Place{i, operands[0], std::nullopt, bit.is_flipped});
      } else if (!is_diagonal(op.kind)) {
        follow(op, operands, i);
      }
    }
    phases_.erase(BooleanValues::zero);  // of a bit that is known: a global phase
  }

  void follow(const Operation& op, std::span<const std::uint32_t> operands, std::size_t i) {
    if (op.kind == Kind::x) {
      Value all = BooleanValues::one;
      for (const std::uint32_t wire : circuit_.controls(op)) all = values_.product(all, on_wire_[wire]);
      return change(i, operands.back(), values_.sum(on_wire_[operands.back()], all));
    }
    if (op.kind == Kind::swap && op.control_count() == 0) {
      const Value first = on_wire_[operands[0]];
      change(i, operands[0], on_wire_[operands[1]]);
      return change(i, operands[1], first);
    }
    const auto renewed = op.is_unitary() ? circuit_.targets(op) : operands;
    for (const std::uint32_t wire : renewed) change(i, wire, values_.fresh());
  }
  void change(std::size_t i, std::uint32_t wire, Value value) {
    changes_[i].emplace_back(wire, value);
    on_wire_[wire] = value;
  }
  Bit canonical(Value value) {
    return values_.has_constant(value) ? Bit{values_.complement(value), true} : Bit{value, false};
  }
  double phase(Value value) const {
    const auto found = phases_.find(value);
    return found == phases_.end() ? 0 : found->second;
  }

  // ---- triples ----

  /// Looks at every time when a bit has just come to a wire, with the wires it is about to meet, until the
  /// deadline.
  void find_triples() {
    on_wire_ = start_;
    for (std::uint32_t wire = 0; wire < circuit_.wires; ++wire) look_at(wire, 0);
    for (std::size_t i = 0; i < operations_.size(); ++i) {
      if (i % 256 == 0 && context_.out_of_time()) return;
      for (const auto& [wire, value] : changes_[i]) on_wire_[wire] = value;
      for (const auto& [wire, value] : changes_[i]) look_at(wire, i + 1);
    }
  }

  void look_at(std::uint32_t wire, std::size_t position) {
    constexpr std::size_t most = 12;
    std::vector<std::uint32_t> partners;
    meet(wire, position, 8, partners);
    const std::vector<std::uint32_t> direct = partners;
    for (const std::uint32_t partner : direct) meet(partner, position, 4, partners);
    std::erase(partners, wire);
    if (partners.size() > most) partners.resize(most);
    for (std::size_t a = 0; a < partners.size(); ++a) {
      for (std::size_t b = a + 1; b < partners.size(); ++b) {
        consider({wire, partners[a], partners[b]}, position);
      }
    }
  }

  /// Adds the wires that share the next few operations with `wire`.
  void meet(std::uint32_t wire, std::size_t position, std::size_t operations,
            std::vector<std::uint32_t>& partners) const {
    const auto& shared = shared_at_[wire];
    auto next = std::lower_bound(shared.begin(), shared.end(), position);
    for (std::size_t k = 0; k < operations && next != shared.end(); ++k, ++next) {
      for (const std::uint32_t other : circuit_.operands(operations_[*next])) {
        const bool is_new = std::find(partners.begin(), partners.end(), other) == partners.end();
        if (other != wire && is_new) partners.push_back(other);
      }
    }
  }

  void consider(const std::array<std::uint32_t, 3>& wires, std::size_t position) {
    const Value f = on_wire_[wires[0]];
    const Value g = on_wire_[wires[1]];
    const Value h = on_wire_[wires[2]];
    if (!odd_marks_.contains(values_.mark(f) ^ values_.mark(g) ^ values_.mark(h))) return;
    const Value pair = values_.sum(f, g);
    const Bit all = canonical(values_.sum(pair, h));
    if (!is_odd_eighth(phase(all.value))) return;
    Triple triple;
    triple.position = position;
    triple.wires = wires;
    triple.bits = {canonical(f),
                   canonical(g),
                   canonical(h),
                   canonical(pair),
                   canonical(values_.sum(f, h)),
                   canonical(values_.sum(g, h)),
                   all};
    std::set<Value> distinct;
    for (const Bit& bit : triple.bits) distinct.insert(bit.value);
    if (distinct.size() < 7 || distinct.count(BooleanValues::zero) > 0) return;
    // Other wires or times with the same seven sums differ by cz gates.
    std::vector<Triple>& alike = triples_[std::move(distinct)];
    constexpr std::size_t most_alike = 16;
    if (alike.size() < most_alike) alike.push_back(triple);
  }

  int left_over(const Triple& triple) const {
    int count = 0;
    for (std::size_t i = 0; i < 7; ++i) {
      const double left = phase(triple.bits[i].value) - share(triple, i);
      if (!is_multiple(left, 2 * pi, tolerance)) ++count;
    }
    return count;
  }
  /// How many phases vanish; 0 unless the odd multiples of pi/4 become fewer.
  int gain(const Triple& triple) const {
    int odd = 0;
    int present = 0;
    for (const Bit& bit : triple.bits) {
      odd += is_odd_eighth(phase(bit.value)) ? 1 : -1;
      present += is_multiple(phase(bit.value), 2 * pi, tolerance) ? 0 : 1;
    }
    return odd > 0 ? present - left_over(triple) : 0;
  }

  /// The triples of largest gain first, until none gains.
  void choose() {
    for (int least = 7; least > 0; --least) {
      for (const auto& [sums, alike] : triples_) {
        const auto best = std::max_element(
            alike.begin(), alike.end(), [&](const Triple& a, const Triple& b) { return gain(a) < gain(b); });
        if (gain(*best) >= least) take_out(*best);
      }
    }
    std::stable_sort(chosen_.begin(), chosen_.end(),
                     [](const Triple& a, const Triple& b) { return a.position < b.position; });
  }

  void take_out(const Triple& triple) {
    constexpr std::size_t members[7][2] = {{0, 0}, {1, 1}, {2, 2}, {0, 1}, {0, 2}, {1, 2}, {0, 0}};
    for (std::size_t i = 0; i < 7; ++i) {
      const Bit& bit = triple.bits[i];
      phases_[bit.value] -= share(triple, i);
      if (i == 6) continue;  // was there, so it has a place
      Place place{triple.position, triple.wires[members[i][0]], std::nullopt, bit.is_flipped};
      if (i >= 3) place.other = triple.wires[members[i][1]];
      places_.try_emplace(bit.value, place);
    }
    chosen_.push_back(triple);
  }

  // ---- writing ----

  Block written() {
    std::vector<std::pair<Place, double>> left;
    for (const auto& [value, angle] : phases_) {
      if (!is_multiple(angle, 2 * pi, tolerance)) left.emplace_back(places_.at(value), wrapped(angle));
    }
    std::stable_sort(left.begin(), left.end(),
                     [](const auto& a, const auto& b) { return a.first.position < b.first.position; });
    Block out;
    auto next_triple = chosen_.begin();
    auto next_phase = left.begin();
    for (std::size_t i = 0; i <= operations_.size(); ++i) {
      const Origin origin = operations_[std::min(i, operations_.size() - 1)].origin;
      for (; next_triple != chosen_.end() && next_triple->position == i; ++next_triple) {
        out.push_back(circuit_.make(Kind::z, next_triple->wires, {}, origin));
      }
      for (; next_phase != left.end() && next_phase->first.position == i; ++next_phase) {
        const Place& place = next_phase->first;
        const Angle angle{place.is_flipped ? -next_phase->second : next_phase->second};
        out.push_back(place.other ? circuit_.make(Kind::zz, {place.wire, *place.other}, {angle}, origin)
                                  : circuit_.make(Kind::p, {place.wire}, {angle}, origin));
      }
      if (i < operations_.size() && !is_phase_gate(operations_[i])) out.push_back(operations_[i]);
    }
    return out;
  }

  Circuit& circuit_;
  std::span<const Operation> operations_;
  const PassContext& context_;
  BooleanValues values_;
  std::vector<Value> start_;
  std::vector<Value> on_wire_;
  std::vector<std::vector<std::pair<std::uint32_t, Value>>> changes_;  // by operation: wire, its new bit
  std::vector<std::vector<std::size_t>> shared_at_;                    // by wire: operations with other wires
  std::map<Value, double> phases_;
  std::unordered_set<std::uint64_t> odd_marks_;  // of the bits whose phase is an odd multiple of pi/4
  std::map<Value, Place> places_;
  std::map<std::set<Value>, std::vector<Triple>> triples_;  // by their seven sums
  std::vector<Triple> chosen_;
};

// ---- tidying up
// --------------------------------------------------------------------------------------------

enum class Acts : std::uint8_t { along_z, along_x, otherwise };

/// How an operation acts on its i-th operand.
Acts acts(const Operation& op, int i) {
  if (!op.is_unitary()) return Acts::otherwise;
  if (i < op.control_count() || is_diagonal(op.kind)) return Acts::along_z;
  return op.kind == Kind::x ? Acts::along_x : Acts::otherwise;
}

bool commute(const Circuit& circuit, const Operation& a, const Operation& b) {
  const auto of_a = circuit.operands(a);
  const auto of_b = circuit.operands(b);
  for (std::size_t i = 0; i < of_a.size(); ++i) {
    for (std::size_t j = 0; j < of_b.size(); ++j) {
      if (of_a[i] != of_b[j]) continue;
      const Acts first = acts(a, static_cast<int>(i));
      if (first == Acts::otherwise || first != acts(b, static_cast<int>(j))) return false;
    }
  }
  return true;
}

bool is_own_inverse(const Operation& op) {
  return op.kind == Kind::x || op.kind == Kind::h || (op.kind == Kind::z && op.operand_count > 1);
}

/// Removes pairs of equal gates that are their own inverse where all between them commutes.
void cancel_pairs(const Circuit& circuit, Block& block) {
  constexpr std::size_t window = 300;
  Block out;
  for (const Operation& op : block) {
    bool is_cancelled = false;
    for (std::size_t back = 1; is_own_inverse(op) && back <= std::min(window, out.size()); ++back) {
      const std::size_t j = out.size() - back;
      const auto mine = circuit.operands(op);
      const auto theirs = circuit.operands(out[j]);
      if (out[j].kind == op.kind && std::equal(mine.begin(), mine.end(), theirs.begin(), theirs.end())) {
        out.erase(out.begin() + static_cast<std::ptrdiff_t>(j));
        is_cancelled = true;
        break;
      }
      if (!commute(circuit, op, out[j])) break;
    }
    if (!is_cancelled) out.push_back(op);
  }
  block = std::move(out);
}

/// h [z with controls, NOTs on the wire] h becomes the same with NOTs and zs exchanged, where that makes a
/// Toffoli.
class BetweenHs {
 public:
  BetweenHs(Circuit& circuit, Block& block) : circuit_(circuit), block_(block) {}

  void run() {
    std::vector<std::optional<std::size_t>> opened(circuit_.wires);
    std::vector<std::vector<std::size_t>> inside(circuit_.wires);
    std::vector<bool> is_removed(block_.size());
    for (std::size_t i = 0; i < block_.size(); ++i) {
      const Operation& op = block_[i];
      const bool is_h = op.kind == Kind::h && op.operand_count == 1;
      const auto operands = circuit_.operands(op);
      if (is_h) {
        const std::uint32_t wire = op.operand[0];
        if (opened[wire] && exchange(inside[wire], wire)) {
          is_removed[*opened[wire]] = is_removed[i] = true;
          opened[wire].reset();
        } else {
          opened[wire] = i;
        }
        inside[wire].clear();
        continue;
      }
      for (const std::uint32_t wire : operands) {
        if (op.kind == Kind::z || (op.kind == Kind::x && wire == operands.back())) {
          inside[wire].push_back(i);
        } else {
          opened[wire].reset();
        }
      }
    }
    Block kept;
    for (std::size_t i = 0; i < block_.size(); ++i) {
      if (!is_removed[i]) kept.push_back(block_[i]);
    }
    block_ = std::move(kept);
  }

 private:
  bool exchange(const std::vector<std::size_t>& positions, std::uint32_t wire) {
    const bool makes_toffoli = std::any_of(positions.begin(), positions.end(), [&](std::size_t i) {
      return block_[i].kind == Kind::z && block_[i].operand_count >= 3;
    });
    // An operation may have become a NOT of another wire since.
    const bool is_allowed = std::all_of(positions.begin(), positions.end(), [&](std::size_t i) {
      return block_[i].kind == Kind::z || circuit_.operands(block_[i]).back() == wire;
    });
    if (!makes_toffoli || !is_allowed) return false;
    for (const std::size_t i : positions) {
      Operation& op = block_[i];
      std::vector<std::uint32_t> operands(circuit_.operands(op).begin(), circuit_.operands(op).end());
      std::erase(operands, wire);
      operands.push_back(wire);
      circuit_.set_operands(op, operands);
      op.kind = op.kind == Kind::z ? Kind::x : Kind::z;
    }
    return true;
  }

  Circuit& circuit_;
  Block& block_;
};

/// Interactions, roughly: 5 a Toffoli, 1 another operation on several wires.
std::size_t weight(std::span<const Operation> operations) {
  std::size_t sum = 0;
  for (const Operation& op : operations) {
    if (op.is_unitary() && op.operand_count > 1) sum += op.operand_count > 2 ? 5 : 1;
  }
  return sum;
}

void tidy(Circuit& circuit, Block& block) {
  for (std::size_t before = block.size() + 1; block.size() < before;) {
    before = block.size();
    cancel_pairs(circuit, block);
  }
  BetweenHs(circuit, block).run();
  for (std::size_t before = block.size() + 1; block.size() < before;) {
    before = block.size();
    cancel_pairs(circuit, block);
  }
}

}  // namespace

Circuit recover_toffolis(Circuit circuit, const PassContext& context) {
  for (Block& block : circuit.blocks) {
    Block result;
    bool is_rewritten = false;
    for (std::size_t from = 0; from < block.size();) {
      std::size_t to = from;
      while (to < block.size() && !is_fence(block[to])) ++to;
      const std::span<const Operation> stretch(block.data() + from, to - from);
      std::optional<Block> better;
      if (!stretch.empty()) better = Stretch(circuit, stretch, context).rewritten();
      if (better) tidy(circuit, *better);
      if (better && weight(*better) <= weight(stretch)) {
        is_rewritten = true;
        result.insert(result.end(), better->begin(), better->end());
      } else {
        result.insert(result.end(), stretch.begin(), stretch.end());
      }
      if (to < block.size()) result.push_back(block[to]);
      from = to + 1;
    }
    if (is_rewritten) block = std::move(result);
  }
  return circuit;
}

}  // namespace isinglass
