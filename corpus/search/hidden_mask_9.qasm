// Reads the nine-bit mask of a parity in one question. Bernstein, Vazirani 1993.
OPENQASM 3.0;
include "stdgates.inc";
const bit[9] mask = "101100110";
qubit[9] query;
qubit answer;
bit[9] reading;
x answer;
h query;
h answer;
for uint i in [0:8] {
  if (mask[i]) { cx query[i], answer; }
}
h query;
reading = measure query;
