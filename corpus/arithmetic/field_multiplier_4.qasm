// Product in GF(2^4) modulo x^4 + x + 1 by the schoolbook method. Mastrovito 1988 for the layout of the reduction.
OPENQASM 3.0;
include "stdgates.inc";
qubit[4] a;
qubit[4] b;
qubit[4] product;
// High terms first: x^6, x^5, x^4 are folded down by x^4 = x + 1.
for uint i in [0:3] {
  for uint j in [0:3] {
    if (i + j >= 4) { ccx a[i], b[j], product[i + j - 4]; }
  }
}
cx product[2], product[3];
cx product[1], product[2];
cx product[0], product[1];
for uint i in [0:3] {
  for uint j in [0:3] {
    if (i + j < 4) { ccx a[i], b[j], product[i + j]; }
  }
}
