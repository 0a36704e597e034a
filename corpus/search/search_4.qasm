// Finds the marked berth among sixteen in three rounds. Grover 1996.
OPENQASM 3.0;
include "stdgates.inc";
qubit[4] berth;
bit[4] found;
gate mark a, b, c, d { x c; ctrl(3) @ z a, b, c, d; x c; }
gate about_the_mean a, b, c, d {
  h a; h b; h c; h d;
  x a; x b; x c; x d;
  ctrl(3) @ z a, b, c, d;
  x a; x b; x c; x d;
  h a; h b; h c; h d;
}
h berth;
for uint round in [1:3] {
  mark berth[0], berth[1], berth[2], berth[3];
  about_the_mean berth[0], berth[1], berth[2], berth[3];
}
found = measure berth;
