// Quantum Fourier transform on eight qubits with its final reversal. Coppersmith 1994.
OPENQASM 3.0;
include "stdgates.inc";
const int n = 8;
qubit[n] tide;
for int j in [n - 1:-1:0] {
  h tide[j];
  for int k in [j - 1:-1:0] { cp(pi / 2 ** (j - k)) tide[k], tide[j]; }
}
for int j in [0:n / 2 - 1] { swap tide[j], tide[n - 1 - j]; }
