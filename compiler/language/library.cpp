// The standard library of gates as a table: stdgates.inc of OpenQASM 3, qelib1.inc of OpenQASM 2 with the
// further gates that files in circulation expect of it, and the gates built into either version.
//
// A row names a gate, its numbers of angles and operands, and what it does in terms of circuit kinds. In a
// row, `a, b, c, d` are the gate's angles, the wires are its operands, controls first.
#include <map>

#include "language/gate.h"

namespace isinglass {

namespace {

/// A linear combination of a gate's angles plus a constant.
struct Linear {
  double constant = 0;
  std::array<double, 4> coefficients{};

  friend Linear operator+(Linear x, const Linear& y) {
    x.constant += y.constant;
    for (std::size_t i = 0; i < 4; ++i) x.coefficients[i] += y.coefficients[i];
    return x;
  }
  friend Linear operator*(double factor, Linear x) {
    x.constant *= factor;
    for (double& coefficient : x.coefficients) coefficient *= factor;
    return x;
  }
  friend Linear operator-(const Linear& x, const Linear& y) { return x + -1.0 * y; }
};

Linear number(double value) {
  return {value, {}};
}

constexpr Linear a{0, {1, 0, 0, 0}};
constexpr Linear b{0, {0, 1, 0, 0}};
constexpr Linear c{0, {0, 0, 1, 0}};
constexpr Linear d{0, {0, 0, 0, 1}};

struct Line {
  Kind kind;
  std::vector<std::uint32_t> wires;
  std::vector<Linear> angles = {};
};

struct Row {
  std::uint32_t parameters;
  std::uint32_t operands;
  std::vector<Line> lines;
};

GateTemplate made(const Row& row) {
  GateTemplate gate;
  gate.parameters = row.parameters;
  gate.operands = row.operands;
  for (const Line& line : row.lines) {
    Act act;
    act.kind = line.kind;
    act.wires = line.wires;
    for (std::size_t i = 0; i < line.angles.size(); ++i) {
      Angle angle{line.angles[i].constant, 0};
      for (std::uint32_t p = 0; p < 4; ++p) {
        const double coefficient = line.angles[i].coefficients[p];
        if (coefficient == 0) continue;
        angle.form = gate.forms.sum(angle.form, gate.forms.scaled(gate.forms.of_input(p), coefficient));
      }
      act.angles[i] = angle;
    }
    gate.acts.push_back(std::move(act));
  }
  return gate;
}

/// u3 of both libraries is U without its phase: e^{-i(a+b+c)/2} U(a, b, c).
Linear u3_phase() {
  return -0.5 * (a + b + c);
}

const std::map<std::string, GateTemplate, std::less<>>& table() {
  const Linear zero = number(0);
  const Linear half_pi = number(pi / 2);
  const auto quarter = [](double sign) { return std::vector<Linear>{number(sign * pi / 4)}; };
  const std::vector<Linear> sx = {half_pi, number(-pi / 2), half_pi};
  const std::vector<Linear> sx_inverse = {number(-pi / 2), number(-pi / 2), half_pi};
  // The Toffoli gates up to a relative phase, h and t gates around CNOTs: Maslov, "Advantages of using
  // relative-phase Toffoli gates with an application to multiple control Toffoli optimization", PRA 93,
  // 022311.
  const std::vector<Line> rccx = {
      {Kind::h, {2}},    {Kind::p, {2}, quarter(1)}, {Kind::x, {1, 2}}, {Kind::p, {2}, quarter(-1)},
      {Kind::x, {0, 2}}, {Kind::p, {2}, quarter(1)}, {Kind::x, {1, 2}}, {Kind::p, {2}, quarter(-1)},
      {Kind::h, {2}}};
  const std::vector<Line> rc3x = {{Kind::h, {3}},
                                  {Kind::p, {3}, quarter(1)},
                                  {Kind::x, {2, 3}},
                                  {Kind::p, {3}, quarter(-1)},
                                  {Kind::h, {3}},
                                  {Kind::x, {0, 3}},
                                  {Kind::p, {3}, quarter(1)},
                                  {Kind::x, {1, 3}},
                                  {Kind::p, {3}, quarter(-1)},
                                  {Kind::x, {0, 3}},
                                  {Kind::p, {3}, quarter(1)},
                                  {Kind::x, {1, 3}},
                                  {Kind::p, {3}, quarter(-1)},
                                  {Kind::h, {3}},
                                  {Kind::p, {3}, quarter(1)},
                                  {Kind::x, {2, 3}},
                                  {Kind::p, {3}, quarter(-1)},
                                  {Kind::h, {3}}};
  static const auto gates = [&] {
    const std::map<std::string, Row> rows = {
        {"U", {3, 1, {{Kind::u, {0}, {a, b, c}}}}},
        {"U of 2", {3, 1, {{Kind::phase, {}, {u3_phase()}}, {Kind::u, {0}, {a, b, c}}}}},
        {"p", {1, 1, {{Kind::p, {0}, {a}}}}},
        {"x", {0, 1, {{Kind::x, {0}}}}},
        {"y", {0, 1, {{Kind::y, {0}}}}},
        {"z", {0, 1, {{Kind::z, {0}}}}},
        {"h", {0, 1, {{Kind::h, {0}}}}},
        {"s", {0, 1, {{Kind::p, {0}, {half_pi}}}}},
        {"sdg", {0, 1, {{Kind::p, {0}, {number(-pi / 2)}}}}},
        {"t", {0, 1, {{Kind::p, {0}, quarter(1)}}}},
        {"tdg", {0, 1, {{Kind::p, {0}, quarter(-1)}}}},
        {"sx", {0, 1, {{Kind::u, {0}, sx}}}},
        {"sxdg", {0, 1, {{Kind::u, {0}, sx_inverse}}}},
        {"rx", {1, 1, {{Kind::r, {0}, {a, zero}}}}},
        {"ry", {1, 1, {{Kind::r, {0}, {a, half_pi}}}}},
        {"rz", {1, 1, {{Kind::rz, {0}, {a}}}}},
        {"cx", {0, 2, {{Kind::x, {0, 1}}}}},
        {"cy", {0, 2, {{Kind::y, {0, 1}}}}},
        {"cz", {0, 2, {{Kind::z, {0, 1}}}}},
        {"ch", {0, 2, {{Kind::h, {0, 1}}}}},
        {"cp", {1, 2, {{Kind::p, {0, 1}, {a}}}}},
        {"crx", {1, 2, {{Kind::r, {0, 1}, {a, zero}}}}},
        {"cry", {1, 2, {{Kind::r, {0, 1}, {a, half_pi}}}}},
        {"crz", {1, 2, {{Kind::rz, {0, 1}, {a}}}}},
        {"csx", {0, 2, {{Kind::u, {0, 1}, sx}}}},
        {"swap", {0, 2, {{Kind::swap, {0, 1}}}}},
        {"ccx", {0, 3, {{Kind::x, {0, 1, 2}}}}},
        {"ccz", {0, 3, {{Kind::z, {0, 1, 2}}}}},
        {"cswap", {0, 3, {{Kind::swap, {0, 1, 2}}}}},
        // The phase of the library file; the standard's page has another.
        {"cu", {4, 2, {{Kind::p, {0}, {d - 0.5 * a}}, {Kind::u, {0, 1}, {a, b, c}}}}},
        {"id", {0, 1, {}}},
        {"u0", {1, 1, {}}},
        {"u2", {2, 1, {{Kind::phase, {}, {-0.5 * (half_pi + a + b)}}, {Kind::u, {0}, {half_pi, a, b}}}}},
        {"u3", {3, 1, {{Kind::phase, {}, {u3_phase()}}, {Kind::u, {0}, {a, b, c}}}}},
        {"cu3", {3, 2, {{Kind::p, {0}, {u3_phase()}}, {Kind::u, {0, 1}, {a, b, c}}}}},
        {"rxx", {1, 2, {{Kind::xx, {0, 1}, {a, zero, zero}}}}},
        {"ryy", {1, 2, {{Kind::xx, {0, 1}, {a, half_pi, half_pi}}}}},
        {"rzz", {1, 2, {{Kind::phase, {}, {0.5 * a}}, {Kind::zz, {0, 1}, {a}}}}},
        {"rccx", {0, 3, rccx}},
        {"rc3x", {0, 4, rc3x}},
        {"c3x", {0, 4, {{Kind::x, {0, 1, 2, 3}}}}},
        {"c3sqrtx", {0, 4, {{Kind::u, {0, 1, 2, 3}, sx}}}},
        {"c4x", {0, 5, {{Kind::x, {0, 1, 2, 3, 4}}}}},
    };
    std::map<std::string, GateTemplate, std::less<>> result;
    for (const auto& [name, row] : rows) result.emplace(name, made(row));
    return result;
  }();
  return gates;
}

/// A name of a library and the row that it means, where that is not its own.
struct Entry {
  std::string_view name;
  std::string_view row = {};
};

std::vector<LibraryGate> looked_up(std::initializer_list<Entry> entries) {
  std::vector<LibraryGate> gates;
  for (const Entry& entry : entries) {
    gates.push_back({entry.name, &table().find(entry.row.empty() ? entry.name : entry.row)->second});
  }
  return gates;
}

}  // namespace

std::span<const LibraryGate> library(Library which) {
  static const auto built_in3 = looked_up({{"U"}});
  static const auto stdgates =
      looked_up({{"p"},    {"x"},       {"y"},     {"z"},   {"h"},        {"s"},          {"sdg"},
                 {"t"},    {"tdg"},     {"sx"},    {"rx"},  {"ry"},       {"rz"},         {"cx"},
                 {"cy"},   {"cz"},      {"cp"},    {"crx"}, {"cry"},      {"crz"},        {"ch"},
                 {"swap"}, {"ccx"},     {"cswap"}, {"cu"},  {"CX", "cx"}, {"phase", "p"}, {"cphase", "cp"},
                 {"id"},   {"u1", "p"}, {"u2"},    {"u3"}});
  static const auto built_in2 = looked_up({{"U", "U of 2"}, {"CX", "cx"}});
  static const auto qelib1 = looked_up({{"u3"},
                                        {"u2"},
                                        {"u1", "p"},
                                        {"cx"},
                                        {"id"},
                                        {"x"},
                                        {"y"},
                                        {"z"},
                                        {"h"},
                                        {"s"},
                                        {"sdg"},
                                        {"t"},
                                        {"tdg"},
                                        {"rx"},
                                        {"ry"},
                                        {"rz"},
                                        {"cz"},
                                        {"cy"},
                                        {"ch"},
                                        {"ccx"},
                                        {"crz"},
                                        {"cu1", "cp"},
                                        {"cu3"},
                                        // In circulation under the same include.
                                        {"u0"},
                                        {"swap"},
                                        {"cswap"},
                                        {"crx"},
                                        {"cry"},
                                        {"rxx"},
                                        {"ryy"},
                                        {"rzz"},
                                        {"rccx"},
                                        {"rc3x"},
                                        {"c3x"},
                                        {"c3sqrtx"},
                                        {"c4x"},
                                        {"p"},
                                        {"sx"},
                                        {"sxdg"},
                                        {"csx"},
                                        {"cp"},
                                        {"cu"},
                                        {"ccz"},
                                        {"phase", "p"},
                                        {"cphase", "cp"},
                                        {"u", "u3"}});
  switch (which) {
    case Library::built_in3:
      return built_in3;
    case Library::stdgates:
      return stdgates;
    case Library::built_in2:
      return built_in2;
    case Library::qelib1:
      break;
  }
  return qelib1;
}

}  // namespace isinglass
