// Gathering two-qubit stretches under commutation; see stretches.h.
#include "passes/stretches.h"

#include <algorithm>

namespace isinglass {

namespace {

constexpr std::uint32_t none = 0xffffffffu;
constexpr int furthest = 64;  // stretches that a wire is searched back, so that the whole stays linear

class Gatherer {
 public:
  Gatherer(const AxisBlock& block) : block_(block), line_(block.end_frames.size()) {}

  /// Takes the items in the order of time, or all of them against it.
  void take(std::uint32_t index) {
    const Item& item = block_.items[index];
    if (item.what == Item::What::fence) {
      open(index);
      for (const std::uint32_t wire : block_.fences[item.fence].wires) line_[wire].clear();
      return;
    }
    if (item.is_interaction() && item.angle.is_known()) {
      const std::uint32_t home = home_of(item);
      if (home != none) {
        join(home, index);
        return;
      }
    }
    const std::uint32_t fresh = open(index);
    Open& stretch = open_[fresh];
    for (int side = 0; side < item.wire_count(); ++side) {
      stretch.wire[side] = item.wire[side];
      stretch.axis[side] = item.axis[side];
      line_[item.wire[side]].push_back(fresh);
    }
    stretch.is_numeric = item.is_interaction() && item.angle.is_known();
  }

  Stretches finish(Direction direction) {
    Stretches result;
    result.list.reserve(open_.size());
    result.members.reserve(block_.items.size());
    if (direction == Direction::to_the_right) std::reverse(open_.begin(), open_.end());
    for (const Open& stretch : open_) {
      Stretch done;
      done.first = static_cast<std::uint32_t>(result.members.size());
      done.is_numeric = stretch.is_numeric;
      for (std::uint32_t i = stretch.head; i != none; i = next_[i]) result.members.push_back(i);
      done.count = static_cast<std::uint32_t>(result.members.size()) - done.first;
      if (direction == Direction::to_the_right) {
        std::reverse(result.members.begin() + done.first, result.members.end());
      }
      result.list.push_back(done);
    }
    return result;
  }

 private:
  struct Open {
    std::uint32_t head = none;  // list of items through next_
    std::uint32_t tail = none;
    std::uint32_t wire[2] = {none, none};
    Axis axis[2];
    bool is_single[2] = {true, true};  // all items have this axis on this side
    bool is_numeric = false;

    int side_of(std::uint32_t w) const { return wire[0] == w ? 0 : 1; }
  };

  std::uint32_t open(std::uint32_t index) {
    if (next_.empty()) next_.assign(block_.items.size(), none);
    open_.emplace_back();
    open_.back().head = open_.back().tail = index;
    return static_cast<std::uint32_t>(open_.size() - 1);
  }

  void join(std::uint32_t home, std::uint32_t index) {
    Open& stretch = open_[home];
    next_[stretch.tail] = index;
    stretch.tail = index;
    const Item& item = block_.items[index];
    for (int side = 0; side < 2; ++side) {
      const int mine = stretch.side_of(item.wire[side]);
      if (!are_parallel(stretch.axis[mine], item.axis[side])) stretch.is_single[mine] = false;
    }
  }

  /// The stretch on the item's own pair that it can be moved to, or none.
  std::uint32_t home_of(const Item& item) const {
    const std::uint32_t home = reach(item, 0);
    return home != none && reach(item, 1) == home ? home : none;
  }

  std::uint32_t reach(const Item& item, int side) const {
    const auto& line = line_[item.wire[side]];
    const std::uint32_t partner = item.wire[1 - side];
    int steps = 0;
    for (auto place = line.rbegin(); place != line.rend() && steps < furthest; ++place, ++steps) {
      const Open& stretch = open_[*place];
      const int mine = stretch.side_of(item.wire[side]);
      if (stretch.is_numeric && stretch.wire[1 - mine] == partner) return *place;
      if (!stretch.is_single[mine] || !are_parallel(stretch.axis[mine], item.axis[side])) return none;
    }
    return none;
  }

  const AxisBlock& block_;
  std::vector<Open> open_;
  std::vector<std::uint32_t> next_;               // the item after this one in its stretch
  std::vector<std::vector<std::uint32_t>> line_;  // stretches on each wire since its last fence
};

}  // namespace

Stretches gathered(const AxisBlock& block, Direction direction) {
  Gatherer gatherer(block);
  const auto count = static_cast<std::uint32_t>(block.items.size());
  for (std::uint32_t i = 0; i < count; ++i) {
    gatherer.take(direction == Direction::to_the_left ? i : count - 1 - i);
  }
  return gatherer.finish(direction);
}

Matrix4 unitary_of(std::span<const Item> items, std::uint32_t first_wire) {
  Matrix4 u = Matrix4::Identity();
  for (const Item& item : items) {
    const int first = item.wire[0] == first_wire ? 0 : 1;
    u = interaction_matrix(item.axis[first], item.axis[1 - first], item.angle.constant) * u;
  }
  return u;
}

// after middle before = (after before) (before^-1 middle before): turned axes, then locals to push.
void write_canonical(const Canonical& form, const std::uint32_t wire[2], Origin origin,
                     std::vector<Item>& out, Pusher& pusher) {
  const double coordinate[3] = {form.point.x, form.point.y, form.point.z};
  for (int k = 0; k < 3; ++k) {
    if (std::abs(coordinate[k]) < rounding) continue;
    Item item;
    Axis n = Axis::Zero();
    n(k) = 1;
    for (int side = 0; side < 2; ++side) {
      item.wire[side] = wire[side];
      item.axis[side] = form.before[side].conjugate() * n;
    }
    item.angle = {2 * coordinate[k]};
    item.origin = origin;
    out.push_back(item);
  }
  for (int side = 0; side < 2; ++side) pusher.push(wire[side], form.after[side] * form.before[side]);
}

}  // namespace isinglass
