// Adds the constant 5 to a 4-bit register in the Fourier basis. Draper 2000.
OPENQASM 3.0;
include "stdgates.inc";
const int n = 4;
const int added = 5;
qubit[n] crate;
gate fourier_4 a, b, c, d {
  h d; cp(pi / 2) c, d; cp(pi / 4) b, d; cp(pi / 8) a, d;
  h c; cp(pi / 2) b, c; cp(pi / 4) a, c;
  h b; cp(pi / 2) a, b;
  h a;
}
fourier_4 crate[0], crate[1], crate[2], crate[3];
for int j in [0:n - 1] { p(2 * pi * added / 2.0 ** (j + 1)) crate[j]; }
inv @ fourier_4 crate[0], crate[1], crate[2], crate[3];
