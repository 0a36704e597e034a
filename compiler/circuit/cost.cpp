// Figures of merit of a lowered circuit; see cost.h.
#include "circuit/cost.h"

namespace isinglass {

Tally tally_of(const Circuit& circuit, const Cost& cost) {
  Tally tally;
  for (const Block& block : circuit.blocks) {
    for (const Operation& op : block) {
      if (op.kind == Kind::xx) {
        const double theta = op.form[0] == 0 ? op.value[0] : pi / 2;
        ++tally.xx;
        tally.xx_units += std::abs(theta) / (pi / 2);
        tally.error += cost.interaction(theta);
      } else if (op.kind == Kind::r) {
        ++tally.r;
        tally.error += cost.pulse;
      }
    }
  }
  return tally;
}

}  // namespace isinglass
