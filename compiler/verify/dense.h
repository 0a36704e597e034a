// Comparing circuits by all their amplitudes.
#pragma once

#include "verify/job.h"

namespace isinglass {

/// Whether nothing happens but gates, barriers and delays.
bool is_fragment(const Circuit& circuit);

/// Whether all that is not a gate, barrier or delay are measurements with nothing after them on their wire,
/// each into a bit of its own.
bool measures_only_at_end(const Circuit& circuit);

/// All columns of both unitaries, up to one phase. Both are fragments.
Deviation by_unitary(const Job& job, const InputValues& inputs);

/// How many random states by_states() takes: fewer where each costs more.
int state_count(const Job& job);

/// Final states from |0...0> (if the promise says so) or from random product states, up to one phase for each
/// value of the measured bits. Both circuits are fragments or measure only at the end, into the same bits.
Deviation by_states(const Job& job, const InputValues& inputs);

}  // namespace isinglass
