// Linear programs against all their corners, one by one.
#include <doctest/doctest.h>

#include <Eigen/Dense>
#include <optional>
#include <random>

#include "algebra/linear_program.h"

using namespace isinglass;

namespace {

/// The least cost over all basic solutions: every choice of as many columns as there are rows.
std::optional<double> least_corner(const LinearProgram& program, const std::vector<double>& cost) {
  const auto rows = static_cast<Eigen::Index>(program.rows.size());
  const auto columns = static_cast<Eigen::Index>(program.unknowns);
  Eigen::MatrixXd a = Eigen::MatrixXd::Zero(rows, columns);
  Eigen::VectorXd b(rows);
  for (Eigen::Index r = 0; r < rows; ++r) {
    for (const auto& [unknown, coefficient] : program.rows[static_cast<std::size_t>(r)]) {
      a(r, static_cast<Eigen::Index>(unknown)) += coefficient;
    }
    b(r) = program.right[static_cast<std::size_t>(r)];
  }
  std::optional<double> least;
  for (std::uint32_t chosen = 0; chosen < (1u << columns); ++chosen) {
    std::vector<Eigen::Index> basis;
    for (Eigen::Index c = 0; c < columns; ++c) {
      if (chosen >> c & 1) basis.push_back(c);
    }
    if (static_cast<Eigen::Index>(basis.size()) > rows) continue;
    Eigen::MatrixXd part(rows, static_cast<Eigen::Index>(basis.size()));
    for (std::size_t i = 0; i < basis.size(); ++i) part.col(static_cast<Eigen::Index>(i)) = a.col(basis[i]);
    Eigen::VectorXd x = Eigen::VectorXd::Zero(static_cast<Eigen::Index>(basis.size()));
    if (!basis.empty()) {
      const Eigen::ColPivHouseholderQR<Eigen::MatrixXd> solver(part);
      if (solver.rank() < static_cast<Eigen::Index>(basis.size())) continue;
      x = solver.solve(b);
    }
    const Eigen::VectorXd rest = part * x - b;
    if (rest.norm() > 1e-9 || (x.size() > 0 && x.minCoeff() < -1e-9)) continue;
    double value = 0;
    for (std::size_t i = 0; i < basis.size(); ++i) {
      value += cost[static_cast<std::size_t>(basis[i])] * x(static_cast<Eigen::Index>(i));
    }
    if (!least || value < *least) least = value;
  }
  return least;
}

}  // namespace

TEST_CASE("linear programs: the best corner, on random ones with rows that repeat and degenerate corners") {
  std::mt19937_64 random(5);
  const auto below = [&](int limit) { return static_cast<int>(random() % static_cast<unsigned>(limit)); };
  int feasible = 0;
  for (int round = 0; round < 3000; ++round) {
    LinearProgram program;
    program.unknowns = static_cast<std::size_t>(1 + below(7));
    const int rows = below(5);
    for (int r = 0; r < rows; ++r) {
      LinearProgram::Row row;
      for (std::size_t c = 0; c < program.unknowns; ++c) {
        if (below(2) == 0) row.emplace_back(c, below(7) - 3);
      }
      program.add_row(row, below(9) - 3);
      if (below(5) == 0) program.add_row(program.rows.back(), program.right.back());
    }
    std::vector<double> cost(program.unknowns);
    for (double& c : cost) c = below(4);
    const auto wanted = least_corner(program, cost);
    const auto found = minimized(program, cost);
    REQUIRE(found.has_value() == wanted.has_value());
    if (!found) continue;
    ++feasible;
    double value = 0;
    for (std::size_t c = 0; c < program.unknowns; ++c) {
      CHECK(found->x[c] >= 0);
      value += cost[c] * found->x[c];
      // A positive reduced cost holds its unknown at 0, here and in every optimum: forcing it up costs.
      if (found->reduced_cost[c] < 1e-7) continue;
      CHECK(found->x[c] < 1e-9);
      LinearProgram forced = program;
      forced.add_row({{c, 1}}, 0.1);
      const auto worse = minimized(forced, cost);
      if (worse) {
        double more = 0;
        for (std::size_t i = 0; i < program.unknowns; ++i) more += cost[i] * worse->x[i];
        CHECK(more > value + 1e-9);
      }
    }
    CHECK(value == doctest::Approx(*wanted).epsilon(1e-9));
  }
  CHECK(feasible > 500);
}

TEST_CASE("linear programs: unknowns that are held at 0") {
  LinearProgram program;
  program.unknowns = 2;
  program.add_row({{0, 1}, {1, 1}}, 3);
  CHECK(minimized(program, {1, 2})->x == std::vector<double>{3, 0});
  CHECK(minimized(program, {1, 2}, {true, false})->x == std::vector<double>{0, 3});
  CHECK_FALSE(minimized(program, {1, 2}, {true, true}));
}
