// Random programs over the language: loops, calls, modifiers, slices, aliases, constants. While the text of a
// program is made, this file applies the matrices that it stands for; the unitary that is read must be the
// same.
#include <doctest/doctest.h>
#include <fmt/format.h>

#include <cmath>
#include <functional>
#include <random>

#include "language/meaning.h"
#include "support/simulator.h"

using namespace isinglass;
using support::Complex;
using support::Matrix;

namespace {

constexpr int qubits = 4;

struct Number {
  std::string text;
  double value = 0;
};

/// A gate as a function of its angles.
struct Gate {
  std::string name;
  int angles = 0;
  int operands = 1;
  std::function<Matrix(const std::vector<double>&)> matrix;
};

class Generator {
 public:
  explicit Generator(std::uint64_t seed) : random_(seed) {
    const auto kind = [](Kind k) {
      return [k](const std::vector<double>& a) {
        return support::gate_matrix(k, !a.empty() ? a[0] : 0, a.size() > 1 ? a[1] : 0,
                                    a.size() > 2 ? a[2] : 0);
      };
    };
    gates_ = {{"x", 0, 1, kind(Kind::x)},       {"h", 0, 1, kind(Kind::h)},
              {"y", 0, 1, kind(Kind::y)},       {"p", 1, 1, kind(Kind::p)},
              {"rz", 1, 1, kind(Kind::rz)},     {"U", 3, 1, kind(Kind::u)},
              {"swap", 0, 2, kind(Kind::swap)}, {"gphase", 1, 0, kind(Kind::phase)}};
    gates_.push_back({"cx", 0, 2, [](const auto&) { return support::controlled(support::pauli_x()); }});
    gates_.push_back({"rx", 1, 1, [](const auto& a) { return support::rotation(a[0], support::pauli_x()); }});
    gates_.push_back(
        {"cp", 1, 2, [](const auto& a) { return support::controlled(support::gate_matrix(Kind::p, a[0])); }});
  }

  std::string text = "OPENQASM 3.1;\ninclude \"stdgates.inc\";\nqubit[4] q;\n";
  Matrix expected = support::identity(qubits);

  void program() {
    for (int i = below(3); i > 0; --i) constant();
    for (int i = below(3); i > 0; --i) define_gate();
    if (below(2) == 0) alias();
    for (int i = 2 + below(4); i > 0; --i) statement(2);
  }

 private:
  int below(int n) { return static_cast<int>(random_() % static_cast<unsigned>(n)); }
  std::string fresh(const char* stem) { return fmt::format("{}{}", stem, ++names_); }

  /// An expression and what it is worth: integers divide as integers.
  Number number(int depth) {
    if (depth == 0) {
      switch (below(numbers_.empty() ? 3 : 5)) {
        case 0: {
          const int value = below(9);
          return {fmt::format("{}.0", value), static_cast<double>(value)};
        }
        case 1:
          return {"pi", pi};
        case 2: {
          const double value = below(100) / 64.0;
          return {fmt::format("{:.6f}", value), value};
        }
        default:
          return numbers_[static_cast<std::size_t>(below(static_cast<int>(numbers_.size())))];
      }
    }
    const Number a = number(depth - 1);
    const Number b = number(depth - 1);
    switch (below(8)) {
      case 0:
        return {fmt::format("({} + {})", a.text, b.text), a.value + b.value};
      case 1:
        return {fmt::format("({} - {})", a.text, b.text), a.value - b.value};
      case 2:
        return {fmt::format("{} * {}", factor(a.text), factor(b.text)), a.value * b.value};
      case 3:
        return {fmt::format("sin({})", a.text), std::sin(a.value)};
      case 4:
        return {fmt::format("cos({} - {})", a.text, b.text), std::cos(a.value - b.value)};
      case 5:
        return {fmt::format("-{}", factor(a.text)), -a.value};
      case 6: {
        const int m = 1 + below(20);
        const int n = 1 + below(6);
        return {fmt::format("({}/{} + {}/2.0)", m, n, m), m / n + m / 2.0};
      }
      default:
        return {fmt::format("float({} < {})", a.text, b.text), a.value < b.value ? 1.0 : 0.0};
    }
  }

  static std::string factor(const std::string& text) { return "(" + text + ")"; }

  void constant() {
    const Number value = number(2);
    const std::string name = fresh("k");
    text += fmt::format("const float[64] {} = {};\n", name, value.text);
    numbers_.push_back({name, value.value});
  }

  void define_gate() {
    // gate g(a, b) u, v { two calls whose angles are made of a and b, in random order }
    const std::string name = fresh("g");
    const double s = below(8) / 4.0;
    const double t = below(8) / 4.0 - 1;
    const int first = below(3);
    const bool swapped = below(2) == 0;
    const std::vector<std::string> inner = {"rx", "p", "rz"};
    text += fmt::format(
        "gate {0}(a, b) u, v {{ {1}({2} * a - b / 2) {3}; gphase(a * b); cx {3}, {4}; {1}(sin(b) + {5}) {4}; "
        "}}\n",
        name, inner[static_cast<std::size_t>(first)], s, swapped ? "v" : "u", swapped ? "u" : "v", t);
    gates_.push_back({name, 2, 2, [=](const std::vector<double>& angles) {
                        const auto one = [&](double angle) -> Matrix {
                          if (first == 0) return support::rotation(angle, support::pauli_x());
                          return support::gate_matrix(first == 1 ? Kind::p : Kind::rz, angle);
                        };
                        const Matrix id = support::identity();
                        const Matrix before = one(s * angles[0] - angles[1] / 2);
                        const Matrix after = one(std::sin(angles[1]) + t);
                        const Matrix swap = support::gate_matrix(Kind::swap);
                        Matrix body = support::product(id, after) * support::controlled(support::pauli_x()) *
                                      support::product(before, id);
                        if (swapped) body = swap * body * swap;
                        return Matrix(std::polar(1.0, angles[0] * angles[1]) * body);
                      }});
  }

  void alias() {
    // The registers that operands may be taken from, as lists of wires.
    const std::string name = fresh("r");
    const int split = 1 + below(3);
    text += fmt::format("let {} = q[{}:3] ++ q[0:{}];\n", name, split, split - 1);
    std::vector<std::uint32_t> wires;
    for (int k = split; k < 4; ++k) wires.push_back(static_cast<std::uint32_t>(k));
    for (int k = 0; k < split; ++k) wires.push_back(static_cast<std::uint32_t>(k));
    registers_.emplace_back(name, wires);
  }

  void apply(const Matrix& gate, const std::vector<std::uint32_t>& wires) {
    for (Eigen::Index column = 0; column < expected.cols(); ++column) {
      support::State state(qubits);
      for (Eigen::Index row = 0; row < expected.rows(); ++row) {
        state.amplitudes[static_cast<std::size_t>(row)] = expected(row, column);
      }
      state.apply(gate, wires);
      for (Eigen::Index row = 0; row < expected.rows(); ++row) {
        expected(row, column) = state.amplitudes[static_cast<std::size_t>(row)];
      }
    }
  }

  /// One call, perhaps modified; `index` turns a wire number into the text of an operand.
  std::string call(const std::function<std::pair<std::string, std::uint32_t>(int)>& operand) {
    const Gate& gate = gates_[static_cast<std::size_t>(below(static_cast<int>(gates_.size())))];
    std::vector<double> angles;
    std::string angle_text;
    for (int k = 0; k < gate.angles; ++k) {
      const Number angle = number(2);
      angle_text += (k == 0 ? "(" : ", ") + angle.text;
      angles.push_back(angle.value);
    }
    if (gate.angles > 0) angle_text += ")";
    Matrix matrix = gate.matrix(angles);
    std::string modifiers;
    int operands = gate.operands;
    for (int k = below(4); k > 0; --k) {
      switch (below(4)) {
        case 0:
          matrix = matrix.adjoint().eval();
          modifiers = "inv @ " + modifiers;
          break;
        case 1: {
          const int power = below(5) - 2;
          Matrix result = Matrix::Identity(matrix.rows(), matrix.cols());
          for (int i = 0; i < std::abs(power); ++i) result = (result * matrix).eval();
          matrix = power < 0 ? Matrix(result.adjoint()) : result;
          modifiers = fmt::format("pow({}) @ ", power) + modifiers;
          break;
        }
        default: {
          if (operands == qubits) break;
          const bool negated = below(2) == 0;
          matrix = support::controlled(matrix);
          if (negated) {
            Matrix flip = Matrix::Zero(matrix.rows(), matrix.cols());
            for (Eigen::Index i = 0; i < flip.rows(); ++i) flip(i, i ^ 1) = 1;
            matrix = (flip * matrix * flip).eval();
          }
          modifiers = (negated ? "negctrl @ " : "ctrl @ ") + modifiers;
          ++operands;
        }
      }
    }
    std::string line = modifiers + gate.name + angle_text;
    std::vector<std::uint32_t> wires;
    for (int k = 0; k < operands; ++k) {
      const auto [name, wire] = operand(k);
      line += (k == 0 ? " " : ", ") + name;
      wires.push_back(wire);
    }
    apply(matrix, wires);
    return line + ";";
  }

  std::string call_on_random() {
    std::vector<std::uint32_t> order = {0, 1, 2, 3};
    std::shuffle(order.begin(), order.end(), random_);
    return call([&](int k) {
      const std::uint32_t wire = order[static_cast<std::size_t>(k)];
      if (!registers_.empty() && below(2) == 0) {
        const auto& [name, wires] = registers_[0];
        const auto place = std::find(wires.begin(), wires.end(), wire) - wires.begin();
        return std::pair(fmt::format("{}[{}]", name, below(2) == 0 ? place : place - 4), wire);
      }
      return std::pair(fmt::format("q[{}]", wire), wire);
    });
  }

  void statement(int depth) {
    switch (below(depth > 0 ? 5 : 2)) {
      case 0:
      case 1:
        text += call_on_random() + "\n";
        return;
      case 2: {  // broadcasting over slices
        const int first = below(2);
        text += fmt::format("cx q[{}:2:{}], q[{}];\nh q[{}:3];\n", first, first + 1, 3 - first, first + 1);
        apply(support::controlled(support::pauli_x()),
              {static_cast<std::uint32_t>(first), static_cast<std::uint32_t>(3 - first)});
        for (int k = first + 1; k < qubits; ++k)
          apply(support::gate_matrix(Kind::h), {static_cast<std::uint32_t>(k)});
        return;
      }
      case 3: {  // a loop whose rounds differ
        const std::string i = fresh("i");
        const int first = below(3);
        const int step = below(2) == 0 ? 1 : -1;
        const int last = step > 0 ? first + below(2) : std::max(0, first - below(2));
        const Number scale = number(1);
        text += fmt::format(
            "for int {0} in [{1}:{2}:{3}] {{ rz({4} * {0}) q[{0}]; if ({0} % 2 == 1) {{ continue; }} ctrl @ "
            "h q[{0}], q[{0} + 1]; }}\n",
            i, first, step, last, factor(scale.text));
        for (int k = first; step > 0 ? k <= last : k >= last; k += step) {
          const auto wire = static_cast<std::uint32_t>(k);
          apply(support::gate_matrix(Kind::rz, scale.value * k), {wire});
          if (k % 2 == 0) apply(support::controlled(support::gate_matrix(Kind::h)), {wire, wire + 1});
        }
        return;
      }
      default: {  // a subroutine with a loop that counts in a variable
        const std::string f = fresh("f");
        const int rounds = below(4);
        const double angle = below(16) / 8.0;
        const auto wire = static_cast<std::uint32_t>(below(3));
        text += fmt::format(
            "def {0}(qubit[2] s, int n, float a) -> float {{ float total = 0.0; int j = 0; while (j < n) {{ "
            "total += a; j += 1; if "
            "(j == 3) break; }} rx(total) s[1]; cx s[0], s[1]; return total; }}\n"
            "float {1} = {0}(q[{2}:{3}], {4}, {5}); p({1} / 2) q[0];\n",
            f, fresh("v"), wire, wire + 1, rounds, fmt::format("{:.4f}", angle));
        const double total = std::min(rounds, 3) * angle;
        apply(support::rotation(total, support::pauli_x()), {wire + 1});
        apply(support::controlled(support::pauli_x()), {wire, wire + 1});
        apply(support::gate_matrix(Kind::p, total / 2), {0});
      }
    }
  }

  std::mt19937_64 random_;
  std::vector<Gate> gates_;
  std::vector<Number> numbers_;
  std::vector<std::pair<std::string, std::vector<std::uint32_t>>> registers_;
  int names_ = 0;
};

}  // namespace

TEST_CASE("5,000 random programs have the unitaries that this test computes") {
  double worst = 0;
  for (std::uint64_t seed = 0; seed < 5000; ++seed) {
    Generator generator(seed);
    generator.program();
    INFO("seed " << seed << "\n" << generator.text);
    const Matrix actual = support::unitary(meaning::circuit_of(generator.text));
    const double apart = (actual - generator.expected).cwiseAbs().maxCoeff();
    REQUIRE(apart < 1e-9);
    worst = std::max(worst, apart);
  }
  MESSAGE("largest difference of an entry: " << worst);
}
