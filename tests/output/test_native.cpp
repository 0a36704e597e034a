// The native program: its gate definitions mean the matrices of the machine, its numbers read back exactly,
// its control flow is nested OpenQASM 3.
#include <doctest/doctest.h>

#include <map>
#include <regex>
#include <sstream>

#include "output/annotations.h"
#include "output/native.h"
#include "output/sample.h"
#include "support/random_circuits.h"
#include "support/simulator.h"

using namespace isinglass;
using support::Random;

namespace {

/// Reads `gate NAME(parameters) wires { ... }` from the text and multiplies it out for the given values;
/// knows h, cx, rx, rz on named wires and arguments that are a parameter or its negative.
support::Matrix defined(const std::string& text, const std::string& gate,
                        const std::map<std::string, double>& values, const std::vector<std::string>& wires) {
  const std::size_t begin = text.find("gate " + gate + "(");
  REQUIRE(begin != std::string::npos);
  std::istringstream body(
      text.substr(text.find('{', begin) + 1, text.find('}', begin) - text.find('{', begin) - 1));
  const auto size = Eigen::Index{1} << wires.size();
  support::Matrix whole = support::Matrix::Identity(size, size);
  static const std::regex form(R"(\s*(\w+)(?:\((-?)(\w+)\))?\s+(\w+)(?:, (\w+))?;)");
  int steps = 0;
  for (std::string line; std::getline(body, line);) {
    std::smatch part;
    if (line.find_first_not_of(' ') == std::string::npos) continue;
    REQUIRE(std::regex_match(line, part, form));
    const double angle = part[3].matched ? (part[2].str() == "-" ? -1 : 1) * values.at(part[3]) : 0;
    support::Matrix step;
    if (part[1] == "rz") step = support::rotation(angle, support::pauli_z());
    if (part[1] == "rx") step = support::rotation(angle, support::pauli_x());
    if (part[1] == "h") step = (support::pauli_x() + support::pauli_z()) / std::sqrt(2.0);
    if (part[1] == "cx") step = support::controlled(support::pauli_x());
    REQUIRE(step.size() > 0);
    std::vector<std::uint32_t> operands;
    for (const int k : {4, 5}) {
      for (std::uint32_t w = 0; w < wires.size(); ++w) {
        if (part[k].matched && part[k] == wires[w]) operands.push_back(w);
      }
    }
    for (Eigen::Index column = 0; column < size; ++column) {
      support::State state(static_cast<unsigned>(wires.size()), 0);
      for (Eigen::Index i = 0; i < size; ++i) state.amplitudes[i] = whole(i, column);
      state.apply(step, operands);
      for (Eigen::Index i = 0; i < size; ++i) whole(i, column) = state.amplitudes[i];
    }
    ++steps;
  }
  CHECK(steps > 2);
  return whole;
}

}  // namespace

TEST_CASE("the definitions of r and xx are the machine's matrices, global phase included") {
  const Sample sample;
  const std::string text = native_program(sample.placed, {"a.qasm", "b"});
  Random random(2);
  for (int i = 0; i < 50; ++i) {
    const double t = random.real(-7, 7);
    const double a = random.real(-4, 4);
    const double b = random.real(-4, 4);
    CHECK(
        (defined(text, "r", {{"theta", t}, {"phi", a}}, {"a"}) - support::gate_matrix(Kind::r, t, a)).norm() <
        1e-12);
    CHECK((defined(text, "xx", {{"theta", t}, {"phi_a", a}, {"phi_b", b}}, {"a", "b"}) -
           support::gate_matrix(Kind::xx, t, a, b))
              .norm() < 1e-12);
  }
}

TEST_CASE("every number reads back to the same number") {
  Random random(3);
  Circuit c = support::random_circuit(random, {5, 300, 0, support::Family::native});
  c.body()[0].value[0] = 1e-17;
  c.body()[1].value[0] = 0.1 + 0.2;
  const Placed placed = place(c, typical(5));
  std::istringstream text(native_program(placed, {"a.qasm", "b"}));
  static const std::regex form(R"((r|xx|rz)\(([^)]*)\) ion\[(\d+)\](?:, ion\[(\d+)\])?;)");
  Block read;
  for (std::string line; std::getline(text, line);) {
    std::smatch part;
    if (!std::regex_match(line, part, form)) continue;
    const Kind kind = part[1] == "r" ? Kind::r : part[1] == "xx" ? Kind::xx : Kind::rz;
    std::vector<std::uint32_t> ions = {static_cast<std::uint32_t>(std::stoul(part[3]))};
    if (part[4].matched) ions.push_back(static_cast<std::uint32_t>(std::stoul(part[4])));
    std::vector<Angle> angles;
    std::istringstream list(part[2]);
    for (std::string word; std::getline(list, word, ',');) angles.push_back({std::stod(word), 0});
    read.push_back(c.make(kind, ions, angles));
  }
  const Block& body = placed.circuit.body();
  REQUIRE(read.size() == body.size());
  for (std::size_t i = 0; i < read.size(); ++i) {
    CHECK(read[i].kind == body[i].kind);
    for (int k = 0; k < 3; ++k) CHECK(read[i].value[k] == body[i].value[k]);
    for (int k = 0; k < 2; ++k) CHECK(read[i].operand[k] == body[i].operand[k]);
  }
}

TEST_CASE("the whole text of a program with everything in it") {
  const Sample sample;
  const std::string text = native_program(sample.placed, {"buoy\n9.qasm", "typical-4"});
  CHECK(text.starts_with("OPENQASM 3.0;\n// buoy 9.qasm compiled for typical-4 by isinglass "));
  const std::string rest = text.substr(text.find("pragma"));
  CHECK(rest == R"(pragma isinglass start q[0] ion[0]
pragma isinglass start q[1] ion[1]
pragma isinglass start anc ion[2]
pragma isinglass end q[0] ion[0]
pragma isinglass end q[1] ion[1]
pragma isinglass end anc ion[2]
pragma isinglass name ion ion_2

input float t;
bit[2] c;
bit ion_2;
qubit[4] ion;

r(0.3333333333333333, 0.1) ion[0];
xx(0.7853981633974483, 0, 1.5707963267948966) ion[0], ion[1];
c[0] = measure ion[0];
c[1] = c[0];
delay[12.5us] ion[1];
barrier ion[0], ion[1], ion[2];
if (c[0] == 1) {
  r(3.141592653589793, 0.25) ion[2];
  xx(0.5, 0.1, 0.2) ion[1], ion[2];
} else {
  r(1.5, -0.25) ion[1];
}
r(0.5 + 2.5*t - (sin(t)), 0.1) ion[2];
ion_2 = measure ion[1];
reset ion[1];
rz(0.75) ion[2];
)");
}

TEST_CASE("loops and switches") {
  Circuit c = sample_circuit();
  Variable counter;
  counter.name = "i";
  counter.type = "uint[8]";
  c.variables.push_back(counter);
  Expression range;
  range.kind = Expression::Kind::range;
  range.arguments = {literal("0"), literal("1"), literal("4")};
  c.branches[0] = {Branch::Kind::for_loop, range, 2, {{{}, 1}}};
  ClassicalStatement leave;
  leave.kind = ClassicalStatement::Kind::leave_loop;
  c.statements.push_back(leave);
  Operation statement;
  statement.kind = Kind::classical;
  statement.payload = 1;
  c.blocks[1].push_back(statement);
  std::string text = native_program(place(c, typical(4)), {"a", "b"});
  CHECK(text.find("for uint[8] i in [0:1:4] {\n  r(3.14") != std::string::npos);
  CHECK(text.find("  break;\n}\n") != std::string::npos);
  CHECK(text.find("\nuint[8] i;") == std::string::npos);  // the loop declares it

  c = sample_circuit();
  Expression selector = bit_of(0, "0");
  c.branches[0] = {Branch::Kind::switch_case, selector, 0, {{{literal("1"), literal("2")}, 1}, {{}, 2}}};
  text = native_program(place(c, typical(4)), {"a", "b"});
  CHECK(text.starts_with("OPENQASM 3.1;"));
  CHECK(text.find("switch (c[0]) {\n  case 1, 2 {\n    r(3.14") != std::string::npos);
  CHECK(text.find("  }\n  default {\n    r(1.5, -0.25) ion[1];\n  }\n}\n") != std::string::npos);
}

TEST_CASE("what is not native is never written") {
  Circuit c;
  add_register(c, "q", 2);
  c.body().push_back(c.make(Kind::h, {0}));
  CHECK_THROWS(native_program(place(c, typical(2)), {"a", "b"}));
}

TEST_CASE("annotations: before the first operation of their kind, else the first at all, else lost") {
  Circuit c;
  add_register(c, "q", 2);
  add_bits(c, "c", 1);
  c.body().push_back(
      c.make(Kind::r, {0}, {{0.5}, {0.25}}, c.origins.merged(Origins::line(3), Origins::line(7))));
  c.body().push_back(c.make(Kind::r, {1}, {{0.5}, {0.25}}, Origins::line(3)));
  Operation reading = c.make(Kind::measure, {0}, {}, Origins::line(7));
  reading.payload = 0;
  c.body().push_back(reading);
  const std::vector<Annotation> annotations = {{"@r", 2, 3, 3},
                                               {"@m", 6, 7, 7, "", Kind::measure},
                                               {"@reset", 6, 7, 7, "", Kind::reset},
                                               {"@lost", 8, 9, 12},
                                               {"@c\nx", 1, 1, 1, "c"}};
  const std::string text = native_program(place(c, typical(2)), {"a", "b", annotations});
  CHECK(text.find("@r\n@reset\nr(0.5, 0.25) ion[0];\nr(0.5, 0.25) ion[1];\n@m\nc[0] = measure") !=
        std::string::npos);
  CHECK(text.find("@c x\nbit[1] c;\n") != std::string::npos);
  CHECK(text.find("@lost") == std::string::npos);
  const auto lost = places_of(annotations, c).lost;
  REQUIRE(lost.size() == 1);
  CHECK(lost[0].text == "@lost");
}
