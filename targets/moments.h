// Integrals of powers times oscillations over one segment of a pulse, in closed form and regular everywhere:
// what the pulses room builds its kernels from.
#pragma once

#include <array>
#include <complex>

namespace isinglass {

/// M[n] = int_0^1 u^n e^{i z u} du for n = 0 to 4.
using Moments = std::array<std::complex<double>, 5>;
Moments moments(double z);

/// W[n][m] = int_0^1 du u^n e^{i a u} int_0^u dv v^m e^{-i b v} for n, m = 0 to 2.
using OrderedMoments = std::array<std::array<std::complex<double>, 3>, 3>;
OrderedMoments ordered_moments(double a, double b);

/// Gauss-Legendre rule of 16 points on [0, 1].
struct GaussPoint {
  double at;
  double weight;
};
const std::array<GaussPoint, 16>& gauss_rule();

}  // namespace isinglass
