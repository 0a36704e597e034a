// Encodes one qubit in the seven-qubit code and reads its three Z checks. Steane 1996.
OPENQASM 3.0;
include "stdgates.inc";
qubit[7] data;
qubit[3] check;
bit[3] syndrome;
rx(1.1) data[6];
cx data[6], data[5]; cx data[6], data[4];
h data[0]; h data[1]; h data[2];
cx data[0], data[3]; cx data[0], data[4]; cx data[0], data[6];
cx data[1], data[3]; cx data[1], data[5]; cx data[1], data[6];
cx data[2], data[4]; cx data[2], data[5]; cx data[2], data[3];
cx data[0], check[0]; cx data[3], check[0]; cx data[4], check[0]; cx data[6], check[0];
cx data[1], check[1]; cx data[3], check[1]; cx data[5], check[1]; cx data[6], check[1];
cx data[2], check[2]; cx data[4], check[2]; cx data[5], check[2]; cx data[6], check[2];
syndrome = measure check;
