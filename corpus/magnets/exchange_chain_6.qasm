// Exchange coupling on a chain of six spins, two first-order steps, strengths as inputs. Lloyd 1996.
OPENQASM 3.0;
include "stdgates.inc";
input float jx;
input float jz;
qubit[6] spin;
gate coupled_z(t) a, b { cx a, b; rz(t) b; cx a, b; }
gate exchange(tx, tz) a, b {
  coupled_z(tz) a, b;
  h a; h b;
  coupled_z(tx) a, b;
  h a; h b;
  sdg a; sdg b; h a; h b;
  coupled_z(tx) a, b;
  h a; h b; s a; s b;
}
x spin[1]; x spin[3]; x spin[5];
for uint step in [0:1] {
  for uint i in [0:2:4] { exchange(jx, jz) spin[i], spin[i + 1]; }
  for uint i in [1:2:3] { exchange(jx, jz) spin[i], spin[i + 1]; }
}
