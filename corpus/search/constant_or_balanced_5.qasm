// Tells a constant function of four bits from a balanced one in one question. Deutsch, Jozsa 1992.
OPENQASM 2.0;
include "qelib1.inc";
qreg q[4];
qreg answer[1];
creg c[4];
x answer[0];
h q;
h answer;
cx q[0],answer[0];
ccx q[1],q[2],answer[0];
cx q[3],answer[0];
ccx q[1],q[2],answer[0];
h q;
measure q -> c;
