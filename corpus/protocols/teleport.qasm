// Carries the state of one ion to another with two bits. Bennett et al. 1993.
OPENQASM 3.0;
include "stdgates.inc";
qubit sender;
qubit[2] shared;
bit m_z;
bit m_x;
u3(0.9, 0.4, -1.3) sender;
h shared[0];
cx shared[0], shared[1];
cx sender, shared[0];
h sender;
m_z = measure sender;
m_x = measure shared[0];
if (m_x) { x shared[1]; }
if (m_z) { z shared[1]; }
