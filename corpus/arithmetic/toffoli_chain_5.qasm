// A gate that opens when five locks are open, with three clean helpers in a V of Toffolis. Barenco et al. 1995.
OPENQASM 3.0;
include "stdgates.inc";
qubit[5] lock;
qubit[3] helper;
qubit gate_open;
bit seen;
h lock;
ccx lock[0], lock[1], helper[0];
ccx lock[2], helper[0], helper[1];
ccx lock[3], helper[1], helper[2];
ccx lock[4], helper[2], gate_open;
ccx lock[3], helper[1], helper[2];
ccx lock[2], helper[0], helper[1];
ccx lock[0], lock[1], helper[0];
seen = measure gate_open;
