// The ion chain that a linear trap holds: where the ions sit, how they move together, how light couples to
// it.
//
// SI units throughout; frequencies in Hz (not angular). Lengths in units of l with
// l^3 = Z^2 e^2 / (4 pi eps0 M wz^2); see targets/README.md for the formulas.
#pragma once

#include <Eigen/Dense>
#include <optional>
#include <span>
#include <stdexcept>
#include <string>
#include <string_view>

namespace isinglass {

namespace si {
inline constexpr double elementary_charge = 1.602176634e-19;   // C
inline constexpr double electric_constant = 8.8541878128e-12;  // F/m
inline constexpr double hbar = 1.054571817e-34;                // J s
inline constexpr double atomic_mass_unit = 1.66053906660e-27;  // kg
inline constexpr double electron_mass_u = 5.48579909065e-4;    // u
}  // namespace si

/// The longest chain that is computed.
inline constexpr int longest_chain = 64;

/// What is caught: mass of the ion (electron removed) in atomic mass units, charge in elementary charges.
struct Species {
  std::string name;
  double mass_u = 0;
  int charge = 1;
};

/// Species by name such as "171Yb+"; atomic masses from memory, less one electron mass. Empty when unknown.
std::optional<Species> species_named(std::string_view name);
/// The names that species_named() knows, lightest first.
std::span<const std::string_view> species_names();

struct Trap {
  Species species;
  int ions = 1;              // 1 to longest_chain
  double axial_hz = 0;       // harmonic axial frequency, > 0
  double quartic = 0;        // a4 >= 0: potential M wz^2 l^2 (u^2/2 + a4 u^4/4)
  double transverse_hz = 0;  // transverse frequency of one ion at the trap centre, > 0
};

/// An equilibrium chain. Modes ascend in frequency; column m of a vectors matrix is mode m, row i ion i.
/// The overall sign of a column is arbitrary (here: the last ion with a part in the mode moves positively).
struct Chain {
  Trap trap;
  double length_scale = 0;    // l in m
  Eigen::VectorXd positions;  // u, ascending, in units of l
  Eigen::VectorXd axial_hz;
  Eigen::MatrixXd axial_vectors;
  Eigen::VectorXd transverse_hz;
  Eigen::MatrixXd transverse_vectors;

  int ions() const { return trap.ions; }
  /// Smallest distance of neighbours in m; 0 for a single ion.
  double smallest_spacing() const;
};

/// The trap cannot hold this chain: it buckles into a zigzag, or a value is out of range.
struct ImpossibleTrap : std::domain_error {
  using std::domain_error::domain_error;
};

/// Equilibrium and normal modes of both kinds. The transverse matrix obeys Laplace's equation in the quartic
/// term, too (minus 3/2 a4 u^2). Throws ImpossibleTrap; for a zigzag the text names the critical ratio of
/// transverse to axial frequency. D. F. V. James, Appl. Phys. B 66, 181 (1998).
Chain solve_chain(const Trap& trap);

/// The smallest ratio transverse_hz / axial_hz at which this trap's chain stays straight.
double critical_ratio(const Trap& trap);

/// Wave number difference of two beams of the given wavelength (m) that meet at an angle (rad; pi = counter-
/// propagating), in 1/m: 4 pi / wavelength sin(angle/2).
double wave_number_difference(double wavelength, double angle);

/// eta(i, m) = dk b(i, m) sqrt(hbar / 2 M w_m) of the transverse modes: row = ion, column = mode.
Eigen::MatrixXd lamb_dicke(const Chain& chain, double wave_number_difference);

}  // namespace isinglass
