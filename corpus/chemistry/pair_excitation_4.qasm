// Singles and half a pair excitation on four spin orbitals, Jordan-Wigner ladders. Peruzzo et al. 2014; Romero et al. 2018.
OPENQASM 3.0;
include "stdgates.inc";
qubit[4] orbital;
const float single = 0.11;
const float pair = -0.23;
gate ladder(t) a, b, c, d { cx a, b; cx b, c; cx c, d; rz(t) d; cx c, d; cx b, c; cx a, b; }
gate to_y q { sdg q; h q; }
gate hop(t) a, b {
  h a; to_y b; cx a, b; rz(t) b; cx a, b; h a; inv @ to_y b;
  to_y a; h b; cx a, b; rz(-t) b; cx a, b; inv @ to_y a; h b;
}
x orbital[0]; x orbital[2];
hop(single) orbital[0], orbital[1];
hop(single) orbital[2], orbital[3];
h orbital[0]; h orbital[1]; h orbital[2]; to_y orbital[3];
ladder(pair / 4) orbital[0], orbital[1], orbital[2], orbital[3];
h orbital[0]; h orbital[1]; h orbital[2]; inv @ to_y orbital[3];
h orbital[0]; h orbital[1]; to_y orbital[2]; h orbital[3];
ladder(pair / 4) orbital[0], orbital[1], orbital[2], orbital[3];
h orbital[0]; h orbital[1]; inv @ to_y orbital[2]; h orbital[3];
h orbital[0]; to_y orbital[1]; to_y orbital[2]; to_y orbital[3];
ladder(pair / 4) orbital[0], orbital[1], orbital[2], orbital[3];
h orbital[0]; inv @ to_y orbital[1]; inv @ to_y orbital[2]; inv @ to_y orbital[3];
h orbital[0]; to_y orbital[1]; h orbital[2]; h orbital[3];
ladder(-pair / 4) orbital[0], orbital[1], orbital[2], orbital[3];
h orbital[0]; inv @ to_y orbital[1]; h orbital[2]; h orbital[3];
