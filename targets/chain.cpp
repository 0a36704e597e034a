// Equilibrium positions by damped Newton steps (the potential is convex for ordered ions), modes by
// diagonalizing the two matrices of second derivatives.
#include "targets/chain.h"

#include <fmt/format.h>

#include <array>
#include <cmath>
#include <numbers>

namespace isinglass {
namespace {

using std::numbers::pi;

struct Isotope {
  std::string_view name;
  double atomic_mass_u;
};

// Masses of the neutral atoms, from memory.
constexpr std::array<Isotope, 12> isotopes{{{"9Be+", 9.012183},
                                            {"24Mg+", 23.985042},
                                            {"25Mg+", 24.985837},
                                            {"40Ca+", 39.962591},
                                            {"43Ca+", 42.958766},
                                            {"88Sr+", 87.905612},
                                            {"133Ba+", 132.906007},
                                            {"137Ba+", 136.905827},
                                            {"138Ba+", 137.905247},
                                            {"171Yb+", 170.936331},
                                            {"174Yb+", 173.938867},
                                            {"176Yb+", 175.942576}}};

constexpr auto isotope_names = [] {
  std::array<std::string_view, isotopes.size()> names;
  for (std::size_t i = 0; i < isotopes.size(); ++i) names[i] = isotopes[i].name;
  return names;
}();

double potential(const Eigen::VectorXd& u, double quartic) {
  double sum = 0;
  for (Eigen::Index m = 0; m < u.size(); ++m) {
    const double square = u[m] * u[m];
    sum += square / 2 + quartic * square * square / 4;
    for (Eigen::Index n = 0; n < m; ++n) sum += 1 / (u[m] - u[n]);
  }
  return sum;
}

Eigen::VectorXd slope(const Eigen::VectorXd& u, double quartic) {
  Eigen::VectorXd g = u.array() + quartic * u.array().cube();
  for (Eigen::Index m = 0; m < u.size(); ++m) {
    for (Eigen::Index n = 0; n < m; ++n) {
      const double push = 1 / ((u[m] - u[n]) * (u[m] - u[n]));
      g[m] -= push;
      g[n] += push;
    }
  }
  return g;
}

// Coulomb part of the transverse matrix; the axial one is minus twice this.
Eigen::MatrixXd coulomb_matrix(const Eigen::VectorXd& u) {
  const Eigen::Index n = u.size();
  Eigen::MatrixXd matrix = Eigen::MatrixXd::Zero(n, n);
  for (Eigen::Index i = 0; i < n; ++i) {
    for (Eigen::Index k = 0; k < i; ++k) {
      const double cube = std::pow(std::abs(u[i] - u[k]), -3);
      matrix(i, k) = matrix(k, i) = cube;
      matrix(i, i) -= cube;
      matrix(k, k) -= cube;
    }
  }
  return matrix;
}

Eigen::MatrixXd axial_matrix(const Eigen::VectorXd& u, double quartic) {
  Eigen::MatrixXd matrix = -2 * coulomb_matrix(u);
  matrix.diagonal().array() += 1 + 3 * quartic * u.array().square();
  return matrix;
}

// Without the (wr/wz)^2 on the diagonal.
Eigen::MatrixXd transverse_pull(const Eigen::VectorXd& u, double quartic) {
  Eigen::MatrixXd matrix = coulomb_matrix(u);
  matrix.diagonal().array() -= 1.5 * quartic * u.array().square();
  return matrix;
}

bool is_ascending(const Eigen::VectorXd& u) {
  for (Eigen::Index i = 1; i < u.size(); ++i) {
    if (!(u[i] > u[i - 1])) return false;
  }
  return true;
}

Eigen::VectorXd equilibrium(int ions, double quartic) {
  // Start from even spacing near the law of smallest spacings; any ordered start would do.
  const double spacing = 2.3 / std::pow(ions, 0.559);
  Eigen::VectorXd u(ions);
  for (int i = 0; i < ions; ++i) u[i] = spacing * (i - 0.5 * (ions - 1));
  double value = potential(u, quartic);
  for (int round = 0; round < 200; ++round) {
    const Eigen::VectorXd step = axial_matrix(u, quartic).ldlt().solve(slope(u, quartic));
    if (step.cwiseAbs().maxCoeff() < 1e-15 * u.cwiseAbs().maxCoeff()) break;
    double part = 1;
    Eigen::VectorXd next = u - step;
    // The slack of one part in 10^13 lets the last, rounding-limited steps pass.
    while (part > 1e-12 && (!is_ascending(next) || potential(next, quartic) > value * (1 + 1e-13))) {
      part /= 2;
      next = u - part * step;
    }
    u = next;
    value = potential(u, quartic);
    if (step.cwiseAbs().maxCoeff() < 1e-13) break;
  }
  return (u - u.reverse()) / 2;  // exactly symmetric
}

// Ascending eigenvalues; signs of the vectors fixed so that results are the same on every run.
Eigen::SelfAdjointEigenSolver<Eigen::MatrixXd> modes(const Eigen::MatrixXd& matrix) {
  return Eigen::SelfAdjointEigenSolver<Eigen::MatrixXd>(matrix);
}

Eigen::MatrixXd with_fixed_signs(Eigen::MatrixXd vectors) {
  for (Eigen::Index m = 0; m < vectors.cols(); ++m) {
    for (Eigen::Index i = vectors.rows() - 1; i >= 0; --i) {
      if (std::abs(vectors(i, m)) < 1e-9) continue;
      if (vectors(i, m) < 0) vectors.col(m) *= -1;
      break;
    }
  }
  return vectors;
}

void check_ranges(const Trap& trap) {
  if (trap.ions < 1 || trap.ions > longest_chain)
    throw ImpossibleTrap(fmt::format("a chain has 1 to {} ions, not {}", longest_chain, trap.ions));
  if (!(trap.species.mass_u > 0) || trap.species.charge < 1)
    throw ImpossibleTrap("the ion's mass and charge must be positive");
  if (!(trap.axial_hz > 0) || !(trap.transverse_hz > 0))
    throw ImpossibleTrap("the trap frequencies must be positive");
  if (!(trap.quartic >= 0))
    throw ImpossibleTrap("the quartic term must not be negative: the trap would be open");
}

}  // namespace

std::optional<Species> species_named(std::string_view name) {
  for (const Isotope& isotope : isotopes) {
    if (isotope.name == name)
      return Species{std::string(name), isotope.atomic_mass_u - si::electron_mass_u, 1};
  }
  return std::nullopt;
}

std::span<const std::string_view> species_names() {
  return isotope_names;
}

double Chain::smallest_spacing() const {
  double smallest = 0;
  for (Eigen::Index i = 1; i < positions.size(); ++i) {
    const double gap = positions[i] - positions[i - 1];
    smallest = i == 1 ? gap : std::min(smallest, gap);
  }
  return smallest * length_scale;
}

double critical_ratio(const Trap& trap) {
  check_ranges(trap);
  const auto pull = modes(transverse_pull(equilibrium(trap.ions, trap.quartic), trap.quartic));
  return std::sqrt(std::max(0.0, -pull.eigenvalues()[0]));
}

Chain solve_chain(const Trap& trap) {
  check_ranges(trap);
  Chain chain;
  chain.trap = trap;
  const double mass = trap.species.mass_u * si::atomic_mass_unit;
  const double charge = trap.species.charge * si::elementary_charge;
  const double wz = 2 * pi * trap.axial_hz;
  chain.length_scale = std::cbrt(charge * charge / (4 * pi * si::electric_constant * mass * wz * wz));
  chain.positions = equilibrium(trap.ions, trap.quartic);

  const auto axial = modes(axial_matrix(chain.positions, trap.quartic));
  chain.axial_hz = trap.axial_hz * axial.eigenvalues().cwiseSqrt();
  chain.axial_vectors = with_fixed_signs(axial.eigenvectors());

  const double ratio = trap.transverse_hz / trap.axial_hz;
  const auto pull = modes(transverse_pull(chain.positions, trap.quartic));
  const Eigen::VectorXd squares = pull.eigenvalues().array() + ratio * ratio;
  if (squares[0] <= 0) {
    throw ImpossibleTrap(
        fmt::format("{} ions buckle into a zigzag: transverse over axial frequency is {:.4g}, a straight "
                    "chain needs more than {:.4g}",
                    trap.ions, ratio, std::sqrt(-pull.eigenvalues()[0])));
  }
  chain.transverse_hz = trap.axial_hz * squares.cwiseSqrt();
  chain.transverse_vectors = with_fixed_signs(pull.eigenvectors());
  return chain;
}

double wave_number_difference(double wavelength, double angle) {
  return 4 * pi / wavelength * std::sin(angle / 2);
}

Eigen::MatrixXd lamb_dicke(const Chain& chain, double wave_number_difference) {
  const double mass = chain.trap.species.mass_u * si::atomic_mass_unit;
  const Eigen::VectorXd spread =
      (si::hbar / (2 * mass) / (2 * pi * chain.transverse_hz.array())).sqrt().matrix();
  return wave_number_difference * chain.transverse_vectors * spread.asDiagonal();
}

}  // namespace isinglass
