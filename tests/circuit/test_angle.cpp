// Angles and linear forms.
#include <doctest/doctest.h>

#include <cmath>

#include "circuit/angle.h"
#include "circuit/circuit.h"

using namespace isinglass;

TEST_CASE("linear forms are interned, add and cancel") {
  Forms forms;
  const auto a = forms.of_input(0);
  const auto b = forms.of_input(1);
  CHECK(forms.of_input(0) == a);
  const auto both = forms.sum(a, forms.scaled(b, 2.5));
  CHECK(forms.sum(forms.scaled(b, 2.5), a) == both);
  const std::vector<double> inputs = {0.25, 2.0};
  CHECK(forms.value(both, inputs) == doctest::Approx(5.25));
  CHECK(forms.sum(both, forms.scaled(both, -1)) == 0);
  CHECK(forms.difference(Angle{1, a}, Angle{0.25, a}) == Angle{0.75, 0});
}

TEST_CASE("wrapped brings into (-pi, pi]") {
  CHECK(wrapped(-pi) == pi);
  CHECK(wrapped(3 * pi) == doctest::Approx(pi));
  CHECK(wrapped(pi + 0.1) == doctest::Approx(-pi + 0.1));
}

TEST_CASE("operands beyond three live in the pool") {
  Circuit circuit;
  add_register(circuit, "q", 6);
  const Operation big = circuit.make(Kind::x, {0, 1, 2, 3, 4});
  circuit.body().push_back(big);
  circuit.body().push_back(circuit.make(Kind::x, {5, 0}));
  CHECK(circuit.controls(big).size() == 4);
  CHECK(circuit.targets(big)[0] == 4);
  CHECK_NOTHROW(check_invariants(circuit));
  circuit.body().push_back(circuit.make(Kind::x, {5, 5}));
  CHECK_THROWS(check_invariants(circuit));
}

TEST_CASE("reduced is the remainder up to a rounding") {
  for (double x = -2000; x < 2000; x += 0.37) {
    CHECK(std::abs(reduced(x, 2 * pi) - std::remainder(x, 2 * pi)) < 1e-12);
    CHECK(std::abs(wrapped(x)) <= pi + 1e-12);
  }
}
