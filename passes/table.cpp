// The table of all passes: name, sentence, function. To add one: include its header, add its row.
#include "passes/constructions.h"
#include "passes/expand_controls.h"
#include "passes/lower.h"
#include "passes/pass.h"
#include "passes/rename_swaps.h"

namespace isinglass {

namespace {

constexpr Pass table[] = {
    // On source gates.
    {"rename-swaps", "swaps of the program's body become new names of the wires", rename_swaps},
    {"expand-controls", "gates with several controls become gates on two wires", expand_controls},
    {"choose-constructions", "gates with several controls get their cheapest construction, with idle wires",
     choose_constructions},
    // To the machine's gates.
    {"lower", "gates on two wires become r, xx and rz with the fewest pulses", lower},
};

}  // namespace

std::span<const Pass> all_passes() {
  return table;
}

}  // namespace isinglass
