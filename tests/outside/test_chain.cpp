// The chain against values from outside the project.
#include <doctest/doctest.h>

#include <cmath>
#include <map>
#include <vector>

#include "targets/chain.h"

using namespace isinglass;

namespace {

Trap trap_of(int ions, double axial_hz = 0.5e6, double transverse_hz = 60e6, double quartic = 0) {
  return {*species_named("171Yb+"), ions, axial_hz, quartic, transverse_hz};
}

}  // namespace

// Source: D. F. V. James, "Quantum dynamics of cold trapped ions with application to quantum computation",
// Appl. Phys. B 66, 181 (1998); positive positions, and the axial eigenvalues that each row adds.
TEST_CASE("James's positions and eigenvalues, to all digits given") {
  struct Row {
    int ions;
    std::vector<double> positions, eigenvalues;  // the eigenvalues from the second one up
  };
  const std::vector<Row> rows = {
      {2, {0.6300}, {3}},
      {3, {1.0772}, {3, 5.8}},
      {4, {0.4544, 1.4368}, {3, 5.8099, 9.3083}},
      {5, {0.8221, 1.7429}, {3, 5.8177, 9.3322, 13.4748}},
      {7, {0.6869, 1.4129, 2.2545}, {3, 5.8293, 9.3688, 13.5475, 18.3206, 23.6558}},
      {10,
       {0.2821, 0.8538, 1.4504, 2.1000, 2.8708},
       {3, 5.8411, 9.4076, 13.6267, 18.4514, 23.8483, 29.7919, 36.2616, 43.2405}}};
  for (const Row& row : rows) {
    CAPTURE(row.ions);
    const Chain chain = solve_chain(trap_of(row.ions));
    const auto half = static_cast<Eigen::Index>(row.positions.size());
    for (Eigen::Index i = 0; i < half; ++i) {
      const double u = chain.positions[chain.ions() - half + i];
      CHECK(std::abs(u - row.positions[static_cast<std::size_t>(i)]) <= 0.5001e-4);
      CHECK(chain.positions[half - 1 - i] == -u);
    }
    CHECK(std::abs(chain.axial_hz[0] / chain.trap.axial_hz - 1) < 1e-12);
    REQUIRE(chain.ions() == static_cast<int>(row.eigenvalues.size()) + 1);
    for (int m = 1; m < chain.ions(); ++m) {
      const double square = std::pow(chain.axial_hz[m] / chain.trap.axial_hz, 2);
      // Half a unit of the last digit, and a hair: 9.30825 is printed as 9.3083.
      CHECK(std::abs(square - row.eigenvalues[static_cast<std::size_t>(m) - 1]) <= 0.51e-4);
    }
  }
}

// Source: same paper, smallest spacing 2.018 / N^0.559; deviations computed.
TEST_CASE("the law of smallest spacings holds within its known deviations") {
  const std::map<int, double> deviation = {{2, 0.087}, {10, -0.013}, {50, 0.000}};
  for (const auto& [ions, expected] : deviation) {
    const Chain chain = solve_chain(trap_of(ions));
    const double law = 2.018 / std::pow(ions, 0.559) * chain.length_scale;
    CAPTURE(ions);
    CHECK(std::abs(law / chain.smallest_spacing() - 1 - expected) < 0.5001e-3);
  }
}

// Source: computed from the constants.
TEST_CASE("length scales of 171Yb+ and 40Ca+") {
  const std::map<std::string, std::pair<double, double>> scales = {{"171Yb+", {4.351, 2.741}},
                                                                   {"40Ca+", {7.062, 4.449}}};
  for (const auto& [name, scale] : scales) {
    Trap trap = trap_of(3);
    trap.species = *species_named(name);
    CHECK(std::abs(solve_chain(trap).length_scale * 1e6 - scale.first) < 0.5001e-3);
    trap.axial_hz = 1e6;
    CHECK(std::abs(solve_chain(trap).length_scale * 1e6 - scale.second) < 0.5001e-3);
  }
}

// Source: computed; in a harmonic trap the transverse squares are (wr/wz)^2 - (axial - 1)/2.
TEST_CASE("transverse modes follow from the axial ones; the centre of mass is last") {
  for (const int ions : {1, 2, 5, 16, 64}) {
    const Chain chain = solve_chain(trap_of(ions));
    CHECK(std::abs(chain.transverse_hz[ions - 1] / chain.trap.transverse_hz - 1) < 1e-12);
    for (int m = 0; m < ions; ++m) {
      const double axial = std::pow(chain.axial_hz[ions - 1 - m] / chain.trap.axial_hz, 2);
      const double ratio = chain.trap.transverse_hz / chain.trap.axial_hz;
      const double expected = std::sqrt(ratio * ratio - (axial - 1) / 2) * chain.trap.axial_hz;
      CHECK(std::abs(chain.transverse_hz[m] / expected - 1) < 1e-11);
    }
    for (int i = 0; i < ions; ++i)
      CHECK(std::abs(chain.transverse_vectors(i, ions - 1)) == doctest::Approx(1 / std::sqrt(ions)));
  }
}

// Source: computed; two ions need a ratio above 1, three above sqrt(2.4) (James's 5.8: (5.8 - 1)/2).
TEST_CASE("the zigzag limit stands where the lowest transverse eigenvalue vanishes") {
  CHECK(critical_ratio(trap_of(2)) == doctest::Approx(1).epsilon(1e-12));
  CHECK(critical_ratio(trap_of(3)) == doctest::Approx(std::sqrt(2.4)).epsilon(1e-12));
  CHECK(critical_ratio(trap_of(10)) == doctest::Approx(std::sqrt((43.2405 - 1) / 2)).epsilon(1e-5));
  for (const int ions : {4, 12, 40}) {
    const double ratio = critical_ratio(trap_of(ions));
    CHECK_NOTHROW(solve_chain(trap_of(ions, 1e5, 1e5 * ratio * (1 + 1e-9))));
    CHECK_THROWS_AS(solve_chain(trap_of(ions, 1e5, 1e5 * ratio * (1 - 1e-9))), ImpossibleTrap);
  }
}

// Source: computed; three ions with quartic a4: u + a4 u^3 = 5 / (4 u^2).
TEST_CASE("a quartic term changes positions and modes as the equations of motion say") {
  const double a4 = 0.7;
  const Chain chain = solve_chain(trap_of(3, 0.5e6, 3e6, a4));
  const double u = chain.positions[2];
  CHECK(std::abs(u + a4 * u * u * u - 1.25 / (u * u)) < 1e-13);
  // The breathing mode (-1, 0, 1): 1 + 3 a4 u^2 + 2/u^3 + 4/(2u)^3.
  CHECK(std::pow(chain.axial_hz[1] / chain.trap.axial_hz, 2) ==
        doctest::Approx(1 + 3 * a4 * u * u + 2 / std::pow(u, 3) + 4 / std::pow(2 * u, 3)));
  // Transverse (-1, 0, 1): (wr/wz)^2 - 3/2 a4 u^2 - 1/u^3 - 2/(2u)^3.
  const double tilt = 36 - 1.5 * a4 * u * u - 1 / std::pow(u, 3) - 2 / std::pow(2 * u, 3);
  double nearest = 1e9;
  for (int m = 0; m < 3; ++m)
    nearest = std::min(nearest, std::abs(std::pow(chain.transverse_hz[m] / chain.trap.axial_hz, 2) - tilt));
  CHECK(nearest < 1e-11);
}

// Source: computed; eta^2 w = hbar dk^2 / 2M, and sum over modes of b_im b_jm = delta_ij.
TEST_CASE("Lamb-Dicke factors carry the recoil frequency") {
  const Chain chain = solve_chain(trap_of(7, 0.3e6, 3e6));
  const double dk = wave_number_difference(355e-9, 3.14159265358979323846);
  const Eigen::MatrixXd eta = lamb_dicke(chain, dk);
  const double mass = chain.trap.species.mass_u * si::atomic_mass_unit;
  const double recoil = si::hbar * dk * dk / (2 * mass);
  const Eigen::MatrixXd product =
      eta * (2 * 3.14159265358979323846 * chain.transverse_hz).asDiagonal() * eta.transpose();
  CHECK((product - recoil * Eigen::MatrixXd::Identity(7, 7)).cwiseAbs().maxCoeff() < 1e-9 * recoil);
  CHECK(wave_number_difference(355e-9, 3.14159265358979323846 / 2) == doctest::Approx(dk / std::sqrt(2)));
}

TEST_CASE("traps that cannot be are refused") {
  CHECK_THROWS_AS(solve_chain(trap_of(0)), ImpossibleTrap);
  CHECK_THROWS_AS(solve_chain(trap_of(65)), ImpossibleTrap);
  CHECK_THROWS_AS(solve_chain(trap_of(3, -1)), ImpossibleTrap);
  CHECK_THROWS_AS(solve_chain(trap_of(3, 1e5, 3e6, -0.1)), ImpossibleTrap);
  CHECK_FALSE(species_named("172Yb+"));
}
