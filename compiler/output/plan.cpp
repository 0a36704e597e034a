// Native programs read back; see plan.h.
#include "output/plan.h"

#include <fmt/format.h>

#include <algorithm>
#include <charconv>
#include <optional>
#include <sstream>

#include "circuit/message.h"

namespace isinglass {

namespace {

/// `name[index]`, or `name` alone for a scalar.
struct Indexed {
  std::string name;
  std::optional<std::uint32_t> index;
};

std::optional<Indexed> indexed(const std::string& text) {
  const std::size_t open = text.find('[');
  if (open == std::string::npos) return Indexed{text, {}};
  std::uint32_t index = 0;
  const auto [end, fault] = std::from_chars(text.data() + open + 1, text.data() + text.size(), index);
  if (fault != std::errc{} || end != text.data() + text.size() - 1 || text.back() != ']') return {};
  return Indexed{text.substr(0, open), index};
}

class PlanReader {
 public:
  explicit PlanReader(const Circuit& native) : native_(native) {}

  Placed read() {
    Placed placed;
    placed.circuit = native_;
    placed.circuit.pragmas.clear();
    for (const std::string& pragma : native_.pragmas) {
      std::istringstream stream(pragma);
      std::string family, kind, first, second;
      stream >> family >> kind >> first >> second;
      if (family != "isinglass") {
        placed.circuit.pragmas.push_back(pragma);
      } else if (kind == "name") {
        rename(placed.circuit, first, second);
      } else if (kind == "start") {
        add_qubit(pragma, first);
        start_.push_back(ion(pragma, second));
      } else if (kind == "end") {
        ends_.emplace_back(first, ion(pragma, second));
      }
    }
    if (start_.empty()) {
      throw Failure(Exit::source_at_fault,
                    "this program has no isinglass pragmas: a plan is what compile wrote");
    }
    placed.circuit.registers = registers_;
    placed.circuit.source_qubits = static_cast<std::uint32_t>(start_.size());
    placed.circuit.end_wire.assign(start_.size(), no_bit);
    for (const auto& [name, where] : ends_) {
      const auto found = std::find(names_.begin(), names_.end(), name);
      if (found == names_.end())
        throw Failure(Exit::source_at_fault, "no pragma says where " + name + " starts");
      placed.circuit.end_wire[static_cast<std::size_t>(found - names_.begin())] = native_.end_wire[where];
    }
    for (std::size_t q = 0; q < names_.size(); ++q) {
      if (placed.circuit.end_wire[q] == no_bit) {
        throw Failure(Exit::source_at_fault, "no pragma says where " + names_[q] + " ends");
      }
    }
    placed.start = start_;
    placed.in_use = used(placed);
    return placed;
  }

 private:
  std::uint32_t ion(const std::string& pragma, const std::string& text) const {
    const auto where = indexed(text);
    if (!where || !where->index || *where->index >= native_.wires) {
      throw Failure(Exit::source_at_fault, "pragma " + pragma + ": the program has no ion of that name");
    }
    return *where->index;
  }

  /// What the source called `source` is `name` in this program. Values files use the names of the source.
  static void rename(Circuit& circuit, const std::string& source, const std::string& name) {
    for (Input& input : circuit.inputs) {
      if (input.name == name) input.source = source;
    }
    for (Variable& variable : circuit.variables) {
      if (variable.name == name) variable.source = source;
    }
  }

  /// Qubits come register by register, each from 0 on: the order in which the program was written.
  void add_qubit(const std::string& pragma, const std::string& text) {
    const auto qubit = indexed(text);
    const auto wire = static_cast<std::uint32_t>(names_.size());
    names_.push_back(text);
    const bool opens = qubit && qubit->index.value_or(0) == 0;
    const bool follows = qubit && qubit->index && !registers_.empty() &&
                         registers_.back().name == qubit->name && registers_.back().size == *qubit->index;
    if (follows && *qubit->index > 0) {
      ++registers_.back().size;
    } else if (opens) {
      registers_.push_back({qubit->name, wire, 1, !qubit->index});
    } else {
      throw Failure(Exit::source_at_fault,
                    "pragma " + pragma + ": qubits are named in the order of their registers");
    }
  }

  static std::vector<bool> used(const Placed& placed) {
    std::vector<bool> used(placed.circuit.wires);
    for (const auto where : placed.start) used[where] = true;
    for (const auto where : placed.circuit.end_wire) used[where] = true;
    for (const Block& block : placed.circuit.blocks) {
      for (const Operation& op : block) {
        for (const auto wire : placed.circuit.operands(op)) used[wire] = true;
      }
    }
    return used;
  }

  const Circuit& native_;
  std::vector<Register> registers_;
  std::vector<std::string> names_;
  std::vector<std::uint32_t> start_;
  std::vector<std::pair<std::string, std::uint32_t>> ends_;
};

}  // namespace

Placed plan_of(const Circuit& native) {
  return PlanReader(native).read();
}

}  // namespace isinglass
