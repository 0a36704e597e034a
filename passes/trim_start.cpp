// What the first interactions do to a known state is often less than what they could do.
//
//     |0> --xx--A--xx--              |0> --xx--A'--
//           |      |        ==>            |              one interaction makes any state of two qubits,
//     |0> --xx--B--xx--              |0> --xx--B'--
//
//     |0> --ZX--            |0> ------
//           |      ==>                                   and about an axis the state is fixed by, none at all
//         --ZX--                --rx--
//
// A wire's state is known at the start (all wires where the promise says so, ancillas always) and after a
// reset, until its first interaction. The state of two is written from its Schmidt form (computed).
#include "passes/trim_start.h"

#include <optional>

#include "passes/stretches.h"

namespace isinglass {

namespace {

/// The unitary that turns +z to the given state.
Su2 made_from_z(const Axis& state) {
  return Su2::FromTwoVectors(Axis::UnitZ(), state);
}

class Trimmer {
 public:
  Trimmer(AxisForm& form, const PassContext& context)
      : form_(form), context_(context), state_(form.shell.wires), pusher_(form.shell.wires) {}

  void run(AxisBlock& block) {
    if (block.is_body) {
      for (std::uint32_t w = 0; w < form_.shell.wires; ++w) {
        if (context_.promise.zero_start || w >= form_.shell.source_qubits) state_[w] = Axis::UnitZ();
      }
    }
    const Stretches stretches = gathered(block, Direction::to_the_left);
    for (const Stretch& stretch : stretches.list) {
      const std::size_t start = out_.size();
      std::optional<Axis> before[2];
      for (const std::uint32_t index : stretches.items(stretch)) {
        take(block, block.items[index], out_.size() == start ? before : nullptr);
      }
      if (stretch.is_numeric && before[0] && before[1]) prepare(start, *before[0], *before[1]);
    }
    pusher_.finish(block, form_);
    block.items = std::move(out_);
  }

 private:
  /// before: receives what was known of the wires of the item, if it is kept and has two.
  void take(AxisBlock& block, Item item, std::optional<Axis>* before) {
    if (item.what == Item::What::fence) {
      Fence& fence = block.fences[item.fence];
      pusher_.arrive(fence, form_);
      if (cross(fence)) out_.push_back(item);
      return;
    }
    pusher_.arrive(item);
    if (!absorb(item)) keep(item, before);
  }

  void keep(const Item& item, std::optional<Axis>* before) {
    for (int side = 0; side < item.wire_count(); ++side) {
      if (before) before[side] = state_[item.wire[side]];
      state_[item.wire[side]].reset();
    }
    out_.push_back(item);
  }

  /// What is known of the wires behind the fence; false where the fence itself is needless.
  bool cross(const Fence& fence) {
    const Kind kind = fence.operation.kind;
    bool is_needed = true;
    for (std::size_t i = 0; i < fence.wires.size(); ++i) {
      std::optional<Axis>& state = state_[fence.wires[i]];
      if (state) state = Axis(fence.frames[i] * *state);
      if (kind == Kind::reset) {
        is_needed = !state || !((*state - Axis::UnitZ()).norm() < rounding);
        state = Axis::UnitZ();
      } else if (kind != Kind::barrier && kind != Kind::delay) {
        state.reset();
      }
    }
    return is_needed;
  }

  /// An interaction about the axis of a known state turns only the other wire; a rotation about it nothing.
  bool absorb(const Item& item) {
    for (int side = 0; side < item.wire_count(); ++side) {
      const auto& state = state_[item.wire[side]];
      if (!state || !are_parallel(*state, item.axis[side])) continue;
      if (!item.is_interaction()) return true;
      const double sign = state->dot(item.axis[side]) > 0 ? 1 : -1;
      const std::uint32_t other = item.wire[1 - side];
      if (item.angle.is_known()) {
        pusher_.push(other, rotation(item.axis[1 - side], sign * item.angle.constant));
        return true;
      }
      Item turn = item;
      turn.what = Item::What::rotation;
      turn.wire[0] = other;
      turn.axis[0] = item.axis[1 - side];
      if (sign < 0) turn.angle = form_.shell.forms.negated(item.angle);
      if (!absorb(turn)) keep(turn, nullptr);
      return true;
    }
    return false;
  }

  /// Replaces the interactions out_[start...] of one pair by a single one where both wires' states are known.
  void prepare(std::size_t start, const Axis& first, const Axis& second) {
    const std::span<const Item> old(out_.data() + start, out_.size() - start);
    const std::uint32_t wire[2] = {old[0].wire[0], old[0].wire[1]};
    const Su2 maker[2] = {made_from_z(first), made_from_z(second)};
    const State4 made = (unitary_of(old, wire[0]) * kronecker(maker[0], maker[1])).col(0);
    const Schmidt form = schmidt(made);
    double error = 0;
    for (const Item& item : old) error += context_.cost.interaction(item.angle.constant);
    const bool is_product = form.angle < rounding;
    if ((is_product ? 0 : context_.cost.interaction(form.angle)) >= error * (1 - 1e-9)) return;
    Item item = old[0];
    for (const Item& more : old.subspan(1)) {
      item.origin = form_.shell.origins.merged(item.origin, more.origin);
    }
    item.angle = {form.angle};
    item.axis[0] = maker[0] * Axis::UnitX();
    item.axis[1] = maker[1] * Axis::UnitY();
    out_.resize(start);
    if (!is_product) out_.push_back(item);
    for (int side = 0; side < 2; ++side) {
      pusher_.push(wire[side], form.local[side] * maker[side].conjugate());
    }
  }

  AxisForm& form_;
  const PassContext& context_;
  std::vector<std::optional<Axis>> state_;  // Bloch vector in the stretch's coordinates, where it is known
  Pusher pusher_;
  std::vector<Item> out_;
};

}  // namespace

Circuit trim_start(Circuit circuit, const PassContext& context) {
  AxisForm form = axis_form(circuit);
  for (AxisBlock& block : form.blocks) Trimmer(form, context).run(block);
  return better_of(std::move(circuit), native_form(std::move(form), context.promise), context.cost);
}

}  // namespace isinglass
