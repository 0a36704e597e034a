// Random circuits and random source texts; see random_circuits.h.
#include "support/random_circuits.h"

#include <fmt/format.h>

#include <cmath>
#include <functional>
#include <numeric>

#include "support/standard_gates.h"

namespace isinglass::support {

namespace {
const Complex i(0, 1);
}

double Random::gaussian() {
  // Box and Muller 1958.
  return std::sqrt(-2 * std::log(1 - real())) * std::cos(2 * pi * real());
}

std::vector<std::uint32_t> Random::distinct(int count, int limit) {
  std::vector<std::uint32_t> all(static_cast<std::size_t>(limit));
  std::iota(all.begin(), all.end(), 0u);
  for (int k = 0; k < count; ++k) std::swap(all[k], all[k + below(limit - k)]);
  all.resize(static_cast<std::size_t>(count));
  return all;
}

Matrix haar_unitary(Random& random, int qubits) {
  const Eigen::Index size = Eigen::Index(1) << qubits;
  Matrix m(size, size);
  for (Eigen::Index c = 0; c < size; ++c) {
    for (Eigen::Index r = 0; r < size; ++r) {
      const double re = random.gaussian();
      m(r, c) = Complex(re, random.gaussian());
    }
    // Gram and Schmidt, twice for accuracy: with a positive diagonal of R the result is Haar distributed.
    for (int round = 0; round < 2; ++round) {
      for (Eigen::Index k = 0; k < c; ++k) m.col(c) -= m.col(k) * m.col(k).dot(m.col(c));
    }
    m.col(c).normalize();
  }
  return m;
}

double random_nice_angle(Random& random) {
  return random.between(-8, 8) * pi / 4;
}

double random_angle(Random& random) {
  switch (random.below(10)) {
    case 0:
    case 1:
    case 2:
      return random_nice_angle(random);
    case 3:
      return 0;
    case 4:
      return random.real(-1e-5, 1e-5);
    case 5:
      return random.real(-20, 20);
    case 6:
      return random.between(-16, 16) * pi / 8;
    default:
      return random.real(-2 * pi, 2 * pi);
  }
}

namespace {

struct Maker {
  Random& random;
  const RandomCircuit& wanted;
  Circuit circuit;

  Angle angle() {
    switch (wanted.family) {
      case Family::clifford:
        return {random.between(-4, 4) * pi / 2};
      case Family::clifford_t:
        return {random_nice_angle(random)};
      case Family::symbolic: {
        Angle a{random_angle(random)};
        if (random.chance(0.4)) {
          const double coefficient = random.chance(0.5) ? random.between(1, 2) : random.real(-2, 2);
          a.form = circuit.forms.scaled(circuit.forms.of_input(static_cast<std::uint32_t>(random.below(3))),
                                        coefficient);
        }
        return a;
      }
      default:
        return {random_angle(random)};
    }
  }

  void put(Kind kind, int controls, std::vector<Angle> angles = {}) {
    const auto operands = random.distinct(controls + target_count(kind), wanted.qubits);
    circuit.body().push_back(circuit.make(kind, operands, angles));
  }

  int controls(Kind kind) {
    const int most = std::min(wanted.most_controls, wanted.qubits - target_count(kind));
    if (most <= 0) return 0;
    // Half of the gates have none, and more of them are rarer.
    int count = 0;
    while (count < most && random.chance(0.4)) ++count;
    return count;
  }

  void any_gate() {
    static constexpr Kind all[] = {Kind::phase, Kind::x, Kind::y, Kind::z,    Kind::h,  Kind::p,
                                   Kind::rz,    Kind::r, Kind::u, Kind::swap, Kind::zz, Kind::xx};
    Kind kind = all[random.below(12)];
    while (target_count(kind) > wanted.qubits) kind = all[random.below(12)];
    std::vector<Angle> angles;
    for (int a = 0; a < angle_count(kind); ++a) angles.push_back(angle());
    put(kind, controls(kind), std::move(angles));
  }

  void native_gate() {
    switch (random.below(wanted.qubits > 1 ? 4 : 2)) {
      case 0:
        return put(Kind::rz, 0, {angle()});
      case 1:
        return put(Kind::r, 0, {{random.real(1e-3, pi)}, angle()});
      default:
        return put(Kind::xx, 0, {{random.real(1e-3, pi / 2)}, angle(), angle()});
    }
  }

  void clifford_gate(bool with_t) {
    switch (random.below(wanted.qubits > 1 ? 12 : 6)) {
      case 0:
        return put(Kind::h, 0);
      case 1:
        return put(random.chance(0.5) ? Kind::x : Kind::y, 0);
      case 2:
        return put(Kind::z, 0);
      case 3:
        return put(Kind::p, 0, {angle()});
      case 4:
        return put(Kind::r, 0, {{random.between(-4, 4) * pi / 2}, {random.between(-4, 4) * pi / 2}});
      case 5:
        return put(Kind::rz, 0, {angle()});
      case 6:
      case 7:
        return put(Kind::x, 1);
      case 8:
        return put(Kind::z, 1);
      case 9:
        if (with_t && wanted.most_controls >= 2 && wanted.qubits > 2 && random.chance(0.3))
          return put(Kind::x, 2);
        return put(Kind::swap, 0);
      case 10:
        return put(Kind::zz, 0, {{random.between(-4, 4) * pi / 2}});
      default:
        return put(Kind::xx, 0,
                   {{random.between(-4, 4) * pi / 2},
                    {random.between(-4, 4) * pi / 2},
                    {random.between(-4, 4) * pi / 2}});
    }
  }

  void toffoli_gate() {
    const int most = std::min(wanted.most_controls, wanted.qubits - 1);
    put(Kind::x, random.between(0, most));
  }

  /// exp(-i t/2 P) as basis changes, a ladder of cx, an rz, and all of it back.
  void pauli_exponential() {
    const auto support = random.distinct(random.between(1, wanted.qubits), wanted.qubits);
    std::vector<int> letter;
    for (std::size_t k = 0; k < support.size(); ++k) letter.push_back(random.below(3));
    const auto basis = [&](bool back) {
      for (std::size_t k = 0; k < support.size(); ++k) {
        if (letter[k] == 0) circuit.body().push_back(circuit.make(Kind::h, {support[k]}));
        if (letter[k] == 1) {
          circuit.body().push_back(circuit.make(Kind::r, {support[k]}, {{back ? -pi / 2 : pi / 2}, {0}}));
        }
      }
    };
    basis(false);
    for (std::size_t k = 0; k + 1 < support.size(); ++k) {
      circuit.body().push_back(circuit.make(Kind::x, {support[k], support[k + 1]}));
    }
    circuit.body().push_back(circuit.make(Kind::rz, {support.back()}, {angle()}));
    for (std::size_t k = support.size() - 1; k-- > 0;) {
      circuit.body().push_back(circuit.make(Kind::x, {support[k], support[k + 1]}));
    }
    basis(true);
  }

  void gate() {
    switch (wanted.family) {
      case Family::any:
      case Family::symbolic:
        return any_gate();
      case Family::native:
        return native_gate();
      case Family::clifford:
        return clifford_gate(false);
      case Family::clifford_t:
        return clifford_gate(true);
      case Family::toffolis:
        return toffoli_gate();
      case Family::pauli:
        return pauli_exponential();
    }
  }

  void begin() {
    add_register(circuit, "q", static_cast<std::uint32_t>(wanted.qubits));
    if (wanted.family == Family::symbolic) {
      for (const char* input : {"a", "b", "c"}) {
        Input declared;
        declared.name = input;
        declared.type = "float";
        circuit.inputs.push_back(declared);
      }
    }
  }
};

}  // namespace

Circuit random_circuit(Random& random, const RandomCircuit& wanted) {
  Maker maker{random, wanted, {}};
  maker.begin();
  for (int g = 0; g < wanted.gates; ++g) maker.gate();
  return std::move(maker.circuit);
}

Circuit random_measured_circuit(Random& random, const RandomCircuit& wanted, int bits) {
  Maker maker{random, wanted, {}};
  maker.begin();
  Circuit& circuit = maker.circuit;
  add_bits(circuit, "c", static_cast<std::uint32_t>(bits));
  const auto measure = [&](std::uint32_t wire) {
    Operation op = circuit.make(Kind::measure, {wire});
    op.payload = static_cast<std::uint32_t>(random.below(bits));
    circuit.body().push_back(op);
  };
  int measured = 0;
  for (int g = 0; g < wanted.gates; ++g) {
    maker.gate();
    const auto wire = static_cast<std::uint32_t>(random.below(wanted.qubits));
    if (measured < 4 && random.chance(0.1)) {
      measure(wire);
      ++measured;
    } else if (measured < 4 && random.chance(0.05)) {
      circuit.body().push_back(circuit.make(Kind::reset, {wire}));
      ++measured;
    } else if (random.chance(0.05)) {
      circuit.body().push_back(
          circuit.make(Kind::barrier, random.distinct(random.between(1, wanted.qubits), wanted.qubits)));
    }
  }
  for (const auto wire : random.distinct(random.between(0, wanted.qubits), wanted.qubits)) measure(wire);
  return std::move(maker.circuit);
}

// ---- random source texts ----

namespace {

using Values = std::vector<double>;

/// A number as OpenQASM text: an expression or digits that read back exactly.
struct Written {
  double value;
  std::string text;
};

Written written_angle(Random& random) {
  switch (random.below(7)) {
    case 0: {
      const int k = random.between(-8, 8);
      return {k * pi / 4, fmt::format("{}*pi/4", k)};
    }
    case 1: {
      const int k = random.between(1, 6);
      return {pi / k, fmt::format("pi/{}", k)};
    }
    case 2:
      return {0, "0"};
    case 3: {
      const double a = random.real(-3, 3);
      return {std::sin(a) + 2 * pi, fmt::format("sin({:.17g}) + tau", a)};
    }
    case 4: {
      const int k = random.between(-3, 3);
      return {static_cast<double>(k), fmt::format("{}", k)};
    }
    default: {
      const double a = random.real(-7, 7);
      return {a, fmt::format("{:.17g}", a)};
    }
  }
}

/// A call under construction: its text without operands, its meaning, its width.
struct Call {
  std::string text;
  Matrix matrix;
  int qubits;
};

Call with_modifiers(Random& random, Call call, int widest) {
  int modifiers = random.chance(0.6) ? 0 : random.between(1, 3);
  while (modifiers-- > 0) {
    switch (random.below(6)) {
      case 0:
      case 1:
        if (call.qubits + 1 > widest) break;
        call = {"ctrl @ " + call.text, controlled(call.matrix), call.qubits + 1};
        break;
      case 2:
        if (call.qubits + 1 > widest) break;
        call = {"negctrl @ " + call.text, negatively_controlled(call.matrix), call.qubits + 1};
        break;
      case 3:
        call = {"inv @ " + call.text, call.matrix.adjoint(), call.qubits};
        break;
      case 4: {
        const int k = random.between(-3, 3);
        Matrix m = identity(call.qubits);
        for (int n = 0; n < std::abs(k); ++n) m = m * call.matrix;
        if (k < 0) m = m.adjoint().eval();
        call = {fmt::format("pow({}) @ {}", k, call.text), m, call.qubits};
        break;
      }
      default:
        if (call.qubits + 2 > widest) break;
        call = {"ctrl(2) @ " + call.text, controlled(call.matrix, 2), call.qubits + 2};
        break;
    }
  }
  return call;
}

Call library_call(Random& random, int widest) {
  const std::vector<StandardGate>& library = standard_gates();
  const StandardGate* gate = nullptr;
  do gate = &library[static_cast<std::size_t>(random.below(static_cast<int>(library.size())))];
  while (gate->qubits > widest);
  Values values;
  std::string text = gate->name;
  for (int k = 0; k < gate->parameters; ++k) {
    const Written angle = written_angle(random);
    values.push_back(angle.value);
    text += (k == 0 ? "(" : ", ") + angle.text;
  }
  if (gate->parameters > 0) text += ")";
  Call call{text, gate->matrix(values), gate->qubits};
  // Fractional powers of gates of one and two qubits, before controls and inverses.
  if (gate->qubits >= 1 && gate->qubits <= 2 && random.chance(0.08)) {
    const double exponents[] = {0.5, 0.25, -0.5, 1.5};
    const double exponent = exponents[random.below(4)];
    call = {fmt::format("pow({}) @ {}", exponent, call.text), power(call.matrix, exponent), call.qubits};
  }
  return with_modifiers(random, std::move(call), widest);
}

Matrix unitary_of_steps(const std::vector<Step>& steps, int qubits) {
  const Eigen::Index size = Eigen::Index(1) << qubits;
  Matrix m(size, size);
  for (Eigen::Index column = 0; column < size; ++column) {
    State state(static_cast<unsigned>(qubits), static_cast<std::uint64_t>(column));
    for (const Step& step : steps) state.apply(step.gate, step.operands);
    m.col(column) = Eigen::Map<const Eigen::VectorXcd>(state.amplitudes.data(), size);
  }
  return m;
}

/// gate NAME(a, b) x0, x1, ... { calls } with a call of each parameter as rz, ry or p in it.
struct Definition {
  std::string name;
  int parameters;
  int qubits;
  std::string text;
  std::function<Matrix(const Values&)> matrix;
};

Definition definition(Random& random, int number, int widest) {
  Definition made;
  made.name = fmt::format("mine{}", number);
  made.parameters = random.between(0, 2);
  made.qubits = random.between(1, std::min(3, widest));
  made.text = "gate " + made.name;
  if (made.parameters > 0) made.text += made.parameters == 1 ? "(a)" : "(a, b)";
  for (int k = 0; k < made.qubits; ++k) made.text += fmt::format("{}w{}", k == 0 ? " " : ", ", k);
  made.text += " {\n";

  struct Line {
    Matrix fixed;
    int parameter = -1;
    double factor = 0;
    double shift = 0;
    char axis = 'z';
    std::vector<std::uint32_t> operands;
  };
  std::vector<Line> lines;
  const int count = random.between(1, 5) + made.parameters;
  for (int k = 0; k < count; ++k) {
    Line line;
    std::string call_text;
    if (k < made.parameters) {
      line.parameter = k;
      line.factor = random.between(1, 3) * (random.chance(0.5) ? -0.5 : 1);
      line.shift = random.chance(0.5) ? 0 : random.real(-1, 1);
      line.axis = "xyzp"[random.below(4)];
      call_text =
          fmt::format("{}({:.17g}*{} + {:.17g})", line.axis == 'p' ? "p" : std::string("r") + line.axis,
                      line.factor, k == 0 ? "a" : "b", line.shift);
      line.operands = random.distinct(1, made.qubits);
    } else {
      const Call call = library_call(random, made.qubits);
      line.fixed = call.matrix;
      line.operands = random.distinct(call.qubits, made.qubits);
      call_text = call.text;
    }
    made.text += "  " + call_text;
    for (std::size_t o = 0; o < line.operands.size(); ++o) {
      made.text += fmt::format("{}w{}", o == 0 ? " " : ", ", line.operands[o]);
    }
    made.text += ";\n";
    lines.push_back(std::move(line));
  }
  made.text += "}\n";
  const int qubits = made.qubits;
  made.matrix = [lines, qubits](const Values& values) {
    std::vector<Step> steps;
    for (const Line& line : lines) {
      if (line.parameter < 0) {
        steps.push_back({line.fixed, line.operands});
        continue;
      }
      const double angle = line.factor * values[line.parameter] + line.shift;
      const Matrix gate = line.axis == 'p'   ? diagonal_phase(angle)
                          : line.axis == 'x' ? rotation(angle, pauli_x())
                          : line.axis == 'y' ? rotation(angle, pauli_y())
                                             : rotation(angle, pauli_z());
      steps.push_back({gate, line.operands});
    }
    return unitary_of_steps(steps, qubits);
  };
  return made;
}

}  // namespace

Source random_source(Random& random, int qubits, int gates) {
  Source source;
  source.qubits = qubits;
  source.text = "OPENQASM 3.1;\ninclude \"stdgates.inc\";\n";
  std::vector<Definition> definitions;
  const int defined = random.chance(0.5) ? random.between(1, 2) : 0;
  for (int k = 0; k < defined; ++k) {
    definitions.push_back(definition(random, k, qubits));
    source.text += definitions.back().text;
  }
  source.text += fmt::format("qubit[{}] q;\n", qubits);
  const int widest = std::min(qubits, 4);
  for (int g = 0; g < gates; ++g) {
    if (!definitions.empty() && random.chance(0.2)) {
      const Definition& gate = definitions[random.below(static_cast<int>(definitions.size()))];
      Values values;
      std::string text = gate.name;
      for (int k = 0; k < gate.parameters; ++k) {
        const Written angle = written_angle(random);
        values.push_back(angle.value);
        text += (k == 0 ? "(" : ", ") + angle.text;
      }
      if (gate.parameters > 0) text += ")";
      const Call call = with_modifiers(random, {text, gate.matrix(values), gate.qubits}, widest);
      const auto operands = random.distinct(call.qubits, qubits);
      source.text += call.text;
      for (std::size_t o = 0; o < operands.size(); ++o) {
        source.text += fmt::format("{}q[{}]", o == 0 ? " " : ", ", operands[o]);
      }
      source.text += ";\n";
      source.steps.push_back({call.matrix, operands});
      continue;
    }
    const Call call = library_call(random, widest);
    if (call.qubits == 1 && random.chance(0.1)) {  // broadcast over the register or a slice of it
      const int first = random.below(qubits);
      const int last = random.between(first, qubits - 1);
      const bool whole = random.chance(0.5);
      source.text += call.text + (whole ? " q;\n" : fmt::format(" q[{}:{}];\n", first, last));
      for (int k = whole ? 0 : first; k <= (whole ? qubits - 1 : last); ++k) {
        source.steps.push_back({call.matrix, {static_cast<std::uint32_t>(k)}});
      }
      continue;
    }
    const auto operands = random.distinct(call.qubits, qubits);
    source.text += call.text;
    for (std::size_t o = 0; o < operands.size(); ++o) {
      source.text += fmt::format("{}q[{}]", o == 0 ? " " : ", ", operands[o]);
    }
    source.text += ";\n";
    source.steps.push_back({call.matrix, operands});
  }
  return source;
}

Matrix unitary(const Source& source) {
  return unitary_of_steps(source.steps, source.qubits);
}

}  // namespace isinglass::support
