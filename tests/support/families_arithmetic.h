// Reversible arithmetic as circuits of NOTs with controls, after the published constructions.
#pragma once

#include <cstdint>

#include "circuit/circuit.h"

namespace isinglass::support {

/// NOT with n >= 3 controls on n-2 clean ancillas, 2n-3 Toffolis in a V. Wires: controls 0..n-1, ancillas,
/// target last. Without the promise of clean ancillas it is still some unitary, which has to be kept.
Circuit tof(std::uint32_t n);

/// NOT with n >= 3 controls on n-2 dirty ancillas, 4(n-2) Toffolis: Barenco et al., PRA 52, 3457, lemma 7.2.
/// Wires as in tof().
Circuit barenco_tof(std::uint32_t n);

/// Ripple-carry adder after Vedral, Barenco, Ekert, PRA 54, 147: b += a, with the last carry in c[n].
/// Registers a (n), b (n), c (n+1, starts in 0; c[0..n-1] returns to 0). The two CNOTs that cancel in the
/// middle are left out.
Circuit vbe_adder(std::uint32_t n);

/// Ripple-carry adder after Cuccaro, Draper, Kutin, Moulton, quant-ph/0410184, for n >= 4: b += a, z ^=
/// carry. Registers x (1, clean), a (n), b (n), z (1). 2n-1 Toffolis, 5n-3 CNOTs.
Circuit cuccaro_adder(std::uint32_t n);

/// c = a b in GF(2^n), schoolbook, n = 4..10: registers a, b, c of n wires, c starts in 0.
Circuit gf_multiplier(std::uint32_t n);
/// The polynomial of gf_multiplier's field: bit k is the coefficient of x^k, k <= n.
std::uint32_t field_polynomial(std::uint32_t n);

/// Every NOT with two controls in the textbook way: six CNOTs, seven T gates. `variant` 0 is the usual order;
/// others exchange the controls or run the mirrored sequence.
Circuit expanded_clifford_t(const Circuit& circuit, int variant = 0);

/// What the circuit of NOTs with controls makes of a basis state (bit w = wire w).
std::uint64_t run_classically(const Circuit& circuit, std::uint64_t bits);

}  // namespace isinglass::support
