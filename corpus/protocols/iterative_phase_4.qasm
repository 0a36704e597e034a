// Four digits of the turn 5/16 with one control ion, used again and again. Kitaev 1995; Dobsicek et al. 2007.
OPENQASM 3.0;
include "stdgates.inc";
qubit control;
qubit gauge;
bit[4] digit;
x gauge;
for int k in [0:3] {
  reset control;
  h control;
  cp(2 * pi * 5 / 16 * 2 ** (3 - k)) control, gauge;
  for int j in [0:k - 1] {
    if (digit[j]) { p(-pi / 2 ** (k - j)) control; }
  }
  h control;
  digit[k] = measure control;
}
