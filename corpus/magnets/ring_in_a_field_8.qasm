// Eight magnets in a ring with a transverse field, three second-order steps in time. Suzuki 1990.
OPENQASM 3.0;
include "stdgates.inc";
const uint n = 8;
const uint steps = 3;
const float coupling = 1.0;
const float field = 0.7;
const float dt = 0.15;
qubit[n] spin;
bit[n] up;
gate ising(t) a, b {
  cx a, b;
  rz(t) b;
  cx a, b;
}
rx(field * dt) spin;
for uint k in [1:steps] {
  for uint i in [0:n - 1] { ising(2 * coupling * dt) spin[i], spin[(i + 1) % n]; }
  if (k < steps) { rx(2 * field * dt) spin; }
}
rx(field * dt) spin;
up = measure spin;
