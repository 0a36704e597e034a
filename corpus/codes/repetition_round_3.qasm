// One round of the three-qubit bit-flip code, corrected while the program runs. Shor 1995.
OPENQASM 3.0;
include "stdgates.inc";
qubit[3] data;
qubit[2] check;
bit[2] syndrome;
bit[3] reading;
ry(0.8) data[0];
cx data[0], data[1];
cx data[0], data[2];
x data[1];  // the fault
cx data[0], check[0]; cx data[1], check[0];
cx data[1], check[1]; cx data[2], check[1];
syndrome = measure check;
switch (uint[2](syndrome)) {
  case 1 { x data[0]; }
  case 2 { x data[2]; }
  case 3 { x data[1]; }
  default { }
}
reading = measure data;
