// Twelve buoys in one superposition: GHZ state by a chain of CNOTs. Greenberger, Horne, Zeilinger 1989.
OPENQASM 3.0;
include "stdgates.inc";
qubit[12] buoy;
h buoy[0];
for uint i in [0:10] { cx buoy[i], buoy[i + 1]; }
