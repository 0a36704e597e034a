// In-place ripple-carry addition of two 4-bit cargo counts, all of them at once. Cuccaro, Draper, Kutin, Moulton 2004.
OPENQASM 3.0;
include "stdgates.inc";
gate majority a, b, c {
  cx c, b;
  cx c, a;
  ccx a, b, c;
}
gate unmajority a, b, c {
  ccx a, b, c;
  cx c, a;
  cx a, b;
}
qubit carry_in;
qubit[4] a;
qubit[4] b;
qubit carry_out;
bit[5] sum;
h a;
ry(0.7) b;
majority carry_in, b[0], a[0];
for uint i in [0:2] { majority a[i], b[i + 1], a[i + 1]; }
cx a[3], carry_out;
for int i in [2:-1:0] { unmajority a[i], b[i + 1], a[i + 1]; }
unmajority carry_in, b[0], a[0];
rx(0.2) b;
sum[0:3] = measure b;
sum[4] = measure carry_out;
