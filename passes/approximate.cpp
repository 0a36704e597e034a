// Interactions so small that doing them harms more than leaving them out.
//
//     --xx(0.002)--xx(1.2)--        --xx(1.2)--
//       |          |           ==>    |
//     --xx(0.002)--xx(1.2)--        --xx(1.2)--         with --tolerance, and then only
//
// Leaving out interactions of angles theta_k moves the unitary by at most s = sum theta_k / 2 in operator
// norm, so it costs at most s^2 of entanglement fidelity, however the errors add up (computed: |1 - e^{-i
// theta/2}| <= theta/2, and |tr U^+ V|/d >= 1 - s^2/2). It saves what the cost says of each. The smallest are
// left out first, and as many as serve the sum best. After the two-qubit stretches these are the smallest
// canonical coordinates.
#include "passes/approximate.h"

#include <algorithm>
#include <cmath>

#include "passes/axis_form.h"

namespace isinglass {

Approximation approximated(Circuit circuit, const PassContext& context) {
  if (context.tolerance <= 0) return {std::move(circuit), 0};
  AxisForm form = axis_form(circuit);
  AxisBlock& body = form.blocks[0];  // arms may run again and again: what they add has no bound
  std::vector<std::size_t> known;
  for (std::size_t i = 0; i < body.items.size(); ++i) {
    if (body.items[i].is_interaction() && body.items[i].angle.is_known()) known.push_back(i);
  }
  const auto size = [&](std::size_t i) { return std::abs(body.items[i].angle.constant); };
  std::stable_sort(known.begin(), known.end(), [&](auto a, auto b) { return size(a) < size(b); });
  double moved = 0;
  double saved = 0;
  double best_gain = 0;
  std::size_t best_count = 0;
  double infidelity = 0;
  for (std::size_t k = 0; k < known.size(); ++k) {
    moved += size(known[k]) / 2;
    if (moved * moved > context.tolerance) break;
    saved += context.cost.interaction(size(known[k]));
    if (saved - moved * moved <= best_gain) continue;
    best_gain = saved - moved * moved;
    best_count = k + 1;
    infidelity = moved * moved;
  }
  if (best_count == 0) return {std::move(circuit), 0};
  std::vector<bool> is_left_out(body.items.size(), false);
  for (std::size_t k = 0; k < best_count; ++k) is_left_out[known[k]] = true;
  std::size_t i = 0;
  std::erase_if(body.items, [&](const Item&) { return is_left_out[i++]; });
  Circuit shorter = native_form(std::move(form), context.promise);
  const bool is_gain =
      tally_of(shorter, context.cost).error + infidelity < tally_of(circuit, context.cost).error;
  if (!is_gain) return {std::move(circuit), 0};
  return {std::move(shorter), infidelity};
}

Circuit approximate(Circuit circuit, const PassContext& context) {
  return approximated(std::move(circuit), context).circuit;
}

}  // namespace isinglass
