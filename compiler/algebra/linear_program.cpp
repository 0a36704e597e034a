// The simplex method on a dense table; see linear_program.h.
#include "algebra/linear_program.h"

#include <algorithm>
#include <cmath>

namespace isinglass {

namespace {

/// Rows of [A | artificial unknowns | b], brought to the identity on the basis, and under them the reduced
/// costs.
class Table {
 public:
  Table(const LinearProgram& program, const std::vector<bool>& is_zero)
      : unknowns_(program.unknowns),
        width_(program.unknowns + program.rows.size() + 1),
        is_open_(width_ - 1, true) {
    for (std::size_t i = 0; i < is_zero.size(); ++i) is_open_[i] = !is_zero[i];
    for (std::size_t r = 0; r < program.rows.size(); ++r) {
      std::vector<double> row(width_, 0);
      const double sign = program.right[r] < 0 ? -1 : 1;
      for (const auto& [unknown, coefficient] : program.rows[r]) row[unknown] += sign * coefficient;
      row[unknowns_ + r] = 1;
      row.back() = sign * program.right[r];
      size_ = std::max(size_, row.back());
      rows_.push_back(std::move(row));
      basis_.push_back(unknowns_ + r);
    }
  }

  /// Phase one: whether the artificial unknowns can all be 0. Afterwards none is in the basis.
  bool make_feasible() {
    std::vector<double> cost(width_ - 1, 0);
    std::fill(cost.begin() + static_cast<std::ptrdiff_t>(unknowns_), cost.end(), 1.0);
    minimize(cost);
    if (-costs_.back() > tolerance * size_ * static_cast<double>(rows_.size() + 1)) return false;
    for (std::size_t r = rows_.size(); r-- > 0;) {
      if (basis_[r] < unknowns_) continue;
      std::size_t best = unknowns_;
      for (std::size_t c = 0; c < unknowns_; ++c) {
        if (!is_open_[c] || std::abs(rows_[r][c]) < tolerance) continue;
        if (best == unknowns_ || std::abs(rows_[r][c]) > std::abs(rows_[r][best])) best = c;
      }
      if (best < unknowns_) {
        pivot(r, best);
      } else {  // the row says nothing that the others do not say
        rows_.erase(rows_.begin() + static_cast<std::ptrdiff_t>(r));
        basis_.erase(basis_.begin() + static_cast<std::ptrdiff_t>(r));
      }
    }
    std::fill(is_open_.begin() + static_cast<std::ptrdiff_t>(unknowns_), is_open_.end(), false);
    return true;
  }

  void minimize(const std::vector<double>& cost) {
    costs_.assign(width_, 0);
    std::copy(cost.begin(), cost.end(), costs_.begin());
    for (std::size_t r = 0; r < rows_.size(); ++r) subtract(costs_, costs_[basis_[r]], rows_[r]);
    while (true) {
      std::size_t enters = 0;
      while (enters + 1 < width_ && !(is_open_[enters] && costs_[enters] < -tolerance)) ++enters;
      if (enters + 1 == width_) return;
      std::size_t leaves = rows_.size();
      for (std::size_t r = 0; r < rows_.size(); ++r) {
        if (rows_[r][enters] < tolerance) continue;
        const double step = rows_[r].back() / rows_[r][enters];
        const double least = leaves == rows_.size() ? 0 : rows_[leaves].back() / rows_[leaves][enters];
        const bool is_less = leaves == rows_.size() || step < least - tolerance * size_;
        const bool is_equal = leaves != rows_.size() && std::abs(step - least) <= tolerance * size_;
        if (is_less || (is_equal && basis_[r] < basis_[leaves])) leaves = r;
      }
      if (leaves == rows_.size()) return;  // nothing bounds it: excluded by the contract, but for rounding
      pivot(leaves, enters);
    }
  }

  LinearOptimum optimum() const {
    LinearOptimum result;
    result.x.assign(unknowns_, 0);
    for (std::size_t r = 0; r < rows_.size(); ++r) result.x[basis_[r]] = std::max(rows_[r].back(), 0.0);
    result.reduced_cost.assign(costs_.begin(), costs_.begin() + static_cast<std::ptrdiff_t>(unknowns_));
    return result;
  }

 private:
  static constexpr double tolerance = 1e-9;

  static void subtract(std::vector<double>& from, double factor, const std::vector<double>& row) {
    if (factor == 0) return;
    for (std::size_t c = 0; c < row.size(); ++c) from[c] -= factor * row[c];
  }

  void pivot(std::size_t row, std::size_t column) {
    const double by = rows_[row][column];
    for (double& entry : rows_[row]) entry /= by;
    for (std::size_t r = 0; r < rows_.size(); ++r) {
      if (r != row) subtract(rows_[r], rows_[r][column], rows_[row]);
    }
    subtract(costs_, costs_[column], rows_[row]);
    basis_[row] = column;
  }

  std::size_t unknowns_;
  std::size_t width_;
  double size_ = 1;  // of the right-hand sides
  std::vector<bool> is_open_;
  std::vector<std::vector<double>> rows_;
  std::vector<double> costs_;
  std::vector<std::size_t> basis_;
};

}  // namespace

std::optional<LinearOptimum> minimized(const LinearProgram& program, const std::vector<double>& cost,
                                       const std::vector<bool>& is_zero) {
  Table table(program, is_zero);
  if (!table.make_feasible()) return std::nullopt;
  std::vector<double> padded = cost;
  padded.resize(program.unknowns + program.rows.size(), 0);
  table.minimize(padded);
  return table.optimum();
}

}  // namespace isinglass
