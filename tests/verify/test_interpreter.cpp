// The tests' own interpreter of programs, checked against what the texts are known to mean.
#include "support/interpreter.h"

#include <doctest/doctest.h>

#include "support/random_circuits.h"

namespace isinglass::support {
namespace {

const std::string head = "OPENQASM 3.1;\ninclude \"stdgates.inc\";\n";

std::vector<Path> run_from_zero(const std::string& text) {
  const Program program(text);
  std::vector<std::size_t> start;
  for (std::size_t q = 0; q < program.qubits().size(); ++q) start.push_back(q);
  return run(program, start, {});
}

std::map<std::string, double> distribution(const std::string& text) {
  std::map<std::string, double> result;
  for (const Path& path : run_from_zero(text)) result[path.bits] += path.state.norm2();
  return result;
}

TEST_CASE("interpreter: random texts mean what their generator says") {
  Random random(31);
  for (int n = 0; n < 60; ++n) {
    const Source source = random_source(random, random.between(2, 4), 12);
    const auto paths = run_from_zero(source.text);
    REQUIRE(paths.size() == 1);
    const Matrix wanted = unitary(source).col(0);
    const Matrix got = Eigen::Map<const Eigen::VectorXcd>(paths[0].state.amplitudes.data(), wanted.rows());
    CHECK(distance(wanted, got) < 1e-9);
  }
}

TEST_CASE("interpreter: classical code") {
  CHECK(distribution(head +
                     "bit[4] c = \"0110\"; int[8] n = 3; n += 2 * 4; uint[3] m = 7; m += 2; bool b = n > 10;"
                     "if (b && c[1] == 1) { c[0] = 1; } else { c[3] = 1; }") ==
        std::map<std::string, double>{{"b=1;c=0111;m=001;n=00001011;", 1.0}});
  CHECK(distribution(head +
                     "int n = 0; for int k in [1:2:7] { if (k == 5) { break; } n += k; } uint[2] w = 0;"
                     "while (true) { w += 1; if (w == 3) { break; } continue; }"
                     "switch (n) { case 1, 4 { w = 0; } default { w = 1; } }")
            .begin()
            ->first.substr(67) == "w=00;");
  CHECK(
      distribution(
          head + "angle[4] a = pi / 2; bit[2] d = \"10\"; bit e = d[1]; d[0:1] = \"01\"; end; d = \"11\";") ==
      std::map<std::string, double>{{"a=0100;d=01;e=1;", 1.0}});
}

TEST_CASE("interpreter: outcomes and their probabilities") {
  const auto bell = distribution(head + "qubit[2] q; bit[2] c; h q[0]; cx q[0], q[1]; c = measure q;");
  CHECK(bell.size() == 2);
  CHECK(bell.at("c=00;") == doctest::Approx(0.5));
  CHECK(bell.at("c=11;") == doctest::Approx(0.5));
  // Until a coin falls on 1: the number of throws is geometric.
  const auto throws = distribution(head +
                                   "qubit q; bit c; uint[6] n = 0; while (!c) { h q; c = measure q; n += 1; "
                                   "if (c) { x q; } reset q; }");
  CHECK(throws.at("c=1;n=000001;") == doctest::Approx(0.5));
  CHECK(throws.at("c=1;n=000011;") == doctest::Approx(0.125));
}

const std::string source = head +
                           "qubit[2] q; bit c; ry(0.7) q[0]; cx q[0], q[1]; c = measure q[0];"
                           "if (c) { rz(0.4) q[1]; x q[1]; rx(0.2) q[1]; }";

/// The same by hand on three ions, with the definitions that compiled programs carry.
std::string compiled(const std::string& angle, const std::string& end, const std::string& bit) {
  return head +
         "gate r(theta, phi) a { rz(-phi) a; rx(theta) a; rz(phi) a; }\n"
         "gate xx(theta, f, g) a, b { rz(-f) a; rz(-g) b; h a; h b; cx a, b; rz(theta) b; cx a, b; h a; h b; "
         "rz(f) a; "
         "rz(g) b; }\n"
         "pragma isinglass start q[0] ion[2]\npragma isinglass start q[1] ion[0]\n"
         "pragma isinglass end q[0] ion[2]\npragma isinglass end q[1] ion[" +
         end +
         "]\n"
         "pragma isinglass name c c_\n"
         "qubit[3] ion; bit c_;\n"
         "r(0.7, pi/2) ion[2];\n"
         // cx = rz(pi/2) on the control, rx(pi/2) on the target, exp(i pi/4 ZX); h as rz(pi), ry(pi/2)
         "rz(pi) ion[2]; r(pi/2, pi/2) ion[2]; xx(-pi/2, 0, 0) ion[2], ion[0]; rz(pi) ion[2]; "
         "r(pi/2, pi/2) ion[2]; rz(pi/2) ion[2]; r(pi/2, 0) ion[0];\n"
         "c_ = measure ion[2];\n"
         "if (c_ == " +
         bit + ") { rz(0.4) ion[0]; r(pi, 0) ion[0]; r(" + angle + ", 0) ion[0]; }\n";
}

TEST_CASE("interpreter: a program compiled by hand is its source, and faults in it are seen") {
  CHECK(difference(source, compiled("0.2", "0", "1")) < 1e-12);
  RunOptions any;
  any.with_references = true;
  CHECK(difference(source, compiled("0.2", "0", "1"), any) < 1e-12);
  CHECK(difference(source, compiled("0.20001", "0", "1")) > 1e-7);
  CHECK(difference(source, compiled("0.2", "1", "1")) > 1e-3);
  CHECK(difference(source, compiled("0.2", "0", "0")) > 1e-3);
  CHECK(difference(source, compiled("0.3", "0", "1"), {}, true) < 1e-12);  // the bits alone do not tell
}

TEST_CASE("interpreter: inputs and parameters") {
  const std::string text =
      head + "input float t; gate g(a) x { rx(2*a) x; } qubit q; bit c; g(t/2) q; c = measure q;";
  RunOptions options;
  options.inputs["t"] = 1.1;
  const Program program(text);
  double one = 0;
  for (const Path& path : run(program, {0}, options)) {
    if (path.bits.find("c=1") != std::string::npos) one += path.state.norm2();
  }
  CHECK(one == doctest::Approx(std::pow(std::sin(0.55), 2)));
}

}  // namespace
}  // namespace isinglass::support
