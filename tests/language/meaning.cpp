// See meaning.h.
#include "language/meaning.h"

#include <doctest/doctest.h>
#include <fmt/format.h>

#include "support/interpreter.h"

namespace isinglass::meaning {

namespace {

std::string shown(const Message& message) {
  return fmt::format("{}:{}: {}: {}", message.place.line, message.place.column,
                     message.severity == Message::Severity::error ? "error" : "warning", message.text);
}

struct Writer {
  const Circuit& circuit;
  std::string text;

  // As a compiled program does: one register, and pragmas for what is where.
  std::string wire(std::uint32_t index) const { return fmt::format("ion[{}]", index); }

  std::string angle(const Operation& op, int i) const {
    std::string result = fmt::format("{}", op.value[i]);
    if (result.find_first_of(".e") == std::string::npos) result += ".0";
    for (const Term& term : circuit.forms.terms(op.form[i])) {
      const Input& input = circuit.inputs[term.input];
      result += fmt::format(" + ({}) * ({})", term.coefficient,
                            input.is_derived ? printed(input.expression, circuit) : input.name);
    }
    return result;
  }

  std::string bit(std::uint32_t flat) const {
    for (const Variable& variable : circuit.variables) {
      if (variable.bits == 0 || flat < variable.first_bit || flat >= variable.first_bit + variable.bits)
        continue;
      return variable.is_scalar ? variable.name
                                : fmt::format("{}[{}]", variable.name, flat - variable.first_bit);
    }
    return "?";
  }

  void unitary(const Operation& op) {
    static const std::vector<std::string> names = {"gphase", "x",  "y", "z",    "h",   "p",
                                                   "rz",     "r_", "U", "swap", "zz_", "xx_"};
    if (op.control_count() > 0) text += fmt::format("ctrl({}) @ ", op.control_count());
    text += names[static_cast<std::size_t>(op.kind)];
    for (int i = 0; i < angle_count(op.kind); ++i) text += (i == 0 ? "(" : ", ") + angle(op, i);
    if (angle_count(op.kind) > 0) text += ")";
    operands(op);
  }

  void operands(const Operation& op) {
    bool first = true;
    for (const std::uint32_t index : circuit.operands(op)) {
      text += (first ? " " : ", ") + wire(index);
      first = false;
    }
    text += ";\n";
  }

  void branch(const Branch& branch) {
    const std::string condition = printed(branch.condition, circuit);
    if (branch.kind == Branch::Kind::if_else) {
      text += "if (" + condition + ") {\n";
      block(branch.arms[0].block);
      if (branch.arms.size() > 1) {
        text += "} else {\n";
        block(branch.arms[1].block);
      }
      text += "}\n";
      return;
    }
    if (branch.kind == Branch::Kind::while_loop) {
      text += "while (" + condition + ") {\n";
      block(branch.arms[0].block);
      text += "}\n";
      return;
    }
    REQUIRE(branch.kind == Branch::Kind::switch_case);
    text += "switch (" + condition + ") {\n";
    for (const Branch::Arm& arm : branch.arms) {
      if (arm.labels.empty()) text += "default {\n";
      for (std::size_t i = 0; i < arm.labels.size(); ++i) {
        text += (i == 0 ? "case " : ", ") + printed(arm.labels[i], circuit);
      }
      if (!arm.labels.empty()) text += " {\n";
      block(arm.block);
      text += "}\n";
    }
    text += "}\n";
  }

  void statement(const ClassicalStatement& statement) {
    using K = ClassicalStatement::Kind;
    if (statement.kind == K::assign) {
      text += printed(statement.target, circuit) + " = " + printed(statement.value, circuit) + ";\n";
    }
    if (statement.kind == K::call) text += printed(statement.value, circuit) + ";\n";
    if (statement.kind == K::leave_loop) text += "break;\n";
    if (statement.kind == K::next_round) text += "continue;\n";
    if (statement.kind == K::end_program) text += "end;\n";
  }

  void block(std::uint32_t index) {
    for (const Operation& op : circuit.blocks[index]) {
      switch (op.kind) {
        case Kind::measure:
          text += (op.payload == no_bit ? "" : bit(op.payload) + " = ") + "measure " + wire(op.operand[0]) +
                  ";\n";
          break;
        case Kind::reset:
          text += "reset";
          operands(op);
          break;
        case Kind::barrier:
          text += "barrier";
          operands(op);
          break;
        case Kind::delay:
          text += fmt::format("delay[{}us]", op.value[0]);
          operands(op);
          break;
        case Kind::classical:
          statement(circuit.statements[op.payload]);
          break;
        case Kind::branch:
          branch(circuit.branches[op.payload]);
          break;
        default:
          unitary(op);
      }
    }
  }
};

}  // namespace

Circuit circuit_of(const std::string& text) {
  Reading reading = read("test.qasm", text);
  std::string all;
  for (const Message& message : reading.messages) all += printed(message);
  INFO(text);
  INFO(all);
  REQUIRE(reading.ok());
  check_invariants(*reading.circuit);
  return std::move(*reading.circuit);
}

std::string messages_of(const std::string& text) {
  std::string all;
  for (const Message& message : read("test.qasm", text).messages) all += shown(message) + "\n";
  return all;
}

std::vector<std::string> errors_of(const std::string& text) {
  std::vector<std::string> errors;
  const Reading reading = read("test.qasm", text);
  for (const Message& message : reading.messages) {
    if (message.severity == Message::Severity::error) errors.push_back(shown(message));
  }
  // The circuit is there exactly if there are no errors.
  CHECK(reading.ok() == errors.empty());
  return errors;
}

std::vector<std::string> warnings_of(const std::string& text) {
  std::vector<std::string> warnings;
  for (const Message& message : read("test.qasm", text).messages) {
    if (message.severity == Message::Severity::warning) warnings.push_back(shown(message));
  }
  return warnings;
}

double number(const std::string& expression, const std::string& before) {
  const Circuit circuit = circuit_of("OPENQASM 3.1;\ninclude \"stdgates.inc\";\nqubit q;\n" + before +
                                     "\nrz(" + expression + ") q;\n");
  REQUIRE(circuit.body().size() == 1);
  return circuit.body()[0].value[0];
}

bool holds(const std::string& expression, const std::string& before) {
  const Circuit circuit = circuit_of("OPENQASM 3.1;\ninclude \"stdgates.inc\";\nqubit q;\n" + before +
                                     "\nif (" + expression + ") { U(1, 0, 0) q; } else { U(2, 0, 0) q; }\n");
  REQUIRE(circuit.body().size() == 1);
  return circuit.body()[0].value[0] == 1;
}

std::string program_of(const Circuit& circuit) {
  Writer writer{circuit, {}};
  writer.text =
      "OPENQASM 3.1;\ninclude \"stdgates.inc\";\n"
      "gate r_(t, f) a { rz(-f) a; rx(t) a; rz(f) a; }\n"
      "gate zz_(t) a, b { cx a, b; rz(t) b; cx a, b; }\n"
      "gate xx_(t, f, g) a, b { rz(-f) a; rz(-g) b; h a; h b; cx a, b; rz(t) b; cx a, b; h a; h b; rz(f) a; "
      "rz(g) b; }\n";
  for (const Input& input : circuit.inputs) {
    if (!input.is_derived) writer.text += fmt::format("input {} {};\n", input.type, input.name);
  }
  writer.text += fmt::format("qubit[{}] ion;\n", std::max(circuit.wires, 1u));
  for (std::uint32_t wire = 0; wire < circuit.source_qubits; ++wire) {
    for (const char* when : {"start", "end"}) {
      writer.text += fmt::format("pragma isinglass {} {} ion[{}]\n", when, circuit.wire_name(wire), wire);
    }
  }
  for (const Variable& variable : circuit.variables) {
    if (!variable.source.empty() && variable.source != variable.name) {
      writer.text += fmt::format("pragma isinglass name {} {}\n", variable.source, variable.name);
    }
    writer.text += fmt::format("{} {};\n", variable.type, variable.name);
  }
  writer.block(0);
  return writer.text;
}

double difference_of(const std::string& source, const std::string& written) {
  INFO(source);
  INFO(written);
  support::RunOptions options;
  options.with_references = true;
  double result = 1;
  try {
    result = support::difference(source, written, options);
  } catch (const std::exception& error) {
    FAIL_CHECK(error.what());
  }
  return result;
}

double deviation(const std::string& source) {
  return difference_of(source, program_of(circuit_of(source)));
}

}  // namespace isinglass::meaning
