// Lets Toffolis leave phases behind where another Toffoli takes them back.
//
//   before   c-c-x a b t   (work that copies t)   c-c-x a b t        5 + 5 interactions
//   after    [a: Ry(-pi/2)] c-z b t [a: Ry(pi/2)]   (work)   the same 3 + 3 interactions
//
// Idea. A Toffoli of three interactions multiplies the state by a sign (-1)^P, P = b t (1 + a), with a, b, t
// the bits on its wires; one of four by i^Q or (-i)^Q, Q = a b. Write the circuit as a sum over paths: every
// bit on every wire is a function of the path variables, and phases are functions of them, too. Rule: if the
// functions P of two Toffolis are the same polynomial, both signs together are +1 on every path, whatever
// stands between them, and the circuit's operator is exactly kept; with i^Q and (-i)^Q likewise, and an odd
// group of equal Q needs one controlled phase at its last member. If P is 0 (a target known to be |0>) one
// Toffoli alone may do it. Functions are compared exactly (boolean_values.h). Paths end where classical
// control may leave the program: nothing is paired across a branch or a classical statement.
//
// Papers: Barenco et al., PRA 52, 3457, section 6.2 (gates up to phases); Maslov, "Advantages of using
// relative-phase Toffoli gates", PRA 93, 022311; Amy, arXiv:1805.06908 (sums over paths). The rule by
// equal polynomials was derived for this program.
#include "passes/pair_toffolis.h"

#include <algorithm>
#include <array>
#include <map>
#include <optional>

#include "passes/boolean_values.h"
#include "passes/constructions.h"

namespace isinglass {

namespace {

using Value = BooleanValues::Value;

/// One Toffoli of a block.
struct Site {
  std::size_t position = 0;
  std::uint32_t control[2] = {0, 0};
  std::uint32_t target = 0;
  Value sign[2] = {0, 0};  // P if control[k] is the outer one
  Value product = 0;       // Q
  int epoch = 0;           // sites of different epochs are separated by classical control
  // A Toffoli on the same target, between which and this one nothing touches the target, and the index of our
  // control that it shares, unchanged in between.
  std::optional<int> shared_before;
  std::optional<int> shared_after;
  std::size_t neighbour_before = 0;

  std::optional<Toffoli> form;  // none: stays as it is
  int first = 0;                // index of the control that append_toffoli takes first
  bool needs_phase = false;     // the odd one of its group
};

bool is_toffoli(const Operation& op) {
  return op.kind == Kind::x && op.control_count() == 2;
}

bool is_diagonal(Kind kind) {
  return kind == Kind::phase || kind == Kind::z || kind == Kind::p || kind == Kind::rz || kind == Kind::zz ||
         kind == Kind::barrier || kind == Kind::delay;
}

/// Follows the bits on all wires through a block and notes its Toffolis.
class Reader {
 public:
  Reader(const Circuit& circuit, const std::vector<bool>& starts_in_zero)
      : circuit_(circuit), wire_(circuit.wires), written_(circuit.wires, 0), last_site_(circuit.wires) {
    for (std::uint32_t w = 0; w < circuit.wires; ++w) {
      wire_[w] = starts_in_zero[w] ? BooleanValues::zero : values_.fresh();
    }
  }

  std::vector<Site> read(const Block& block) {
    for (std::size_t i = 0; i < block.size(); ++i) {
      if (is_toffoli(block[i])) note(block[i], i);
      follow(block[i], i + 1);
    }
    return std::move(sites_);
  }

 private:
  void note(const Operation& op, std::size_t position) {
    Site site;
    site.position = position;
    site.epoch = epoch_;
    site.control[0] = op.operand[0];
    site.control[1] = op.operand[1];
    site.target = op.operand[2];
    const Value bits[2] = {wire_[site.control[0]], wire_[site.control[1]]};
    site.product = values_.product(bits[0], bits[1]);
    // P sees the target only where it is not flipped: before and after are the same there. The older value
    // is the one that a partner may have seen.
    const Value t = std::min(wire_[site.target], values_.sum(wire_[site.target], site.product));
    for (int outer = 0; outer < 2; ++outer) {
      const Value off = values_.complement(bits[outer]);
      site.sign[outer] = values_.product(values_.product(bits[1 - outer], off), t);
    }
    link_to_neighbour(site);
    last_site_[site.target] = sites_.size();
    sites_.push_back(site);
  }

  void link_to_neighbour(Site& site) {
    const std::optional<std::size_t> before = last_site_[site.target];
    if (!before) return;
    Site& other = sites_[*before];
    for (int mine = 0; mine < 2; ++mine) {
      for (int theirs = 0; theirs < 2; ++theirs) {
        const std::uint32_t wire = site.control[mine];
        if (wire != other.control[theirs] || written_[wire] > other.position) continue;
        site.shared_before = mine;
        site.neighbour_before = *before;
        other.shared_after = theirs;
      }
    }
  }

  void follow(const Operation& op, std::size_t time) {
    const auto operands = circuit_.operands(op);
    if (op.kind == Kind::branch || op.kind == Kind::classical) {
      ++epoch_;
      for (std::uint32_t w = 0; w < circuit_.wires; ++w) renew(w, time);
      return;
    }
    if (is_diagonal(op.kind)) {
      for (const std::uint32_t wire : operands) last_site_[wire].reset();
      return;
    }
    const auto controls = circuit_.controls(op);
    if (op.is_unitary()) {
      for (const std::uint32_t wire : controls) last_site_[wire].reset();
    }
    if (op.kind == Kind::x) {
      Value all = BooleanValues::one;
      for (const std::uint32_t wire : controls) all = values_.product(all, wire_[wire]);
      const std::uint32_t target = operands.back();
      wire_[target] = values_.sum(wire_[target], all);
      written_[target] = time;
      if (!is_toffoli(op)) last_site_[target].reset();
      return;
    }
    if (op.kind == Kind::swap && controls.empty()) {
      std::swap(wire_[operands[0]], wire_[operands[1]]);
      for (const std::uint32_t wire : operands) {
        written_[wire] = time;
        last_site_[wire].reset();
      }
      return;
    }
    if (op.kind == Kind::swap && controls.size() == 1) {
      for (const std::uint32_t wire : operands.last(2)) {
        written_[wire] = time;
        last_site_[wire].reset();
      }
      const Value moved =
          values_.product(wire_[operands[0]], values_.sum(wire_[operands[1]], wire_[operands[2]]));
      wire_[operands[1]] = values_.sum(wire_[operands[1]], moved);
      wire_[operands[2]] = values_.sum(wire_[operands[2]], moved);
      return;
    }
    const auto changed = op.is_unitary() ? circuit_.targets(op) : operands;
    for (const std::uint32_t wire : changed) renew(wire, time);
    if (op.kind == Kind::reset) wire_[operands[0]] = BooleanValues::zero;
  }

  void renew(std::uint32_t wire, std::size_t time) {
    wire_[wire] = values_.fresh();
    written_[wire] = time;
    last_site_[wire].reset();
  }

  const Circuit& circuit_;
  BooleanValues values_;
  std::vector<Value> wire_;
  std::vector<std::size_t> written_;  // 1 + position of the last operation that changed the bit
  std::vector<std::optional<std::size_t>>
      last_site_;  // the Toffoli that touched the wire last, as its target
  std::vector<Site> sites_;
  int epoch_ = 0;
};

/// The control that should be outermost: the one a neighbour on the same target shares.
int preferred_outer(const Site& site) {
  return site.shared_before.value_or(site.shared_after.value_or(0));
}

void make_relative(Site& site, int outer) {
  site.form = Toffoli::relative;
  site.first = outer;
}

/// Pairs of equal P take the form of three interactions.
void choose_relative(std::vector<Site>& sites) {
  std::map<std::pair<int, Value>, std::pair<std::size_t, int>> waiting;  // by epoch and P: site, outer
  for (std::size_t i = 0; i < sites.size(); ++i) {
    Site& site = sites[i];
    const int preferred = preferred_outer(site);
    const std::array<int, 2> outers = {preferred, 1 - preferred};
    for (const int outer : outers) {
      if (!site.form && site.sign[outer] == BooleanValues::zero) make_relative(site, outer);
    }
    for (const int outer : outers) {
      const auto partner = waiting.find({site.epoch, site.sign[outer]});
      if (site.form || partner == waiting.end()) continue;
      const auto [j, outer_of_j] = partner->second;
      if (sites[j].form) continue;
      make_relative(sites[j], outer_of_j);
      make_relative(site, outer);
    }
    if (site.form) continue;
    // The less preferred first, so that the preferred one stays when both P are equal.
    waiting[{site.epoch, site.sign[1 - preferred]}] = {i, 1 - preferred};
    waiting[{site.epoch, site.sign[preferred]}] = {i, preferred};
  }
}

/// Groups of equal Q take the form of four interactions, with alternating signs.
void choose_groups(std::vector<Site>& sites) {
  std::map<std::pair<int, Value>, std::vector<std::size_t>> groups;
  for (std::size_t i = 0; i < sites.size(); ++i) {
    if (!sites[i].form) groups[{sites[i].epoch, sites[i].product}].push_back(i);
  }
  for (const auto& [key, members] : groups) {
    if (members.size() < 2) continue;
    bool is_minus = true;
    for (const std::size_t i : members) {
      sites[i].form = is_minus ? Toffoli::minus_i : Toffoli::plus_i;
      is_minus = !is_minus;
    }
    if (members.size() % 2 == 1) sites[members.back()].form = Toffoli::exact_minus;
  }
}

bool is_plus(Toffoli form) {
  return form == Toffoli::plus_i || form == Toffoli::exact_plus;
}

/// Along a target, the last rotation of one Toffoli and the first of the next are by the control they share,
/// and inverse where the signs may be chosen.
void turn_ends(std::vector<Site>& sites) {
  for (Site& site : sites) {
    if (site.form == Toffoli::relative) continue;
    if (!site.shared_before && !site.shared_after) continue;
    if (!site.shared_before) {
      site.first = 1 - *site.shared_after;
      if (!site.form) site.form = Toffoli::exact_minus;
      continue;
    }
    site.first = *site.shared_before;
    const Site& before = sites[site.neighbour_before];
    if (!site.form) {
      const bool follows_minus = before.form && before.form != Toffoli::relative && !is_plus(*before.form);
      site.form = follows_minus ? Toffoli::exact_plus : Toffoli::exact_minus;
    }
  }
}

Block rewritten(Circuit& circuit, const Block& block, const std::vector<Site>& sites) {
  Block result;
  result.reserve(block.size() + 5 * sites.size());
  std::size_t next = 0;
  for (std::size_t i = 0; i < block.size(); ++i) {
    if (next == sites.size() || sites[next].position != i) {
      result.push_back(block[i]);
      continue;
    }
    const Site& site = sites[next++];
    if (!site.form) {
      result.push_back(block[i]);
      continue;
    }
    append_toffoli(circuit, *site.form, site.control[site.first], site.control[1 - site.first], site.target,
                   block[i].origin, result);
  }
  return result;
}

}  // namespace

Circuit pair_toffolis(Circuit circuit, const PassContext& context) {
  for (std::size_t b = 0; b < circuit.blocks.size(); ++b) {
    const Block& block = circuit.blocks[b];
    if (std::none_of(block.begin(), block.end(), is_toffoli)) continue;
    std::vector<bool> zero(circuit.wires);
    for (std::uint32_t w = 0; b == 0 && w < circuit.wires; ++w) {
      zero[w] = w >= circuit.source_qubits || context.promise.zero_start;
    }
    std::vector<Site> sites = Reader(circuit, zero).read(block);
    choose_relative(sites);
    choose_groups(sites);
    turn_ends(sites);
    circuit.blocks[b] = rewritten(circuit, circuit.blocks[b], sites);
  }
  return circuit;
}

}  // namespace isinglass
