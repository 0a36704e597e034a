// Five binary digits of the turn 11/32 of a phase gate. Kitaev 1995; Cleve et al. 1998.
OPENQASM 3.0;
include "stdgates.inc";
const int n = 5;
const float turn = 11 / 32.0;
qubit[n] digit;
qubit gauge;
bit[n] reading;
x gauge;
h digit;
for int j in [0:n - 1] { cp(2 * pi * turn * 2 ** j) digit[j], gauge; }
for int j in [0:n / 2 - 1] { swap digit[j], digit[n - 1 - j]; }
for int j in [0:n - 1] {
  for int k in [0:j - 1] { cp(-pi / 2 ** (j - k)) digit[k], digit[j]; }
  h digit[j];
}
reading = measure digit;
