// Placement pragmas and the renumbering they ask for; see native.h.
#include "verify/native.h"

#include <fmt/format.h>

#include <algorithm>
#include <optional>
#include <sstream>

#include "circuit/message.h"

namespace isinglass {

namespace {

constexpr std::uint32_t nowhere = ~std::uint32_t(0);

[[noreturn]] void fail(const std::string& text) {
  throw Failure(Exit::source_at_fault, text);
}

/// The wire that a circuit writes as `q[3]` or, for a scalar, `q`.
std::optional<std::uint32_t> wire_named(const Circuit& circuit, const std::string& name) {
  const std::size_t open = name.find('[');
  for (const Register& reg : circuit.registers) {
    if (reg.is_scalar && reg.name == name) return reg.first;
    if (open == std::string::npos || reg.name != name.substr(0, open) || name.back() != ']') continue;
    const std::string digits = name.substr(open + 1, name.size() - open - 2);
    if (digits.empty() || digits.size() > 9 || digits.find_first_not_of("0123456789") != std::string::npos)
      continue;
    const auto index = static_cast<std::uint32_t>(std::stoul(digits));
    if (index < reg.size) return reg.first + index;
  }
  return {};
}

/// The words after `isinglass` in a pragma of ours.
std::vector<std::string> words_of(const std::string& pragma) {
  std::istringstream stream(pragma);
  std::vector<std::string> words;
  for (std::string word; stream >> word;) words.push_back(word);
  if (!words.empty() && (words[0] == "pragma" || words[0] == "#pragma")) words.erase(words.begin());
  if (words.empty() || words[0] != "isinglass") return {};
  words.erase(words.begin());
  return words;
}

Circuit rewired(const Circuit& placed, std::span<const std::uint32_t> start,
                std::span<const std::uint32_t> end, const Circuit& source) {
  std::vector<std::uint32_t> number(placed.wires, nowhere);
  for (std::uint32_t q = 0; q < source.source_qubits; ++q) number[start[q]] = q;
  std::uint32_t next = source.source_qubits;
  for (std::uint32_t& n : number) {
    if (n == nowhere) n = next++;
  }
  Circuit result = placed;
  for (Block& block : result.blocks) {
    for (Operation& op : block) {
      std::vector<std::uint32_t> operands;
      for (const auto w : result.operands(op)) operands.push_back(number[w]);
      result.set_operands(op, operands);
    }
  }
  result.registers = source.registers;
  result.source_qubits = source.source_qubits;
  result.wires = next;
  result.end_wire.clear();
  for (const auto ion : end) result.end_wire.push_back(number[ion]);
  return result;
}

/// What the pragmas of one kind say, by source qubit.
struct Places {
  std::string kind;
  std::vector<std::uint32_t> ion;
  std::vector<bool> is_taken;

  Places(std::string kind_, const Circuit& source, const Circuit& native)
      : kind(std::move(kind_)), ion(source.source_qubits, nowhere), is_taken(native.wires) {}

  void add(const Circuit& source, const Circuit& native, const std::vector<std::string>& words) {
    const std::string text = fmt::format("pragma isinglass {}", fmt::join(words, " "));
    if (words.size() != 3) fail(text + ": expected a qubit of the source and an ion");
    const auto qubit = wire_named(source, words[1]);
    if (!qubit) fail(fmt::format("{}: the source has no qubit {}", text, words[1]));
    const auto wire = wire_named(native, words[2]);
    if (!wire) fail(fmt::format("{}: the compiled program has no ion {}", text, words[2]));
    if (ion[*qubit] != nowhere) fail(fmt::format("{}: {} has a place already", text, words[1]));
    if (is_taken[*wire]) fail(fmt::format("{}: {} is taken already", text, words[2]));
    ion[*qubit] = *wire;
    is_taken[*wire] = true;
  }

  void check_complete(const Circuit& source) const {
    const auto missing = std::find(ion.begin(), ion.end(), nowhere);
    if (missing == ion.end()) return;
    const auto qubit = static_cast<std::uint32_t>(missing - ion.begin());
    fail(fmt::format(
        "the compiled program does not say where {} {}s: a line `pragma isinglass {} {} ...` is missing",
        source.wire_name(qubit), kind, kind, source.wire_name(qubit)));
  }
};

void rename(Circuit& circuit, const std::vector<std::string>& words) {
  if (words.size() != 3) fail("pragma isinglass name: expected a name in the source and one in this program");
  for (Variable& variable : circuit.variables) {
    if (variable.name != words[2]) continue;
    variable.source = words[1];
    return;
  }
  for (Input& input : circuit.inputs) {
    if (input.name != words[2]) continue;
    input.source = words[1];
    return;
  }
  fail("pragma isinglass name: the compiled program has no variable " + words[2]);
}

}  // namespace

Circuit on_source_wires(const Circuit& placed, std::span<const std::uint32_t> start, const Circuit& source) {
  return rewired(placed, start, placed.end_wire, source);
}

Circuit on_source_wires(const Circuit& native, const Circuit& source) {
  Places start("start", source, native);
  Places end("end", source, native);
  Circuit renamed = native;
  bool is_ours = false;
  for (const std::string& pragma : native.pragmas) {
    const auto words = words_of(pragma);
    if (words.empty()) continue;
    is_ours = true;
    if (words[0] == "start") {
      start.add(source, native, words);
    } else if (words[0] == "end") {
      end.add(source, native, words);
    } else if (words[0] == "name") {
      rename(renamed, words);
    } else {
      fail("pragma isinglass " + words[0] + ": not known");
    }
  }
  if (!is_ours) {
    if (native.source_qubits != source.source_qubits) {
      fail(fmt::format("the compiled program has {} qubits, the source {}, and no pragma says which is which",
                       native.source_qubits, source.source_qubits));
    }
    return native;
  }
  start.check_complete(source);
  end.check_complete(source);
  // The reader may itself have renamed swaps.
  for (auto& ion : end.ion) ion = native.end_wire[ion];
  return rewired(renamed, start.ion, end.ion, source);
}

}  // namespace isinglass
