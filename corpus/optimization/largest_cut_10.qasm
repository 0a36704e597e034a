// Two layers of approximate optimization for the largest cut of a 3-regular graph. Farhi, Goldstone, Gutmann 2014.
OPENQASM 3.0;
include "stdgates.inc";
input float gamma_1;
input float beta_1;
input float gamma_2;
input float beta_2;
qubit[10] v;
bit[10] side;
gate edge(g) a, b { cx a, b; rz(g) b; cx a, b; }
def layer(float g, float b, qubit[10] w) {
  // The outer ring, the spokes and the inner star of the Petersen graph.
  for uint i in [0:4] {
    edge(g) w[i], w[(i + 1) % 5];
    edge(g) w[i], w[i + 5];
    edge(g) w[5 + i], w[5 + (i + 2) % 5];
  }
  rx(2 * b) w;
}
h v;
layer(gamma_1, beta_1, v);
layer(gamma_2, beta_2, v);
side = measure v;
