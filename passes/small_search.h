// Numerical synthesis: a unitary of three or four qubits from as few interactions as can be found.
#pragma once

#include <Eigen/Dense>
#include <chrono>
#include <cstdint>
#include <optional>
#include <vector>

#include "algebra/su2.h"
#include "circuit/cost.h"

namespace isinglass {

/// exp(-i angle/2 (axis[0].sigma)(x)(axis[1].sigma)) on two of the small unitary's qubits.
struct Coupling {
  std::uint8_t qubit[2] = {0, 0};
  Axis axis[2];
  double angle = 0;
};

/// First the couplings in order, then one rotation a qubit.
struct SmallCircuit {
  std::vector<Coupling> couplings;
  std::vector<Su2> locals;
};

/// Matrix on all qubits, bit q of an index = qubit q.
Eigen::MatrixXcd matrix_of(const SmallCircuit& circuit);

/// Error of the couplings under the cost.
double error_of(const SmallCircuit& circuit, const Cost& cost);

/// What is wanted: a matrix on `qubits` (2 to 4) qubits, bit q of an index = qubit q. If `fresh` has bit q
/// set, qubit q starts in |0> and only the columns with that bit 0 count.
struct SmallTarget {
  int qubits = 3;
  Eigen::MatrixXcd matrix;
  unsigned fresh = 0;
};

/// Numbers that do not change under rotations of single qubits before and after (of fresh qubits: after): the
/// purities of all parts of the matrix seen as a state. Rounded, so that equal unitaries have equal ones.
std::vector<std::int64_t> local_invariants(const SmallTarget& target);

struct SmallSearch {
  std::uint64_t seed = 1;
  int starts = 8;                               // random starts a sequence of pairs
  std::chrono::steady_clock::time_point until;  // gives up then
  std::int64_t* budget = nullptr;               // if given: starts that may still be made, counted down
};

/// Fewest couplings that any circuit for the target needs on each side: by operator Schmidt ranks across
/// every cut. The lower bound of a search.
int least_couplings(const SmallTarget& target);

/// The target, up to a global phase and 1e-12 in Frobenius norm, with exactly the given sequence of pairs;
/// the angles are then made small. Nothing if no start reaches it.
std::optional<SmallCircuit> fitted(const SmallTarget& target, const std::vector<std::pair<int, int>>& pairs,
                                   const SmallSearch& search, const Cost& cost);

/// Sequences of pairs in ascending length from least_couplings() to `most`, until a length fits; of that
/// length the one of least error among the first that fit.
std::optional<SmallCircuit> shortest(const SmallTarget& target, int most, const SmallSearch& search,
                                     const Cost& cost);

/// The circuit with one coupling left out and the others adjusted, if that is possible from where they are.
std::optional<SmallCircuit> with_one_fewer(const SmallTarget& target, const SmallCircuit& circuit,
                                           const SmallSearch& search, const Cost& cost);

/// The same unitary from the same couplings or fewer with less total error, by descent along the solutions.
SmallCircuit with_less_angle(const SmallTarget& target, SmallCircuit circuit, const SmallSearch& search,
                             const Cost& cost);

}  // namespace isinglass
