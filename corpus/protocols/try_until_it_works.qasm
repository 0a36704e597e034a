// A rotation about Z, repeated until two measurements say that it was done. Paetznick, Svore 2014.
OPENQASM 3.0;
include "stdgates.inc";
qubit[2] helper;
qubit target;
bit[2] flags = "11";
h target;
while (flags != "00") {
  reset helper;
  h helper;
  ccx helper[0], helper[1], target;
  s target;
  ccx helper[0], helper[1], target;
  z target;
  h helper;
  flags = measure helper;
}
