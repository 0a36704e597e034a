// OpenQASM 2: its own meanings of the same words, and files as they are found in circulation.
#include <doctest/doctest.h>
#include <fmt/format.h>

#include <cmath>

#include "language/meaning.h"
#include "support/simulator.h"

using namespace isinglass;
using meaning::circuit_of;
using meaning::errors_of;
using meaning::warnings_of;
using support::Matrix;

namespace {

const std::string heading = "OPENQASM 2.0;\ninclude \"qelib1.inc\";\n";

Matrix unitary_of(const std::string& body, int qubits) {
  return support::unitary(circuit_of(heading + fmt::format("qreg q[{}];\n", qubits) + body));
}

Matrix diagonal(std::vector<support::Complex> entries) {
  Matrix m =
      Matrix::Zero(static_cast<Eigen::Index>(entries.size()), static_cast<Eigen::Index>(entries.size()));
  for (std::size_t k = 0; k < entries.size(); ++k)
    m(static_cast<Eigen::Index>(k), static_cast<Eigen::Index>(k)) = entries[k];
  return m;
}

double apart(const Matrix& a, const Matrix& b) {
  return (a - b).cwiseAbs().maxCoeff();
}

}  // namespace

TEST_CASE("OpenQASM 2: angles divide as real numbers, ^ is a power, ln and friends") {
  const Circuit circuit = circuit_of(
      heading +
      "qreg q[1]; rz(1/2) q[0]; rz(2^3) q[0]; rz(ln(exp(2))) q[0]; rz(-pi/2) q[0]; rz(3/2*2) q[0];");
  CHECK(circuit.body()[0].value[0] == 0.5);
  CHECK(circuit.body()[1].value[0] == 8);
  CHECK(circuit.body()[2].value[0] == doctest::Approx(2));
  CHECK(circuit.body()[3].value[0] == -pi / 2);
  CHECK(circuit.body()[4].value[0] == 3);
}

TEST_CASE("OpenQASM 2: U is Rz Ry Rz, CX is built in") {
  const Matrix expected = support::rotation(0.4, support::pauli_z()) *
                          support::rotation(0.7, support::pauli_y()) *
                          support::rotation(0.9, support::pauli_z());
  const Circuit circuit = circuit_of("OPENQASM 2.0;\nqreg q[2]; U(0.7, 0.4, 0.9) q[0];");
  CHECK(apart(support::unitary(circuit).topLeftCorner(2, 2), expected) < 1e-15);
  CHECK(circuit_of("OPENQASM 2.0;\nqreg q[2]; CX q[0], q[1];").body()[0].kind == Kind::x);
  CHECK(apart(unitary_of("cu3(0.7, 0.4, 0.9) q[0], q[1];", 2), support::controlled(expected)) < 1e-15);
}

TEST_CASE("OpenQASM 2: gates in circulation beyond the paper's") {
  using support::controlled;
  const auto e = [](double a) { return std::polar(1.0, a); };
  CHECK(apart(unitary_of("rzz(0.7) q[0], q[1];", 2), diagonal({1, e(0.7), e(0.7), 1})) < 1e-15);
  CHECK(apart(unitary_of("cu1(0.7) q[0], q[1];", 2), diagonal({1, 1, 1, e(0.7)})) < 1e-15);
  CHECK(apart(unitary_of("c3x q[0], q[1], q[2], q[3];", 4), controlled(support::pauli_x(), 3)) < 1e-15);
  CHECK(apart(unitary_of("c4x q[0], q[1], q[2], q[3], q[4];", 5), controlled(support::pauli_x(), 4)) < 1e-15);
  const Matrix sx = unitary_of("sx q[0];", 1);
  CHECK(apart(sx * sx, support::pauli_x()) < 1e-15);
  CHECK(apart(unitary_of("c3sqrtx q[0], q[1], q[2], q[3];", 4), controlled(sx, 3)) < 1e-15);
  CHECK(apart(unitary_of("sxdg q[0]; sx q[0];", 1), support::identity()) < 1e-15);
  // Relative-phase Toffolis act as Toffolis on basis states.
  for (const auto& [name, count] :
       {std::pair<std::string, int>{"rccx q[0], q[1], q[2]", 3}, {"rc3x q[0], q[1], q[2], q[3]", 4}}) {
    const Matrix actual = unitary_of(name + ";", count);
    CHECK(apart(actual.cwiseAbs().cast<support::Complex>(), controlled(support::pauli_x(), count - 1)) <
          1e-15);
  }
  CHECK(apart(unitary_of("u0(1) q[0]; id q[0];", 1), support::identity()) == 0);
  CHECK(apart(unitary_of("rxx(0.7) q[0], q[1];", 2),
              std::cos(0.35) * support::identity(2) -
                  support::Complex(0, std::sin(0.35)) *
                      support::product(support::pauli_x(), support::pauli_x())) < 1e-15);
}

TEST_CASE("OpenQASM 2: a definition that the file brings wins, before or after the include") {
  CHECK(apart(unitary_of("gate rzz(a) x1, x2 { cx x1, x2; u1(a) x2; cx x1, x2; } rzz(0.7) q[0], q[1];", 2),
              diagonal({1, std::polar(1.0, 0.7), std::polar(1.0, 0.7), 1})) < 1e-15);
  CHECK(apart(unitary_of("gate x a { U(0, 0, pi/2) a; } x q[0];", 1),
              diagonal({std::polar(1.0, -pi / 4), std::polar(1.0, pi / 4)})) < 1e-15);
  const Circuit circuit =
      circuit_of("OPENQASM 2.0;\ngate h a { U(0, 0, 1) a; }\ninclude \"qelib1.inc\";\nqreg q[1]; h q[0];");
  CHECK(circuit.body()[0].kind == Kind::u);
}

TEST_CASE("OpenQASM 2: if compares the whole register, bit 0 lowest, with numbers of any size") {
  CHECK(meaning::deviation(
            heading + "qreg q[2]; creg c[2]; h q[0]; measure q[0] -> c[1]; if (c == 2) x q[1];") < 1e-12);
  const std::string huge(400, '9');
  const Circuit circuit =
      circuit_of(heading + "qreg q[2]; creg c[2]; h q; measure q -> c; if (c == " + huge + ") x q[1];");
  CHECK(circuit.branches.empty());  // it never holds
  // A register starts as 0: nothing runs before the first measurement.
  const Circuit known = circuit_of(heading + "qreg q[1]; creg c[2]; if (c == 0) x q[0]; if (c == 1) z q[0];");
  REQUIRE(known.body().size() == 1);
  CHECK(known.body()[0].kind == Kind::x);
  CHECK(warnings_of(heading + "qreg q[1]; creg c[2]; if (c == 0) x q[0];").empty());
}

TEST_CASE("OpenQASM 2: a missing version line is decided by what is used") {
  const auto version = [](const std::string& text) { return read("f.qasm", text).version; };
  CHECK(version("include \"qelib1.inc\"; qreg q[1]; rz(1/2) q[0];") == 20);
  CHECK(version("qreg q[1]; creg c[1];") == 20);
  CHECK(version("gate g a { U(0, 0, 1/2) a; } qreg q[1]; g q[0];") == 20);
  CHECK(version("include \"stdgates.inc\"; qubit q;") == 31);
  CHECK(version("qubit q;") == 31);
  CHECK(version("OPENQASM 3; qreg q[1];") == 30);
  CHECK(version("OPENQASM 3.2; qubit q;") == 32);
  CHECK(warnings_of("qreg q[1];") ==
        std::vector<std::string>{"1:1: warning: the version line is missing; read as OpenQASM 2.0"});
  const Circuit circuit = circuit_of("gate g a { U(1/2, 0, 0) a; } qreg q[1]; g q[0];");
  CHECK(circuit.body()[0].value[0] == 0.5);
  CHECK(errors_of("OPENQASM 4.0; qubit q;").size() == 1);
}

TEST_CASE("OpenQASM 2: malformed files end in an error at the right place") {
  const auto first = [](const std::string& body) {
    const auto errors = errors_of(heading + body);
    return errors.empty() ? std::string("none") : errors[0];
  };
  CHECK(first("qreg q[2]; cx q[0], r[0];") == "3:21: error: qubit `r` is not declared");
  CHECK(first("qreg q[2]; cx q[1], q[1];") == "3:21: error: qubit `q[1]` is given twice");
  CHECK(first("qreg q[2]; foo q[1];") == "3:12: error: gate `foo` is not declared");
  CHECK(first("qreg q[2]; cx q[1];") == "3:12: error: `cx` takes 2 qubits, not 1");
  CHECK(first("qreg q[2]; h q[2];") == "3:16: error: index 2 is out of range: the register has 2 elements");
  CHECK(first("qreg q[2]; rz q[0];") == "3:12: error: `rz` takes 1 angle, not 0");
  CHECK(first("qreg q[2]; creg c[1]; measure q -> c;") == "3:36: error: 2 qubits are measured into 1 bits");
  CHECK(first("opaque o a; qreg q[1]; o q[0];") == "3:24: error: `o` is opaque: nothing says what it does");
  CHECK(first("qreg q[2]; qreg q[3];") == "3:17: error: `q` is declared already");
}

TEST_CASE("version 2: a register has a size") {
  CHECK(errors_of("OPENQASM 2.0;\nqreg q;") ==
        std::vector<std::string>{"2:6: error: the register `q` needs a size"});
  CHECK(errors_of("OPENQASM 2.0;\ncreg c;").size() == 1);
}
