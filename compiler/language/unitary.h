// Small unitary matrices: of a list of acts, their principal powers, and back to a list of acts.
#pragma once

#include <Eigen/Core>
#include <span>

#include "language/gate.h"

namespace isinglass {

/// The matrix of acts with known angles on these wires (the first is the lowest bit of the index). A Fault if
/// an angle is not known.
Eigen::MatrixXcd matrix_of(const Acts& acts, std::span<const std::uint32_t> wires);

/// U^exponent with the eigenphases of U taken in (-pi, pi], those within 1e-9 of -pi as +pi.
Eigen::MatrixXcd principal_power(const Eigen::MatrixXcd& unitary, double exponent);

/// Acts that make this unitary exactly, global phase included: one-qubit gates and CNOTs, by the quantum
/// Shannon decomposition (Shende, Bullock, Markov, "Synthesis of quantum-logic circuits", IEEE TCAD 25,
/// 2006).
Acts synthesized(const Eigen::MatrixXcd& unitary, std::span<const std::uint32_t> wires);

}  // namespace isinglass
