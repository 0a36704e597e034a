// Interactions about the same axes add their angles; those that add up to nothing are gone.
//
//     --xx(s)--*--xx(t)--        --xx(s+t)--*--
//       |      |  |        ==>     |        |
//     --xx-----|--xx-----        --xx-------|--
//     ---------Z---------        -----------Z--
//
// On each wire the axis form shows runs of items with parallel axes, which commute. Two interactions that lie
// in the same run on both their wires meet, whatever else lies in these runs. One sweep with a table of (run,
// run); a sweep in which something vanished is followed by another, because runs may have joined. Symbolic
// angles add like numbers. (Common practice.)
#include "passes/merge_rotations.h"

#include <algorithm>
#include <cstdint>
#include <vector>

#include "passes/stretches.h"

namespace isinglass {

namespace {

/// The place of the first item of each key: linear probing, never a removal, so that nothing is allocated an
/// item.
class Homes {
 public:
  void clear() {
    slots_.assign(std::max<std::size_t>(slots_.size(), 1024), {});
    count_ = 0;
  }
  std::size_t size() const { return count_; }

  /// The place under this key; `fresh` where there was none, which it is from then on. Keys are not 0.
  std::size_t find_or_add(std::uint64_t key, std::size_t fresh) {
    if (2 * count_ >= slots_.size()) resize(2 * slots_.size());
    Slot& slot = slot_of(key);
    if (slot.key == key) return slot.place;
    slot = {key, fresh};
    ++count_;
    return fresh;
  }

  /// Drops what `is_closed` says will not be asked for again: called with the place.
  template <typename IsClosed>
  void forget(const IsClosed& is_closed) {
    std::vector<Slot> old = std::move(slots_);
    std::erase_if(old, [&](const Slot& slot) { return slot.key == 0 || is_closed(slot.key, slot.place); });
    slots_.clear();
    clear();
    for (const Slot& slot : old) find_or_add(slot.key, slot.place);
  }

 private:
  struct Slot {
    std::uint64_t key = 0;
    std::size_t place = 0;
  };

  Slot& slot_of(std::uint64_t key) {
    constexpr std::uint64_t golden = 0x9e3779b97f4a7c15u;  // Knuth's multiplicative hashing
    std::size_t at = (key * golden) >> 32 & (slots_.size() - 1);
    while (slots_[at].key != 0 && slots_[at].key != key) at = (at + 1) & (slots_.size() - 1);
    return slots_[at];
  }

  void resize(std::size_t slots) {
    std::vector<Slot> old(slots);
    old.swap(slots_);
    for (const Slot& slot : old) {
      if (slot.key != 0) slot_of(slot.key) = slot;
    }
  }

  std::vector<Slot> slots_;  // their number is a power of 2
  std::size_t count_ = 0;
};

class Merger {
 public:
  explicit Merger(AxisForm& form) : form_(form) {}

  /// Returns whether anything vanished.
  bool sweep(AxisBlock& block) {
    run_.assign(form_.shell.wires, {});
    home_.clear();
    Pusher pusher(form_.shell.wires);
    std::vector<Item>& items = block.items;
    std::size_t kept = 0;  // items[0 ... kept) are done: the list is rewritten in its own place
    for (std::size_t i = 0; i < items.size(); ++i) {
      Item item = items[i];
      if (item.what == Item::What::fence) {
        Fence& fence = block.fences[item.fence];
        pusher.arrive(fence, form_);
        for (const std::uint32_t wire : fence.wires) run_[wire].number = 0;
        items[kept++] = item;
        continue;
      }
      pusher.arrive(item);
      forget_closed_runs(items);
      const std::size_t home = home_.find_or_add(key_of(item), kept);
      if (home == kept) {
        items[kept++] = item;
      } else {
        add(items[home], item, pusher);
      }
    }
    items.resize(kept);
    pusher.finish(block, form_);
    const auto vanished = std::erase_if(items, [](const Item& item) {
      return item.what != Item::What::fence && item.angle.is_known() && std::abs(item.angle.constant) < 1e-13;
    });
    return vanished > 0;
  }

 private:
  struct Run {
    std::uint32_t number = 0;  // 0: none yet
    Axis axis = Axis::Zero();
  };

  /// The number of the run that the axis belongs to; opens one where it must.
  std::uint32_t run_of(std::uint32_t wire, const Axis& axis) {
    Run& run = run_[wire];
    if (run.number == 0 || !are_parallel(run.axis, axis)) run = {++runs_, axis};
    return run.number;
  }

  /// Equal for items that may meet: run numbers are unique over wires and stretches.
  std::uint64_t key_of(const Item& item) {
    std::uint64_t low = run_of(item.wire[0], item.axis[0]);
    std::uint64_t high = item.is_interaction() ? run_of(item.wire[1], item.axis[1]) : 0;
    if (low > high) std::swap(low, high);
    return high << 32 | low;
  }

  /// Keeps the table as small as the runs that are still open, so that it stays in the cache.
  void forget_closed_runs(const std::vector<Item>& items) {
    if (home_.size() < most_homes_) return;
    home_.forget([&](std::uint64_t key, std::size_t place) {
      const Item& item = items[place];
      for (int side = 0; side < item.wire_count(); ++side) {
        const std::uint64_t number = run_[item.wire[side]].number;
        if (number != key >> 32 && number != (key & 0xffffffffu)) return true;
      }
      return false;
    });
    most_homes_ = 2 * home_.size() + 4096;
  }

  void add(Item& home, const Item& item, Pusher& pusher) {
    const bool is_crossed = home.wire[0] != item.wire[0];
    double sign = 1;
    for (int side = 0; side < item.wire_count(); ++side) {
      if (home.axis[is_crossed ? 1 - side : side].dot(item.axis[side]) < 0) sign = -sign;
    }
    const Angle more = sign > 0 ? item.angle : form_.shell.forms.negated(item.angle);
    home.angle = form_.shell.forms.sum(home.angle, more);
    home.origin = form_.shell.origins.merged(home.origin, item.origin);
    if (!home.angle.is_known()) return;
    if (!home.is_interaction()) {  // the inputs cancelled: what is left is a gate as any other
      pusher.push(home.wire[0], rotation(home.axis[0], home.angle.constant));
      home.angle = {};
      return;
    }
    // Beyond a quarter turn the local half turns are cheaper taken out; all in between is parallel to them.
    const double halves = half_turns(home.angle.constant);
    home.angle.constant -= halves * pi;
    if (std::fmod(halves, 2.0) == 0) return;
    for (int side = 0; side < 2; ++side) pusher.push(home.wire[side], rotation(home.axis[side], pi));
  }

  AxisForm& form_;
  std::vector<Run> run_;
  Homes home_;
  std::size_t most_homes_ = 4096;
  std::uint32_t runs_ = 0;
};

}  // namespace

std::optional<Circuit> merge_rotations_beside(const Circuit& circuit, const PassContext& context) {
  AxisForm form = axis_form(circuit);
  Merger merger(form);
  const bool is_quick = context.effort == Effort::quick;
  const int most_sweeps = is_quick ? 1 : 20;
  for (AxisBlock& block : form.blocks) {
    for (int sweep = 0; sweep < most_sweeps && merger.sweep(block); ++sweep) {
    }
  }
  Circuit merged = native_form(std::move(form), context.promise);
  // The quick order lowers with this pass: it wants the normal form, whatever it was given.
  if (is_quick || tally_of(merged, context.cost).error < tally_of(circuit, context.cost).error) return merged;
  return std::nullopt;
}

Circuit merge_rotations(Circuit circuit, const PassContext& context) {
  if (auto merged = merge_rotations_beside(circuit, context)) return std::move(*merged);
  return circuit;
}

}  // namespace isinglass
