// Phases before a measurement are no work, nor is what happens to qubits that nobody looks at.
//
//     --zz(t)--M        --M                 --xx--B--(dropped)        ---(dropped)
//       |          ==>             and        |                 ==>
//     --zz(t)--M        --M                 --zz--M                   ---M
//
// Looking back from the end, a wire may take any rotation about one axis for nothing: the measured one (given
// the bits, such a rotation is a global phase), or any rotation at all before a reset and, where only the
// bits are kept, at the end. An interaction that both its wires take for nothing is dropped. One that is kept
// leaves its wire with its own axis only: what is parallel to it can still be moved past it. (Common
// practice.)
#include "passes/trim_end.h"

#include <algorithm>

#include "passes/axis_form.h"

namespace isinglass {

namespace {

/// What a wire takes for nothing.
struct Tail {
  enum class What : std::uint8_t { nothing, about_axis, anything };
  What what = What::nothing;
  Axis axis = Axis::UnitZ();

  bool takes(const Axis& a) const {
    return what == What::anything || (what == What::about_axis && are_parallel(axis, a));
  }
};

class Trimmer {
 public:
  Trimmer(AxisForm& form, const Promise& promise) : form_(form), promise_(promise), tail_(form.shell.wires) {}

  void run(AxisBlock& block) {
    if (block.is_body && promise_.keep_bits_only) {
      for (Tail& tail : tail_) tail.what = Tail::What::anything;
    }
    std::vector<Item> kept;
    kept.reserve(block.items.size());
    for (auto item = block.items.rbegin(); item != block.items.rend(); ++item) {
      if (item->what == Item::What::fence) {
        cross(block.fences[item->fence]);
        kept.push_back(*item);
      } else if (!is_taken(*item)) {
        kept.push_back(*item);
        for (int side = 0; side < item->wire_count(); ++side) leave(*item, side);
      }
    }
    std::reverse(kept.begin(), kept.end());
    block.items = std::move(kept);
  }

 private:
  bool is_taken(const Item& item) const {
    for (int side = 0; side < item.wire_count(); ++side) {
      if (!tail_[item.wire[side]].takes(item.axis[side])) return false;
    }
    return true;
  }

  void leave(const Item& item, int side) {
    Tail& tail = tail_[item.wire[side]];
    if (!tail.takes(item.axis[side])) {
      tail.what = Tail::What::nothing;
    } else if (tail.what == Tail::What::anything) {
      tail = {Tail::What::about_axis, item.axis[side]};
    }
  }

  void cross(const Fence& fence) {
    const Kind kind = fence.operation.kind;
    for (std::size_t i = 0; i < fence.wires.size(); ++i) {
      Tail& tail = tail_[fence.wires[i]];
      if (kind == Kind::measure) {
        tail = {Tail::What::about_axis, fence.frames[i].conjugate() * Axis::UnitZ()};
      } else if (kind == Kind::reset) {
        tail.what = Tail::What::anything;
      } else if (kind == Kind::barrier || kind == Kind::delay) {
        tail.axis = fence.frames[i].conjugate() * tail.axis;
      } else {
        tail.what = Tail::What::nothing;
      }
    }
  }

  AxisForm& form_;
  const Promise& promise_;
  std::vector<Tail> tail_;
};

}  // namespace

Circuit trim_end(Circuit circuit, const PassContext& context) {
  AxisForm form = axis_form(circuit);
  for (AxisBlock& block : form.blocks) {
    // The end frames stand after the last item: with everything taken there, no axis needs to be turned.
    Trimmer(form, context.promise).run(block);
  }
  return better_of(std::move(circuit), native_form(std::move(form), context.promise), context.cost);
}

}  // namespace isinglass
