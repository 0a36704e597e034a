// Linear programs: the least value of a linear cost over x >= 0 with A x = b.
//
// The simplex method of Dantzig with Bland's rule, which cannot cycle (R. G. Bland, "New finite pivoting
// rules for the simplex method", Math. Oper. Res. 2, 103 (1977), from memory). Dense: meant for a few hundred
// unknowns.
#pragma once

#include <optional>
#include <utility>
#include <vector>

namespace isinglass {

/// A x = b, x >= 0. Rows are sparse: (unknown, coefficient).
struct LinearProgram {
  using Row = std::vector<std::pair<std::size_t, double>>;
  std::size_t unknowns = 0;
  std::vector<Row> rows;
  std::vector<double> right;

  std::size_t add_unknown() { return unknowns++; }
  void add_row(Row row, double b) {
    rows.push_back(std::move(row));
    right.push_back(b);
  }
};

struct LinearOptimum {
  std::vector<double> x;
  /// How much the cost grows per unit of an unknown that is 0 here; where it is positive, the unknown is 0 in
  /// every optimum.
  std::vector<double> reduced_cost;
};

/// Minimizes cost . x; unknowns with is_zero[i] stay 0 (empty: none). Nothing if there is no such x. Costs
/// must be bounded from below on the rows' solutions, as any sum with coefficients >= 0 is.
std::optional<LinearOptimum> minimized(const LinearProgram& program, const std::vector<double>& cost,
                                       const std::vector<bool>& is_zero = {});

}  // namespace isinglass
