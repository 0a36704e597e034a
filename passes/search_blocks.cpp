// What happens on three or four wires is done with as few interactions as a numerical search finds.
//
//   before   xx a b; xx b c; xx a b; xx a c; xx b c; xx a b      (any angles and axes)
//   after    xx a c; xx b c; xx a c; xx a b                      (if such angles and axes exist)
//
// Idea. A block is a set of interactions on three (four) wires that nothing else comes between. Its unitary,
// or only its columns for wires still in |0>, is matched by shorter sequences of pairs, in ascending length,
// whose axes and angles are found by least squares from random starts (small_search.cpp); in the program's
// body the outputs may be renamed as well. Long blocks are first cut down to what any unitary of that size
// needs. Results are remembered by the block's local invariants, so that a pattern that occurs often is
// searched once.
//
// Papers: Shende, Bullock, Markov, quant-ph/0406176 (what generic unitaries need, by counting parameters);
// Davis et al., "Towards optimal topology aware quantum circuit synthesis", QCE 2020 (search over sequences
// of pairs).
#include "passes/search_blocks.h"

#include <algorithm>
#include <array>
#include <map>
#include <optional>
#include <set>

#include "passes/axis_form.h"
#include "passes/small_search.h"
#include "passes/stretches.h"

namespace isinglass {

namespace {

using Wires = std::vector<std::uint32_t>;

constexpr std::size_t longest_block = 40;
constexpr int generic_of_three = 11;  // interactions for any unitary of three wires

/// Members of a block, by their index in the AxisBlock; all can be moved to where the first stands.
struct SmallBlock {
  Wires wires;
  std::vector<std::size_t> members;
  unsigned fresh = 0;  // bit q: wires[q] is still in |0>
};

bool is_known_interaction(const Item& item) {
  return item.is_interaction() && item.angle.is_known();
}

Wires wires_of(const AxisBlock& block, const Item& item) {
  if (item.what == Item::What::fence) return block.fences[item.fence].wires;
  return {item.wire, item.wire + item.wire_count()};
}

/// The block of these wires that begins with item `first`.
SmallBlock grown(const AxisBlock& block, std::size_t first, const Wires& wires) {
  SmallBlock result{wires, {}, 0};
  std::vector<bool> is_closed(wires.size());
  std::size_t closed = 0;
  for (std::size_t i = first; i < block.items.size() && closed + 1 < wires.size(); ++i) {
    const Item& item = block.items[i];
    bool is_inside = is_known_interaction(item);
    std::vector<std::size_t> touched;
    for (const std::uint32_t wire : wires_of(block, item)) {
      const auto place = std::find(wires.begin(), wires.end(), wire);
      if (place == wires.end()) {
        is_inside = false;
        continue;
      }
      touched.push_back(static_cast<std::size_t>(place - wires.begin()));
      if (is_closed[touched.back()]) is_inside = false;
    }
    if (is_inside && result.members.size() < longest_block) {
      result.members.push_back(i);
      continue;
    }
    for (const std::size_t t : touched) {
      if (!is_closed[t]) ++closed;
      is_closed[t] = true;
    }
  }
  return result;
}

/// All blocks of `size` wires: for every set of wires one from each item that the one before has not taken.
std::vector<SmallBlock> blocks_of(const AxisBlock& block, std::size_t size) {
  constexpr std::size_t look_ahead = 24;
  std::vector<SmallBlock> blocks;
  std::map<Wires, std::set<std::size_t>> taken;
  for (std::size_t i = 0; i < block.items.size(); ++i) {
    if (!is_known_interaction(block.items[i])) continue;
    // sets of wires that grow along the next items
    std::set<Wires> sets;
    Wires start = wires_of(block, block.items[i]);
    std::sort(start.begin(), start.end());
    std::set<Wires> open{start};
    for (std::size_t j = i + 1; j < std::min(block.items.size(), i + look_ahead); ++j) {
      if (!is_known_interaction(block.items[j])) continue;
      const Item& next = block.items[j];
      std::set<Wires> more;
      for (const Wires& wires : open) {
        const bool has_first = std::binary_search(wires.begin(), wires.end(), next.wire[0]);
        const bool has_second = std::binary_search(wires.begin(), wires.end(), next.wire[1]);
        if (has_first == has_second) continue;
        Wires wider = wires;
        wider.push_back(has_first ? next.wire[1] : next.wire[0]);
        std::sort(wider.begin(), wider.end());
        (wider.size() == size ? sets : more).insert(wider);
      }
      open.insert(more.begin(), more.end());
      if (sets.size() > 6) break;
    }
    for (const Wires& wires : sets) {
      std::set<std::size_t>& used = taken[wires];
      if (used.count(i) > 0) continue;
      SmallBlock found = grown(block, i, wires);
      used.insert(found.members.begin(), found.members.end());
      if (found.members.size() > size) blocks.push_back(std::move(found));
    }
  }
  std::stable_sort(blocks.begin(), blocks.end(), [](const SmallBlock& a, const SmallBlock& b) {
    return a.members.size() > b.members.size();
  });
  return blocks;
}

SmallCircuit small_circuit(const AxisBlock& block, const SmallBlock& small) {
  SmallCircuit circuit;
  circuit.locals.assign(small.wires.size(), Su2::Identity());
  for (const std::size_t member : small.members) {
    const Item& item = block.items[member];
    Coupling coupling;
    for (const int side : {0, 1}) {
      const auto place = std::find(small.wires.begin(), small.wires.end(), item.wire[side]);
      coupling.qubit[side] = static_cast<std::uint8_t>(place - small.wires.begin());
      coupling.axis[side] = item.axis[side];
    }
    coupling.angle = item.angle.constant;
    circuit.couplings.push_back(coupling);
  }
  return circuit;
}

/// A better circuit for a block: its outputs come out permuted by `exchanges`, made one after the other.
struct Better {
  SmallCircuit circuit;
  std::vector<std::pair<int, int>> exchanges;
};

class Searcher {
 public:
  Searcher(const PassContext& context, std::int64_t starts) : context_(context), budget_(starts) {}

  bool is_over() const { return budget_ <= 0 || context_.out_of_time(); }

  std::optional<Better> improve(const SmallCircuit& now, unsigned fresh, bool may_rename) {
    SmallTarget target;
    target.qubits = static_cast<int>(now.locals.size());
    target.matrix = matrix_of(now);
    target.fresh = fresh;
    std::vector<std::int64_t> key = local_invariants(target);
    key.push_back(static_cast<std::int64_t>(now.couplings.size()));
    key.push_back(std::llround(1e6 * error_of(now, context_.cost) / context_.cost.interaction(pi / 2)));
    if (hopeless_.count(key) > 0) return std::nullopt;

    Better best{now, {}};
    if (target.qubits == 3) {
      cut_down(target, best);
      if (static_cast<int>(best.circuit.couplings.size()) <= longest_scan + 2) {  // else it is generic
        scan(target, best, {}, static_cast<int>(best.circuit.couplings.size()), 8);
        if (may_rename) rename(target, best);
      }
    } else {
      leave_out(target, best);
    }
    if (best.exchanges.empty()) {
      consider(best, with_less_angle(target, best.circuit, search(1), context_.cost), {});
    }
    const double gain = error_of(now, context_.cost) - error_of(best.circuit, context_.cost);
    if (gain <= 1e-6 * context_.cost.interaction(0)) {
      if (!is_over()) hopeless_.insert(std::move(key));
      return std::nullopt;
    }
    return best;
  }

 private:
  SmallSearch search(int starts) {
    return {context_.seed + ++searches_, starts, context_.deadline, &budget_};
  }

  void consider(Better& best, const std::optional<SmallCircuit>& found,
                const std::vector<std::pair<int, int>>& exchanges) {
    if (!found || found->couplings.size() > best.circuit.couplings.size()) return;
    if (error_of(*found, context_.cost) < error_of(best.circuit, context_.cost)) best = {*found, exchanges};
  }

  /// Long blocks: couplings around the triangle, as few as fit at once.
  void cut_down(const SmallTarget& target, Better& best) {
    int length = std::min(static_cast<int>(best.circuit.couplings.size()) - 1, generic_of_three);
    for (; length > longest_scan && !is_over(); --length) {
      std::vector<std::pair<int, int>> pairs;
      constexpr std::pair<int, int> triangle[] = {{0, 1}, {1, 2}, {0, 2}};
      for (int i = 0; i < length; ++i) pairs.push_back(triangle[i % 3]);
      const auto found = fitted(target, pairs, search(3), context_.cost);
      if (!found) break;
      consider(best, found, {});
      length = static_cast<int>(found->couplings.size());
    }
    leave_out(target, best);
  }

  void leave_out(const SmallTarget& target, Better& best) {
    while (!is_over()) {
      const auto found = with_one_fewer(target, best.circuit, search(1), context_.cost);
      if (!found) return;
      const std::size_t before = best.circuit.couplings.size();
      consider(best, found, {});
      if (best.circuit.couplings.size() == before) return;
    }
  }

  void scan(const SmallTarget& target, Better& best, const std::vector<std::pair<int, int>>& exchanges,
            int most, int starts) {
    consider(best, shortest(target, std::min(most, longest_scan), search(starts), context_.cost), exchanges);
  }

  /// The target with two outputs exchanged, or all three moved on, if that needs fewer couplings.
  void rename(const SmallTarget& target, Better& best) {
    const std::vector<std::vector<std::pair<int, int>>> all = {
        {{0, 1}}, {{0, 2}}, {{1, 2}}, {{0, 1}, {1, 2}}, {{1, 2}, {0, 1}}};
    for (const auto& exchanges : all) {
      if (is_over()) return;
      SmallTarget other = target;  // target = exchanges * other
      for (const auto& [a, b] : exchanges) exchange_rows(other.matrix, a, b);
      scan(other, best, exchanges, static_cast<int>(best.circuit.couplings.size()) - 1, 2);
    }
  }

  static void exchange_rows(Eigen::MatrixXcd& m, int a, int b) {
    for (Eigen::Index row = 0; row < m.rows(); ++row) {
      if (((row >> a) & 1) == 1 && ((row >> b) & 1) == 0) {
        m.row(row).swap(m.row(row ^ (Eigen::Index{1} << a) ^ (Eigen::Index{1} << b)));
      }
    }
  }

  static constexpr int longest_scan = 6;

  const PassContext& context_;
  std::int64_t budget_;
  std::uint64_t searches_ = 0;
  std::set<std::vector<std::int64_t>> hopeless_;
};

/// Puts the better circuit in the block's place.
void replace(AxisForm& form, AxisBlock& block, const SmallBlock& small, const Better& better) {
  Origin origin;
  for (const std::size_t member : small.members) {
    origin = form.shell.origins.merged(origin, block.items[member].origin);
  }
  std::vector<Item> out;
  Pusher pusher(form.shell.wires);
  for (std::size_t i = 0; i < block.items.size(); ++i) {
    if (i == small.members.front()) {
      for (const Coupling& coupling : better.circuit.couplings) {
        Item item;
        for (const int side : {0, 1}) {
          item.wire[side] = small.wires[coupling.qubit[side]];
          item.axis[side] = coupling.axis[side];
        }
        item.angle = {coupling.angle};
        item.origin = origin;
        out.push_back(item);
      }
      for (const auto& [a, b] : better.exchanges) {
        pusher.exchange(small.wires[static_cast<std::size_t>(a)], small.wires[static_cast<std::size_t>(b)]);
      }
      for (std::size_t q = 0; q < small.wires.size(); ++q)
        pusher.push(small.wires[q], better.circuit.locals[q]);
    }
    if (std::binary_search(small.members.begin(), small.members.end(), i)) continue;
    Item item = block.items[i];
    if (item.what == Item::What::fence) pusher.arrive(block.fences[item.fence], form);
    pusher.arrive(item);
    out.push_back(item);
  }
  pusher.finish(block, form);
  block.items = std::move(out);
}

std::vector<bool> untouched_before(const AxisBlock& block, std::size_t position, std::uint32_t wires) {
  std::vector<bool> untouched(wires, true);
  for (std::size_t i = 0; i < position; ++i) {
    for (const std::uint32_t wire : wires_of(block, block.items[i])) untouched[wire] = false;
  }
  return untouched;
}

}  // namespace

Circuit search_blocks(Circuit circuit, const PassContext& context) {
  constexpr std::int64_t starts = 6000;
  Searcher searcher(context, starts);
  AxisForm form = axis_form(circuit);
  for (AxisBlock& block : form.blocks) {
    for (const std::size_t size : {3u, 4u}) {
      bool has_changed = true;
      while (has_changed && !searcher.is_over()) {
        has_changed = false;
        for (SmallBlock& small : blocks_of(block, size)) {
          if (searcher.is_over()) break;
          const std::vector<bool> untouched =
              untouched_before(block, small.members.front(), form.shell.wires);
          for (std::size_t q = 0; q < size; ++q) {
            const bool is_zero = context.promise.zero_start || small.wires[q] >= form.shell.source_qubits;
            if (block.is_body && is_zero && untouched[small.wires[q]]) small.fresh |= 1u << q;
          }
          const auto better = searcher.improve(small_circuit(block, small), small.fresh, block.may_rename);
          if (!better) continue;
          replace(form, block, small, *better);
          has_changed = true;
          break;  // the indices have moved
        }
      }
    }
  }
  return better_of(std::move(circuit), native_form(std::move(form), context.promise), context.cost);
}

}  // namespace isinglass
