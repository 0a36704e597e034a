// Four steps of a coined walk on a ring of sixteen jetties. Aharonov, Ambainis, Kempe, Vazirani 2001.
OPENQASM 3.0;
include "stdgates.inc";
qubit coin;
qubit[4] jetty;
bit[4] place;
// Adds one to the number in a, b, d, e (a lowest) when the coin shows 1.
gate forward c, a, b, d, e {
  ctrl(4) @ x c, a, b, d, e;
  ctrl(3) @ x c, a, b, d;
  ccx c, a, b;
  cx c, a;
}
for uint step in [1:4] {
  h coin;
  forward coin, jetty[0], jetty[1], jetty[2], jetty[3];
  x coin;
  inv @ forward coin, jetty[0], jetty[1], jetty[2], jetty[3];
  x coin;
}
place = measure jetty;
