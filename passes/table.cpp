// The table of all passes: name, sentence, function. To add one: include its header, add its row.
#include "passes/approximate.h"
#include "passes/bits_at_end.h"
#include "passes/constructions.h"
#include "passes/cubic_networks.h"
#include "passes/expand_controls.h"
#include "passes/known_start.h"
#include "passes/lower.h"
#include "passes/merge_distant.h"
#include "passes/merge_gates.h"
#include "passes/merge_rotations.h"
#include "passes/pair_toffolis.h"
#include "passes/pass.h"
#include "passes/recover_toffolis.h"
#include "passes/rename_swaps.h"
#include "passes/rotation_networks.h"
#include "passes/search_blocks.h"
#include "passes/trim_end.h"
#include "passes/trim_start.h"
#include "passes/two_qubit_stretches.h"

namespace isinglass {

namespace {

constexpr Pass table[] = {
    // On source gates.
    {"rename-swaps", "swaps of the program's body become new names of the wires", 0.1, rename_swaps,
     rename_swaps_beside},
    {"known-start", "controls that are known to hold 0 or 1 are resolved", 0.1, known_start},
    {"bits-at-end", "NOTs and swaps before the final measurements are done on the bits", 0.1, bits_at_end},
    {"merge-gates", "equal gates, controls included, add up or cancel through what commutes", 2, merge_gates},
    {"expand-controls", "gates with several controls become gates on two wires", 0.2, expand_controls},
    {"recover-toffolis", "Toffolis written out as Clifford and T gates become one operation again", 12,
     recover_toffolis},
    {"cubic-networks", "networks of Toffolis and CNOTs are written with fewer Toffolis", 1, cubic_networks,
     cubic_networks_beside},
    {"pair-toffolis", "Toffolis whose phases cancel against each other take fewer interactions", 1,
     pair_toffolis},
    {"choose-constructions", "gates with several controls get their cheapest construction, with idle wires",
     0.5, choose_constructions, choose_constructions_beside},
    // On gates with up to one control; what it rewrites comes out as r, xx and rz.
    {"rotation-networks", "Pauli rotations are synthesized anew with shared basis changes", 20,
     synthesize_rotation_networks},
    // To the machine's gates.
    {"lower", "gates on two wires become r, xx and rz with the fewest pulses", 1, lower},
    // On the machine's gates.
    {"merge-rotations", "interactions about the same axes add up through what shares their axes", 1,
     merge_rotations, merge_rotations_beside},
    {"merge-distant", "rotations about the same Pauli string add up through all that commutes with it", 7,
     merge_distant_rotations},
    {"two-qubit-stretches", "what happens on one pair is done with the fewest interactions and least angle",
     2, two_qubit_stretches},
    {"trim-start", "interactions with known states do no more than the state needs", 1, trim_start},
    {"trim-end", "interactions that no measurement and no kept state can tell are dropped", 1, trim_end},
    {"mirrored-stretches", "the same, where a swap of the wires' names makes it cheaper", 2,
     mirrored_stretches},
    {"approximate", "within the tolerance, interactions too small to be worth their error are left out", 1,
     approximate},
    {"search-blocks", "blocks of three and four wires are synthesized numerically", 1, search_blocks},
};

}  // namespace

std::span<const Pass> all_passes() {
  return table;
}

}  // namespace isinglass
