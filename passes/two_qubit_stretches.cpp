// Whatever happens on one pair of wires takes three interactions at most, two or one where it can.
//
//     --xx--A--xx--B--xx--C--xx--        --A'--xx(2x)--xx(2y)--xx(2z)--B'--
//       |      |      |      |     ==>         |       |       |
//     --xx--D--xx--E--xx--F--xx--        --C'--xx------xx------xx------D'--
//
// Stretches are gathered through what they commute with, multiplied out and written anew from the canonical
// decomposition: 2x, 2y, 2|z| are the least angles (Vidal, Hammerer, Cirac, PRL 88, 237902) and their number,
// zeros left out, is least (compare Peterson, Crooks, Smith, arXiv:1904.10541). Counts are decided on the
// coordinates themselves, so small angles are never taken for nothing. Where the unitary times SWAP is
// cheaper and the wires may change names, it is taken (Cross et al., PRA 100, 032328).
#include "passes/two_qubit_stretches.h"

#include "passes/stretches.h"

namespace isinglass {

namespace {

double error_of(const Chamber& point, const Cost& cost) {
  double error = 0;
  for (const double c : {point.x, point.y, std::abs(point.z)}) {
    if (c > rounding) error += cost.interaction(2 * c);
  }
  return error;
}

double error_of(std::span<const Item> items, const Cost& cost) {
  double error = 0;
  for (const Item& item : items) error += cost.interaction(item.angle.constant);
  return error;
}

class Resynthesis {
 public:
  Resynthesis(AxisForm& form, const Cost& cost, bool may_rename)
      : form_(form), cost_(cost), may_rename_(may_rename) {}

  void run(AxisBlock& block, Direction direction) {
    const Stretches stretches = gathered(block, direction);
    const bool may_rename = may_rename_ && block.may_rename;
    Pusher pusher(form_.shell.wires);
    std::vector<Item> out;
    out.reserve(block.items.size());
    for (const Stretch& stretch : stretches.list) {
      const auto members = stretches.items(stretch);
      const std::size_t start = out.size();
      for (const std::uint32_t index : members) {
        Item item = block.items[index];
        if (item.what == Item::What::fence) pusher.arrive(block.fences[item.fence], form_);
        pusher.arrive(item);
        out.push_back(item);
      }
      if (stretch.is_numeric && stretch.count > 1) rewrite(out, start, pusher, may_rename);
    }
    pusher.finish(block, form_);
    block.items = std::move(out);
  }

 private:
  /// Replaces out[start...] if that lowers the estimated error.
  void rewrite(std::vector<Item>& out, std::size_t start, Pusher& pusher, bool may_rename) {
    const std::span<const Item> old(out.data() + start, out.size() - start);
    const std::uint32_t wire[2] = {old[0].wire[0], old[0].wire[1]};
    const Matrix4 u = unitary_of(old, wire[0]);
    Canonical best = canonical(u);
    double error = error_of(best.point, cost_);
    bool is_mirrored = false;
    if (may_rename && error_of(mirror(best.point), cost_) < error * (1 - 1e-9)) {
      best = canonical(swap_matrix() * u);
      error = error_of(best.point, cost_);
      is_mirrored = true;
    }
    if (error >= error_of(old, cost_) * (1 - 1e-9)) return;
    Origin origin;
    for (const Item& item : old) origin = form_.shell.origins.merged(origin, item.origin);
    out.resize(start);
    if (is_mirrored) pusher.exchange(wire[0], wire[1]);
    write_canonical(best, wire, origin, out, pusher);
  }

  AxisForm& form_;
  const Cost& cost_;
  bool may_rename_;
};

Circuit resynthesized(Circuit circuit, const PassContext& context, bool may_rename) {
  AxisForm form = axis_form(circuit);
  Resynthesis resynthesis(form, context.cost, may_rename);
  for (AxisBlock& block : form.blocks) {
    for (const Direction direction : {Direction::to_the_left, Direction::to_the_right}) {
      resynthesis.run(block, direction);
    }
  }
  return better_of(std::move(circuit), native_form(std::move(form), context.promise), context.cost);
}

}  // namespace

Circuit two_qubit_stretches(Circuit circuit, const PassContext& context) {
  return resynthesized(std::move(circuit), context, false);
}

Circuit mirrored_stretches(Circuit circuit, const PassContext& context) {
  return resynthesized(std::move(circuit), context, true);
}

}  // namespace isinglass
