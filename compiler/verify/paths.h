// Comparing circuits of NOTs and phases with controls as sums over paths.
//
//   x a b c;  h c;  z c d        c carries  c + a b,  then a new variable y;  sign (-1)^{(c + a b) y + y d}
//
// Every wire carries a polynomial over GF(2) in the bits at the start and in a new variable for each gate
// that is neither a NOT nor a phase; phases are polynomials, too. A new variable is named after its gate and
// what went into it, so both circuits use the same names where they do the same. If the polynomials on all
// wires, the phases and the named gates agree, every path has the same amplitude in both, and the circuits
// are the same, exactly. If not, nothing is known. (Montanaro, J. Phys. A 50, 084002 (2017); Amy,
// arXiv:1805.06908; both from memory.)
#pragma once

#include "verify/job.h"

namespace isinglass {

struct PathResult {
  bool are_same = false;
  double distance = 0;        // bound on what was rounded away
  std::size_t variables = 0;  // of both circuits
};

/// Both circuits are fragments or measure only at the end, into the same bits. Throws Unsupported (see
/// memory.h) at the deadline and where a polynomial becomes too long.
PathResult by_paths(const Job& job, const InputValues& inputs);

}  // namespace isinglass
