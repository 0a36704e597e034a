// Gates and modifiers: the unitaries that are read, against matrices written down here from the standard's
// definitions and against the tests' own interpreter.
#include <doctest/doctest.h>
#include <fmt/format.h>

#include <cmath>
#include <random>

#include "language/gate.h"
#include "language/meaning.h"
#include "language/unitary.h"
#include "support/simulator.h"

using namespace isinglass;
using meaning::circuit_of;
using meaning::deviation;
using meaning::errors_of;
using support::Complex;
using support::Matrix;

namespace {

const std::string heading = "OPENQASM 3.1;\ninclude \"stdgates.inc\";\n";

/// The unitary of a program on its qubits, global phase included.
Matrix unitary_of(const std::string& body, int qubits) {
  return support::unitary(circuit_of(heading + fmt::format("qubit[{}] q;\n", qubits) + body));
}

/// Largest difference of entries, the global phase counted.
double apart(const Matrix& a, const Matrix& b) {
  REQUIRE(a.rows() == b.rows());
  return (a - b).cwiseAbs().maxCoeff();
}

Matrix two_by_two(Complex a, Complex b, Complex c, Complex d) {
  Matrix m(2, 2);
  m << a, b, c, d;
  return m;
}

const Complex i(0, 1);

/// The standard's U, from its formula with 1 + e^{i theta}.
Matrix u(double theta, double phi, double lambda) {
  const Complex e = std::polar(1.0, theta);
  return 0.5 * two_by_two(1.0 + e, -i * std::polar(1.0, lambda) * (1.0 - e),
                          i * std::polar(1.0, phi) * (1.0 - e), std::polar(1.0, phi + lambda) * (1.0 + e));
}

}  // namespace

TEST_CASE("U and every one-qubit gate of stdgates.inc, phases included") {
  const double t = 0.7;
  const double r = std::sqrt(0.5);
  const std::vector<std::pair<std::string, Matrix>> gates = {
      {"U(0.7, 1.1, -2.3)", u(0.7, 1.1, -2.3)},
      {"p(0.7)", two_by_two(1, 0, 0, std::polar(1.0, t))},
      {"phase(0.7)", two_by_two(1, 0, 0, std::polar(1.0, t))},
      {"u1(0.7)", two_by_two(1, 0, 0, std::polar(1.0, t))},
      {"x", two_by_two(0, 1, 1, 0)},
      {"y", two_by_two(0, -i, i, 0)},
      {"z", two_by_two(1, 0, 0, -1)},
      {"h", two_by_two(r, r, r, -r)},
      {"s", two_by_two(1, 0, 0, i)},
      {"sdg", two_by_two(1, 0, 0, -i)},
      {"t", two_by_two(1, 0, 0, std::polar(1.0, pi / 4))},
      {"tdg", two_by_two(1, 0, 0, std::polar(1.0, -pi / 4))},
      {"sx", 0.5 * two_by_two(1.0 + i, 1.0 - i, 1.0 - i, 1.0 + i)},
      {"id", support::identity()},
      {"rx(0.7)", support::rotation(t, support::pauli_x())},
      {"ry(0.7)", support::rotation(t, support::pauli_y())},
      {"rz(0.7)", support::rotation(t, support::pauli_z())},
      {"u2(0.4, 0.9)", std::polar(1.0, -(pi / 2 + 0.4 + 0.9) / 2) * u(pi / 2, 0.4, 0.9)},
      {"u3(0.7, 0.4, 0.9)", std::polar(1.0, -(0.7 + 0.4 + 0.9) / 2) * u(0.7, 0.4, 0.9)},
  };
  for (const auto& [name, expected] : gates) {
    INFO(name);
    CHECK(apart(unitary_of(name + " q[0];", 1), expected) < 1e-14);
    // Under a control the gate's phase is seen.
    CHECK(apart(unitary_of("ctrl @ " + name + " q[0], q[1];", 2), support::controlled(expected)) < 1e-14);
  }
}

TEST_CASE("every gate of several qubits of stdgates.inc: the first operand controls") {
  const Matrix swap = support::gate_matrix(Kind::swap);
  const std::vector<std::tuple<std::string, int, Matrix>> gates = {
      {"cx", 2, support::controlled(support::pauli_x())},
      {"CX", 2, support::controlled(support::pauli_x())},
      {"cy", 2, support::controlled(support::pauli_y())},
      {"cz", 2, support::controlled(support::pauli_z())},
      {"cp(0.7)", 2, support::controlled(two_by_two(1, 0, 0, std::polar(1.0, 0.7)))},
      {"cphase(0.7)", 2, support::controlled(two_by_two(1, 0, 0, std::polar(1.0, 0.7)))},
      {"crx(0.7)", 2, support::controlled(support::rotation(0.7, support::pauli_x()))},
      {"cry(0.7)", 2, support::controlled(support::rotation(0.7, support::pauli_y()))},
      {"crz(0.7)", 2, support::controlled(support::rotation(0.7, support::pauli_z()))},
      {"ch", 2, support::controlled(unitary_of("h q[0];", 1))},
      {"swap", 2, swap},
      {"ccx", 3, support::controlled(support::pauli_x(), 2)},
      {"cswap", 3, support::controlled(swap)},
      // e^{i(gamma - theta/2)} U, as the library file has it.
      {"cu(0.7, 0.4, 0.9, 0.3)", 2, support::controlled(std::polar(1.0, 0.3 - 0.35) * u(0.7, 0.4, 0.9))},
  };
  for (const auto& [name, count, expected] : gates) {
    INFO(name);
    std::string operands = " q[0]";
    for (int k = 1; k < count; ++k) operands += fmt::format(", q[{}]", k);
    CHECK(apart(unitary_of(name + operands + ";", count), expected) < 1e-14);
  }
}

TEST_CASE("standard gates are operations of the circuit, not their definitions") {
  const auto only = [](const std::string& call) {
    const Circuit circuit = circuit_of(heading + "qubit[3] q;\n" + call + ";\n");
    REQUIRE(circuit.body().size() == 1);
    return circuit.body()[0];
  };
  CHECK(only("cx q[0], q[1]").kind == Kind::x);
  CHECK(only("cx q[0], q[1]").control_count() == 1);
  CHECK(only("ccx q[0], q[1], q[2]").control_count() == 2);
  CHECK(only("crz(0.3) q[0], q[1]").kind == Kind::rz);
  CHECK(only("cswap q[0], q[1], q[2]").kind == Kind::swap);
  CHECK(only("cp(0.3) q[0], q[1]").kind == Kind::p);
  CHECK(only("ry(0.3) q[0]").kind == Kind::r);
}

TEST_CASE("gphase: accumulates, is kept in gates and relative under control") {
  CHECK(apart(unitary_of("gphase(0.3); gphase(0.4);", 1), std::polar(1.0, 0.7) * support::identity()) <
        1e-15);
  CHECK(apart(unitary_of("gate g q { gphase(0.5); x q; } ctrl @ g q[0], q[1];", 2),
              support::controlled(std::polar(1.0, 0.5) * support::pauli_x())) < 1e-15);
  CHECK(apart(unitary_of("ctrl @ gphase(0.3) q[0];", 1), u(0, 0, 0.3)) < 1e-15);
  CHECK(apart(unitary_of("ctrl(2) @ gphase(0.3) q[0], q[1];", 2),
              support::controlled(two_by_two(1, 0, 0, std::polar(1.0, 0.3)))) < 1e-15);
  CHECK(apart(unitary_of("negctrl @ gphase(0.3) q[0];", 1), two_by_two(std::polar(1.0, 0.3), 0, 0, 1)) <
        1e-15);
  CHECK(errors_of(heading + "qubit q; gphase(0.3) q;").size() == 1);
}

TEST_CASE("gate definitions: parameters, nesting, empty bodies, loops, shadowing") {
  CHECK(apart(unitary_of("gate g(a, b) q { rx(a) q; rz(2*b - a/2) q; } g(0.3, 0.4) q[0];", 1),
              support::rotation(0.65, support::pauli_z()) * support::rotation(0.3, support::pauli_x())) <
        1e-14);
  CHECK(apart(unitary_of("gate n q { } n q[0];", 1), support::identity()) == 0);
  CHECK(apart(unitary_of("gate g(a) q { for int k in [1:3] { rz(a*k) q; } } g(0.1) q[0];", 1),
              support::rotation(0.6, support::pauli_z())) < 1e-14);
  // Its arguments may be called as gates are; inside they stand for the arguments.
  CHECK(apart(unitary_of("gate g(t) s { rz(t) s; } g(0.4) q[0];", 1),
              support::rotation(0.4, support::pauli_z())) < 1e-14);
  // What is not a sum of multiples is computed at the call.
  CHECK(apart(unitary_of("gate g(a) q { rz(sin(a)**2 + a*a) q; } gate f(b) q { g(b/2) q; } f(0.8) q[0];", 1),
              support::rotation(std::pow(std::sin(0.4), 2) + 0.16, support::pauli_z())) < 1e-14);
  CHECK(apart(unitary_of("const float half = 0.5; gate g q { rz(half) q; } g q[0];", 1),
              support::rotation(0.5, support::pauli_z())) < 1e-14);
  CHECK(apart(unitary_of("gate g a, b { cx a, b; barrier a; x a; } g q[0], q[1];", 2),
              unitary_of("cx q[0], q[1]; x q[0];", 2)) < 1e-15);
}

TEST_CASE("gate definitions: what is refused") {
  const auto errors = [](const std::string& body) {
    return errors_of(heading + "qubit[2] q;\n" + body).size();
  };
  CHECK(errors("gate g a { g a; }") == 1);
  CHECK(errors("gate g a { later a; } gate later a { x a; }") == 1);
  CHECK(errors("gate g a { x a[0]; }") == 1);
  CHECK(errors("gate g a { measure a; }") == 1);
  CHECK(errors("gate g a { reset a; }") == 1);
  CHECK(errors("gate g a { int k = 3; }") == 1);
  CHECK(errors("gate g a { x $0; }") == 1);
  CHECK(errors("gate g a { x q[0]; }") == 1);
  CHECK(errors("int k = 3; gate g a { rz(k) a; }") == 1);
  CHECK(errors("gate g(a, a) b { }") == 1);
  CHECK(errors("gate g a, b { cx a, a; }") == 1);
  CHECK(errors("gate g a { } gate g a { }") == 1);
  CHECK(errors("{ gate g a { } }") == 1);
  CHECK(errors("opaque o a; o q[0];") >= 1);
}

TEST_CASE("controls: order, numbers, negation, registers") {
  CHECK(apart(unitary_of("ctrl @ ctrl @ x q[0], q[1], q[2];", 3), unitary_of("ccx q[0], q[1], q[2];", 3)) <
        1e-15);
  CHECK(apart(unitary_of("ctrl(2) @ x q[2], q[0], q[1];", 3), unitary_of("ccx q[2], q[0], q[1];", 3)) <
        1e-15);
  // The leftmost modifier takes the first operands.
  CHECK(apart(unitary_of("negctrl @ ctrl @ x q[0], q[1], q[2];", 3),
              unitary_of("x q[0]; ccx q[0], q[1], q[2]; x q[0];", 3)) < 1e-15);
  // All controls of negctrl(n) must be 0.
  CHECK(apart(unitary_of("negctrl(2) @ x q[0], q[1], q[2];", 3),
              unitary_of("x q[0]; x q[1]; ccx q[0], q[1], q[2]; x q[0]; x q[1];", 3)) < 1e-15);
  CHECK(apart(unitary_of("inv @ ctrl @ U(0.3, 0.4, 0.5) q[0], q[1];", 2),
              unitary_of("ctrl @ inv @ U(0.3, 0.4, 0.5) q[0], q[1];", 2)) < 1e-14);
  CHECK(apart(unitary_of("inv @ U(0.3, 0.4, 0.5) q[0];", 1), u(0.3, 0.4, 0.5).adjoint()) < 1e-14);
  CHECK(apart(unitary_of("inv @ cu(0.3, 0.4, 0.5, 0.6) q[0], q[1]; cu(0.3, 0.4, 0.5, 0.6) q[0], q[1];", 2),
              support::identity(2)) < 1e-14);
  const auto errors = [](const std::string& body) {
    return errors_of(heading + "qubit[2] q; qubit r;\n" + body).size();
  };
  CHECK(errors("ctrl(2) @ x q, r;") == 1);  // a register is one operand
  CHECK(errors("ctrl(0) @ x q[0];") == 1);
  CHECK(errors("ctrl(-1) @ x q[0];") == 1);
  // ... and is taken qubit by qubit.
  const Circuit circuit = circuit_of(heading + "qubit[2] q; qubit r;\nctrl @ z q, r;");
  CHECK(circuit.body().size() == 2);
}

TEST_CASE("pow: integers repeat, negative ones repeat the inverse") {
  CHECK(apart(unitary_of("pow(3) @ U(0.3, 0.4, 0.5) q[0];", 1),
              u(0.3, 0.4, 0.5) * u(0.3, 0.4, 0.5) * u(0.3, 0.4, 0.5)) < 1e-14);
  CHECK(apart(unitary_of("pow(-2) @ U(0.3, 0.4, 0.5) q[0];", 1),
              (u(0.3, 0.4, 0.5) * u(0.3, 0.4, 0.5)).adjoint()) < 1e-14);
  CHECK(apart(unitary_of("pow(0) @ h q[0];", 1), support::identity()) == 0);
  CHECK(apart(unitary_of("pow(1/2) @ h q[0];", 1), support::identity()) == 0);  // 1/2 is 0
  CHECK(apart(unitary_of("pow(2.0) @ s q[0];", 1), support::pauli_z()) < 1e-15);
  // A large power of a small gate costs no more than the gate.
  const Circuit circuit = circuit_of(heading + "qubit[2] q;\npow(2**20) @ cp(0.1) q[0], q[1];");
  REQUIRE(circuit.body().size() == 1);
  CHECK(circuit.body()[0].value[0] == doctest::Approx(0.1 * 1048576));
  Matrix power = u(0.3, 0.4, 0.5);
  for (int k = 0; k < 12; ++k) power = (power * power).eval();
  CHECK(apart(unitary_of("ctrl @ pow(4096) @ U(0.3, 0.4, 0.5) q[0], q[1];", 2), support::controlled(power)) <
        1e-10);
}

TEST_CASE("pow: fractions take the principal branch") {
  const auto z = [](double phase) { return two_by_two(1, 0, 0, std::polar(1.0, phase)); };
  CHECK(apart(unitary_of("pow(0.5) @ z q[0];", 1), z(pi / 2)) < 1e-15);
  CHECK(apart(unitary_of("pow(0.5) @ pow(2) @ z q[0];", 1), support::identity()) < 1e-15);
  CHECK(apart(unitary_of("pow(0.5) @ inv @ z q[0];", 1), z(pi / 2)) < 1e-15);
  CHECK(apart(unitary_of("inv @ pow(0.5) @ z q[0];", 1), z(-pi / 2)) < 1e-15);
  CHECK(apart(unitary_of("pow(0.5) @ p(3*pi/2) q[0];", 1), z(-pi / 4)) < 1e-15);
  CHECK(apart(unitary_of("pow(1.0/2) @ x q[0];", 1), unitary_of("sx q[0];", 1)) < 1e-15);
  CHECK(apart(unitary_of("pow(0.25) @ z q[0];", 1), unitary_of("t q[0];", 1)) < 1e-15);
  CHECK(apart(unitary_of("pow(0.5) @ gphase(3.5);", 1),
              std::polar(1.0, (3.5 - 2 * pi) / 2) * support::identity()) < 1e-15);
  CHECK(apart(unitary_of("ctrl @ pow(0.5) @ y q[0], q[1];", 2),
              unitary_of("pow(0.5) @ ctrl @ y q[0], q[1];", 2)) < 1e-14);
  // Half of a turn of 2 pi is the principal root of -1 on both eigenvectors: i, not a rotation.
  CHECK(apart(unitary_of("pow(0.5) @ rz(2*pi) q[0];", 1), i * support::identity()) < 1e-9);
}

TEST_CASE("pow: fractions of every kind, squared, give the gate") {
  const std::vector<std::string> gates = {"x q[0]",
                                          "y q[0]",
                                          "h q[0]",
                                          "rx(0.7) q[0]",
                                          "rz(-2.1) q[0]",
                                          "U(0.3, 0.4, 0.5) q[0]",
                                          "swap q[0], q[1]",
                                          "cx q[0], q[1]",
                                          "cswap q[0], q[1], q[2]",
                                          "g(0.4) q[0], q[1], q[2]",
                                          "f q[0], q[1]",
                                          "cu(0.7, 0.4, 0.9, 0.3) q[0], q[1]"};
  const std::string definitions =
      "gate f a, b { h a; cx a, b; gphase(0.4); } gate g(t) a, b, c { h a; cp(t) a, b; ccx a, b, c; rx(t) c; "
      "swap a, c; }\n";
  for (const std::string& gate : gates) {
    INFO(gate);
    const Matrix whole = unitary_of(definitions + gate + ";", 3);
    const Matrix root = unitary_of(definitions + "pow(0.5) @ " + gate + ";", 3);
    CHECK(apart(root * root, whole) < 1e-9);
    // The eigenvalues of a principal root lie in the right half-plane.
    const Eigen::ComplexEigenSolver<Matrix> solver(root);
    for (Eigen::Index k = 0; k < 8; ++k) CHECK(solver.eigenvalues()(k).real() > -1e-7);
  }
}

TEST_CASE("pow: fractions of symbolic angles stay symbolic where their branch can be told") {
  const Circuit circuit = circuit_of(heading + "input float t; qubit q;\npow(0.5) @ p(t) q;");
  REQUIRE(circuit.body().size() == 1);
  CHECK_FALSE(circuit.body()[0].has_known_angles());
  CHECK(
      errors_of(
          heading +
          "input float t; qubit[2] q; gate f(a) x1, x2 { h x1; cp(a) x1, x2; }\npow(0.5) @ f(t) q[0], q[1];")
          .size() == 1);
}

TEST_CASE("synthesis of small unitaries is exact, global phase included") {
  std::mt19937_64 random(3);
  std::normal_distribution<double> normal;
  for (int qubits = 0; qubits <= 4; ++qubits) {
    for (int trial = 0; trial < 20; ++trial) {
      const Eigen::Index dimension = Eigen::Index(1) << qubits;
      Matrix noise(dimension, dimension);
      for (Eigen::Index k = 0; k < noise.size(); ++k) noise(k) = Complex(normal(random), normal(random));
      Matrix unitary = Eigen::HouseholderQR<Matrix>(noise).householderQ();
      if (trial == 0) unitary = Matrix::Identity(dimension, dimension);
      if (trial == 1) unitary = Matrix::Identity(dimension, dimension).rowwise().reverse();
      if (trial == 2 && qubits > 0) {
        // Blocks with equal and with vanishing sines.
        unitary.setZero();
        for (Eigen::Index k = 0; k < dimension; ++k)
          unitary((k + dimension / 2) % dimension, k) = std::polar(1.0, 0.1 * static_cast<double>(k));
      }
      std::vector<std::uint32_t> wires;
      for (int k = 0; k < qubits; ++k) wires.push_back(static_cast<std::uint32_t>(k));
      CHECK(apart(matrix_of(synthesized(unitary, wires), wires), unitary) < 1e-10);
    }
  }
}

TEST_CASE("broadcasting") {
  const auto kinds = [](const std::string& body) {
    std::string text;
    const Circuit circuit =
        circuit_of(heading + "qubit[3] q; qubit[3] r; qubit s1; qubit[1] w; qubit[0] none;\n" + body);
    for (const Operation& op : circuit.body()) {
      for (const std::uint32_t wire : circuit.operands(op)) text += std::to_string(wire);
      text += " ";
    }
    return text;
  };
  CHECK(kinds("h q;") == "0 1 2 ");
  CHECK(kinds("cx q, r;") == "03 14 25 ");
  CHECK(kinds("cx q, s1;") == "06 16 26 ");
  CHECK(kinds("cx q[{2, 0}], r[0:1];") == "23 04 ");
  CHECK(kinds("h none;") == "");
  const auto errors = [](const std::string& body) {
    return errors_of(heading + "qubit[3] q; qubit[2] r; qubit[1] w;\n" + body).size();
  };
  CHECK(errors("cx q, r;") == 1);
  CHECK(errors("cx w, q;") == 1);  // a register of size 1 is a register
  CHECK(errors("cx q, q[0];") == 1);
}

TEST_CASE("symbolic angles: affine in the inputs, anything else one derived input") {
  const Circuit circuit =
      circuit_of(heading +
                 "input float a; input float b; qubit q;\n"
                 "rz(2*a - b/4 + pi) q; rz(a*b) q; rz(a*b) q; rz(sin(a)) q; rz(a + a*b) q;");
  REQUIRE(circuit.body().size() == 5);
  CHECK(circuit.body()[0].value[0] == doctest::Approx(pi));
  const auto terms = circuit.forms.terms(circuit.body()[0].form[0]);
  REQUIRE(terms.size() == 2);
  CHECK(terms[0].coefficient == 2);
  CHECK(terms[1].coefficient == -0.25);
  CHECK(circuit.inputs.size() == 5);
  CHECK(circuit.body()[1].form[0] == circuit.body()[2].form[0]);
  CHECK(printed(circuit.inputs[2].expression, circuit) == "a * b");
  CHECK(printed(circuit.inputs[3].expression, circuit) == "sin(a)");
  CHECK(printed(circuit.inputs[4].expression, circuit) == "a + a * b");
}

TEST_CASE("a definition of r or xx in standard gates is that operation") {
  const Circuit circuit =
      circuit_of(heading +
                 "gate r(t, f) q { rz(-f) q; rx(t) q; rz(f) q; }\n"
                 "gate xx(t, f, g) a, b { rz(-f) a; rz(-g) b; h a; h b; cx a, b; rz(t) b; cx a, b; h a; h b; "
                 "rz(f) a; rz(g) b; }\n"
                 "qubit[2] q; r(0.1, 0.2) q[0]; xx(0.3, 0.4, 0.5) q[0], q[1];");
  REQUIRE(circuit.body().size() == 2);
  CHECK(circuit.body()[0].is_native());
  CHECK(circuit.body()[1].is_native());
  CHECK(circuit.body()[1].value[2] == 0.5);
  const Circuit other =
      circuit_of(heading + "gate r(t, f) q { rz(f) q; rx(t) q; rz(-f) q; } qubit q; r(0.1, 0.2) q;");
  CHECK(other.body().size() == 3);
}
