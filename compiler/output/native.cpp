// The native program; see native.h.
#include "output/native.h"

#include <stdexcept>

#include "output/annotations.h"
#include "output/text.h"

namespace isinglass {

namespace {

// exp(-i theta/2 (cos phi X + sin phi Y)) = rz(phi) rx(theta) rz(-phi), and the interaction is exp(-i theta/2
// ZZ) turned onto the two axes; both exact, global phase included.
constexpr std::string_view definitions = R"(
gate r(theta, phi) a {
  rz(-phi) a;
  rx(theta) a;
  rz(phi) a;
}
gate xx(theta, phi_a, phi_b) a, b {
  rz(-phi_a) a;
  rz(-phi_b) b;
  h a;
  h b;
  cx a, b;
  rz(theta) b;
  cx a, b;
  h a;
  h b;
  rz(phi_a) a;
  rz(phi_b) b;
}

)";

/// Names in comments and strings stay on their line.
std::string one_line(std::string text) {
  for (char& byte : text) {
    if (static_cast<unsigned char>(byte) < 0x20) byte = ' ';
  }
  return text;
}

class NativeWriter {
 public:
  /// Without a stream the text is kept.
  NativeWriter(std::ostream* out, const Circuit& circuit, std::span<const std::uint32_t> start)
      : out_(out), circuit_(circuit), start_(start), bits_(bit_names(circuit)) {
    for (std::uint32_t i = 0; i < circuit_.wires; ++i) ions_.emplace_back(fmt::format("ion[{}]", i));
  }

  std::string write(const NativeHeading& heading) {
    out_.add("OPENQASM ", uses_switch() ? "3.1" : "3.0", ";\n");
    out_.add("// ", one_line(heading.source), " compiled for ", one_line(heading.target), " by isinglass ",
             ISINGLASS_VERSION, ".\n");
    out_.add(
        "// Angles in radians. r(theta, phi) = exp(-i theta/2 (cos phi X + sin phi Y)), 0 < theta <= pi;\n");
    out_.add(
        "// xx(theta, phi_a, phi_b) = exp(-i theta/2 (cos phi_a X + sin phi_a Y) (x) (cos phi_b X + sin "
        "phi_b "
        "Y)), 0 < theta <= pi/2;\n");
    out_.add("// rz is a change of frame: no pulse, no time, no error.\n");
    out_.add("include \"stdgates.inc\";\n", definitions);
    notes_ = places_of(heading.annotations, circuit_);
    placement();
    for (const std::string& pragma : circuit_.pragmas) {
      // A source that is itself a native program says where its own qubits were: not ours.
      if (!pragma.starts_with("isinglass ")) out_.add("pragma ", pragma, "\n");
    }
    declarations();
    block(0, "");
    return out_.take();
  }

 private:
  void notes_before(const std::string& source_name) {
    const auto found = notes_.before_declaration.find(source_name);
    if (found == notes_.before_declaration.end()) return;
    for (const std::string& note : found->second) out_.add(one_line(note), "\n");
  }

  void notes_before(const Operation& op, const std::string& indent) {
    const auto found = notes_.before.find(&op);
    if (found == notes_.before.end()) return;
    for (const std::string& note : found->second) out_.add(indent, one_line(note), "\n");
  }

  bool uses_switch() const {
    for (const Branch& branch : circuit_.branches) {
      if (branch.kind == Branch::Kind::switch_case) return true;
    }
    return false;
  }

  void placement() {
    for (std::uint32_t q = 0; q < start_.size(); ++q) {
      out_.add("pragma isinglass start ", circuit_.wire_name(q), " ", ions_[start_[q]], "\n");
    }
    for (std::uint32_t q = 0; q < circuit_.end_wire.size(); ++q) {
      out_.add("pragma isinglass end ", circuit_.wire_name(q), " ", ions_[circuit_.end_wire[q]], "\n");
    }
    for (const Input& input : circuit_.inputs) {
      if (input.source.empty() || input.source == input.name) continue;
      out_.add("pragma isinglass name ", input.source, " ", input.name, "\n");
    }
    for (const Variable& variable : circuit_.variables) {
      if (variable.source.empty() || variable.source == variable.name) continue;
      out_.add("pragma isinglass name ", variable.source, " ", variable.name, "\n");
    }
  }

  void declarations() {
    out_.add("\n");
    for (const std::string& declaration : circuit_.externs) out_.add(declaration, "\n");
    for (const Input& input : circuit_.inputs) {
      if (input.is_derived) continue;
      notes_before(input.source.empty() ? input.name : input.source);
      out_.add("input ", input.type, " ", input.name, ";\n");
    }
    std::vector<bool> counts_rounds(circuit_.variables.size(), false);  // declared by its loop
    for (const Branch& branch : circuit_.branches) {
      if (branch.kind == Branch::Kind::for_loop) counts_rounds[branch.variable] = true;
    }
    for (std::size_t i = 0; i < circuit_.variables.size(); ++i) {
      const Variable& variable = circuit_.variables[i];
      if (counts_rounds[i]) continue;
      notes_before(variable.source.empty() ? variable.name : variable.source);
      out_.add(variable.is_output ? "output " : "", variable.type, " ", variable.name, ";\n");
    }
    out_.add("qubit[", std::uint64_t{circuit_.wires}, "] ion;\n\n");
  }

  void angle(const Operation& op, int which) {
    if (op.form[which] == 0) {
      out_.add(op.value[which]);
    } else {
      out_.add(angle_text(op.angle(which), circuit_));
    }
  }

  void block(std::uint32_t index, const std::string& indent) {
    for (const Operation& op : circuit_.blocks[index]) operation(op, indent);
  }

  void operation(const Operation& op, const std::string& indent) {
    if (!notes_.before.empty()) notes_before(op, indent);
    out_.add(indent);
    if (op.is_unitary() && !op.is_native()) {
      throw std::logic_error(fmt::format("{} is no operation of the machine", name(op.kind)));
    }
    switch (op.kind) {
      case Kind::r:
        out_.add("r(");
        angle(op, 0);
        out_.add(", ");
        angle(op, 1);
        out_.add(") ", ions_[op.operand[0]], ";\n");
        break;
      case Kind::xx:
        out_.add("xx(");
        angle(op, 0);
        out_.add(", ");
        angle(op, 1);
        out_.add(", ");
        angle(op, 2);
        out_.add(") ", ions_[op.operand[0]], ", ", ions_[op.operand[1]], ";\n");
        break;
      case Kind::rz:
        out_.add("rz(");
        angle(op, 0);
        out_.add(") ", ions_[op.operand[0]], ";\n");
        break;
      case Kind::measure:
        if (op.payload != no_bit) out_.add(bits_[op.payload], " = ");
        out_.add("measure ", ions_[op.operand[0]], ";\n");
        break;
      case Kind::reset:
        out_.add("reset ", ions_[op.operand[0]], ";\n");
        break;
      case Kind::barrier:
      case Kind::delay:
        if (op.kind == Kind::barrier) {
          out_.add("barrier");
        } else {
          out_.add("delay[", op.value[0], "us]");
        }
        operands(op);
        break;
      case Kind::classical:
        out_.add(statement_text(circuit_.statements[op.payload], circuit_), "\n");
        break;
      case Kind::branch:
        branch(circuit_.branches[op.payload], indent);
        break;
      default:
        break;
    }
  }

  void operands(const Operation& op) {
    std::string_view separator = " ";
    for (const std::uint32_t ion : circuit_.operands(op)) {
      out_.add(separator, ions_[ion]);
      separator = ", ";
    }
    out_.add(";\n");
  }

  void branch(const Branch& b, const std::string& indent) {
    out_.add(branch_text(b, circuit_), " {\n");
    if (b.kind == Branch::Kind::switch_case) {
      for (std::size_t i = 0; i < b.arms.size(); ++i) {
        out_.add(indent, "  ", arm_text(b, i, circuit_), " {\n");
        block(b.arms[i].block, indent + "    ");
        out_.add(indent, "  }\n");
      }
    } else {
      for (std::size_t i = 0; i < b.arms.size(); ++i) {
        if (i > 0) out_.add(indent, "} ", arm_text(b, i, circuit_), " {\n");
        block(b.arms[i].block, indent + "  ");
      }
    }
    out_.add(indent, "}\n");
  }

  TextWriter out_;
  const Circuit& circuit_;
  std::span<const std::uint32_t> start_;
  std::vector<ShortText> ions_;
  std::vector<std::string> bits_;
  AnnotationPlaces notes_;
};

}  // namespace

void write_native(std::ostream& out, const Placed& placed, const NativeHeading& heading) {
  write_native(out, placed.circuit, placed.start, heading);
}

std::string native_program(const Placed& placed, const NativeHeading& heading) {
  return native_program(placed.circuit, placed.start, heading);
}

void write_native(std::ostream& out, const Circuit& circuit, std::span<const std::uint32_t> start,
                  const NativeHeading& heading) {
  NativeWriter(&out, circuit, start).write(heading);
}

std::string native_program(const Circuit& circuit, std::span<const std::uint32_t> start,
                           const NativeHeading& heading) {
  return NativeWriter(nullptr, circuit, start).write(heading);
}

}  // namespace isinglass
