// One lit lamp among four, evenly shared: W state by controlled rotations. Duer, Vidal, Cirac 2000.
OPENQASM 3.0;
include "stdgates.inc";
qubit[4] lamp;
bit[4] seen;
x lamp[0];
for uint k in [0:2] {
  // cos^2(theta/2) = 1/(4 - k) of the excitation stays, the rest is passed on.
  cry(2 * arccos(sqrt(1 / (4.0 - k)))) lamp[k], lamp[k + 1];
  cx lamp[k + 1], lamp[k];
}
seen = measure lamp;
