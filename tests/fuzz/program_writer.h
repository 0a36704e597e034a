// Turns bytes into an OpenQASM 3 program: each byte is one choice in a derivation. Most programs are right,
// for names are declared before use and used by their kind; some choices go astray on purpose.
#pragma once

#include <cstddef>
#include <cstdint>
#include <string>
#include <vector>

namespace isinglass::fuzz {

class ProgramWriter {
 public:
  ProgramWriter(const std::uint8_t* bytes, std::size_t size) : bytes_(bytes), size_(size) {}

  std::string program() {
    text_ = "OPENQASM 3.1;\ninclude \"stdgates.inc\";\n";
    while (!exhausted() && text_.size() < longest) declaration();
    while (!exhausted() && text_.size() < longest) statement(0);
    return text_;
  }

 private:
  static constexpr std::size_t longest = 4000;
  static constexpr int deepest = 5;

  struct Named {
    std::string name;
    unsigned size = 0;  // of a register; 0 = scalar
    unsigned angles = 0;
  };

  bool exhausted() const { return at_ >= size_; }

  /// The next choice, from 0 to count - 1; 0 when the bytes are used up.
  unsigned choose(unsigned count) { return exhausted() ? 0 : bytes_[at_++] % count; }

  std::string pick(const std::vector<std::string>& words) {
    return words[choose(static_cast<unsigned>(words.size()))];
  }

  std::string pick(const std::vector<Named>& from, const char* otherwise) {
    return from.empty() ? otherwise : from[choose(static_cast<unsigned>(from.size()))].name;
  }

  std::string fresh(const char* stem) { return stem + std::to_string(++names_); }

  void declaration() {
    switch (choose(16)) {
      case 0:
      case 1: {
        const unsigned size = choose(5);
        qubits_.push_back({fresh("q"), size});
        text_ += "qubit" + width(size) + " " + qubits_.back().name + ";\n";
        break;
      }
      case 2:
      case 3: {
        const unsigned size = choose(6);
        bits_.push_back({fresh("c"), size});
        text_ +=
            "bit" + width(size) + " " + bits_.back().name + (choose(3) == 0 ? " = " + value(0) : "") + ";\n";
        break;
      }
      case 4:
        numbers_.push_back({fresh("n")});
        text_ +=
            "const " +
            pick({"int", "uint", "uint[8]", "int[16]", "float", "float[32]", "angle", "angle[8]", "bool"}) +
            " " + numbers_.back().name + " = " + value(0) + ";\n";
        break;
      case 5:
      case 6:
        numbers_.push_back({fresh("v")});
        text_ += type() + " " + numbers_.back().name + " = " + value(0) + ";\n";
        break;
      case 7:
        numbers_.push_back({fresh("t")});
        text_ += "input " + pick({"float", "angle", "angle[16]", "int", "bool", "bit[3]"}) + " " +
                 numbers_.back().name + ";\n";
        break;
      case 8:
        text_ +=
            "let " + fresh("al") + " = " + operand() + (choose(2) == 0 ? " ++ " + operand() : "") + ";\n";
        if (choose(4) > 0) qubits_.push_back({"al" + std::to_string(names_), 2});
        break;
      case 9:
      case 10:
        gate();
        break;
      case 11:
        subroutine();
        break;
      case 12:
        arrays_.push_back({fresh("arr")});
        text_ += "array[" + pick({"int[8]", "float", "uint", "angle[4]", "bool"}) + ", 2" +
                 pick({"", ", 3"}) + "] " + arrays_.back().name +
                 pick({"", " = {{1, 2, 3}, {4, 5, 6}}", " = {1, 2}"}) + ";\n";
        break;
      case 13:
        numbers_.push_back({fresh("d")});
        text_ += pick({"duration ", "const duration ", "stretch "}) + numbers_.back().name +
                 pick({" = 100ns", " = 2 * 1.5us", "", " = durationof({ })"}) + ";\n";
        break;
      case 14:
        text_ +=
            pick({"pragma keep this\n", "@note here\n", "extern ex(int) -> int;\n", "output bit[2] out;\n"});
        break;
      default:
        statement(0);
    }
  }

  void gate() {
    const std::string name = fresh("g");
    const unsigned angles = choose(3);
    const unsigned arity = 1 + choose(3);
    std::vector<Named> outer_qubits = std::move(qubits_);
    std::vector<Named> outer_numbers = numbers_;
    qubits_.clear();
    text_ += "gate " + name + "(";
    for (unsigned i = 0; i < angles; ++i) {
      numbers_.push_back({"p" + std::to_string(i)});
      text_ += (i > 0 ? ", p" : "p") + std::to_string(i);
    }
    text_ += ") ";
    for (unsigned i = 0; i < arity; ++i) {
      qubits_.push_back({"a" + std::to_string(i)});
      text_ += (i > 0 ? ", a" : "a") + std::to_string(i);
    }
    text_ += " {";
    for (unsigned i = choose(4); i > 0; --i) choose(8) == 0 ? statement(2) : gate_call();
    text_ += "}\n";
    qubits_ = std::move(outer_qubits);
    numbers_ = std::move(outer_numbers);
    gates_.push_back({name, arity, angles});
  }

  void subroutine() {
    const std::string name = fresh("f");
    text_ += "def " + name + "(" +
             pick({"", "int k", "qubit z", "qubit[2] z, float k", "readonly array[int[8], #dim = 1] z"}) +
             ")" + pick({"", " -> int", " -> bit", " -> float[32]"}) + " {";
    for (unsigned i = choose(4); i > 0; --i) statement(2);
    text_ += pick({"", "return 1;", "return;", "return measure z;", "return k + 1;"}) + "}\n";
    subroutines_.push_back({name});
  }

  void statement(int depth) {
    const unsigned kinds = depth < deepest ? 22 : 10;
    switch (choose(kinds)) {
      case 0:
      case 1:
      case 2:
        gate_call();
        break;
      case 3:
        text_ += pick(bits_, "c") + index() + " = measure " + operand() + ";\n";
        break;
      case 4:
        text_ += "measure " + operand() + pick({"", " -> " + bit()}) + ";\n";
        break;
      case 5:
        text_ += pick({"reset " + operand(), "barrier", "barrier " + operand(), "nop",
                       "delay[10ns] " + operand(), "delay[" + value(3) + "] " + operand()}) +
                 ";\n";
        break;
      case 6:
        text_ += pick(numbers_, "n") + pick({"", "", index()}) +
                 pick({" = ", " += ", " -= ", " *= ", " /= ", " %= ", " **= ", " &= ", " |= ", " ^= ",
                       " <<= ", " >>= "}) +
                 value(0) + ";\n";
        break;
      case 7:
        text_ += pick(arrays_, "arr") + index() + pick({"", index()}) + " = " + value(0) + ";\n";
        break;
      case 8:
        text_ += pick({"break", "continue", "end", "return", "return " + value(2)}) + ";\n";
        break;
      case 9:
        text_ += pick({"", pick(numbers_, "n") + " = "}) + pick(subroutines_, "f") + "(" +
                 pick({"", value(2), operand(), operand() + ", " + value(2), pick(arrays_, "arr")}) + ");\n";
        break;
      case 10:
      case 11:
        text_ += "if (" + condition() + ") ";
        body(depth);
        if (choose(2) == 0) {
          text_ += " else ";
          body(depth);
        }
        break;
      case 12:
      case 13: {
        numbers_.push_back({fresh("i")});
        text_ += "for " + pick({"int", "uint", "uint[4]", "bit", "float", "angle[4]"}) + " " +
                 numbers_.back().name + " in " +
                 pick({"[0:2]", "{1, 2, 5}", "[" + value(3) + ":" + value(3) + "]", "[3:-1:0]",
                       pick(bits_, "c"), pick(arrays_, "arr"), "{" + value(2) + "}"}) +
                 " ";
        body(depth);
        break;
      }
      case 14:
        text_ += "while (" + condition() + ") ";
        body(depth);
        break;
      case 15:
        text_ += "switch (" + value(2) + ") { case 0, 1 ";
        block(depth);
        if (choose(2) == 0) {
          text_ += " case 2 ";
          block(depth);
        }
        if (choose(2) == 0) {
          text_ += " default ";
          block(depth);
        }
        text_ += "}\n";
        break;
      case 16:
        text_ += pick({"box ", "box[1ms] ", "box[" + value(3) + "] ", ""});
        block(depth);
        break;
      case 17:
      case 18:
        numbers_.push_back({fresh("w")});
        text_ += type() + " " + numbers_.back().name + pick({"", " = " + value(0)}) + ";\n";
        break;
      case 19:
        text_ += pick(
            {"cal { x }\n", "defcal x $0 { }\n", "h $0;\n", "include \"stdgates.inc\";\n", "x q\n", "(;\n"});
        break;
      default:
        gate_call();
    }
  }

  void body(int depth) {
    if (choose(3) == 0) {
      statement(depth + 1);
    } else {
      block(depth);
    }
  }

  void block(int depth) {
    text_ += "{ ";
    for (unsigned i = choose(4); i > 0; --i) statement(depth + 1);
    text_ += "} ";
  }

  void gate_call() {
    static const std::vector<Named> library = {
        {"h", 1},  {"x", 1},     {"cx", 2},    {"rz", 1, 1}, {"rx", 1, 1}, {"p", 1, 1},  {"s", 1},
        {"sx", 1}, {"swap", 2},  {"ccx", 3},   {"cp", 2, 1}, {"U", 1, 3},  {"cu", 2, 4}, {"crz", 2, 1},
        {"id", 1}, {"cswap", 3}, {"u2", 1, 2}, {"ch", 2},    {"tdg", 1},   {"y", 1},     {"gphase", 0, 1}};
    const bool own = !gates_.empty() && choose(3) == 0;
    const std::vector<Named>& from = own ? gates_ : library;
    const Named& gate = from[choose(static_cast<unsigned>(from.size()))];
    unsigned operands = gate.size;
    for (unsigned i = choose(8); i > 5; --i) {
      const unsigned controls = 1 + choose(2);
      text_ += pick({"inv @ ", "pow(2) @ ", "pow(" + value(2) + ") @ ", "ctrl @ ", "negctrl @ "});
      if (text_.ends_with("trl @ ")) ++operands;
      if (controls == 2 && choose(4) == 0) {
        text_ += "ctrl(2) @ ";
        operands += 2;
      }
    }
    text_ += gate.name;
    if (gate.angles > 0) {
      text_ += "(";
      for (unsigned i = 0; i < gate.angles; ++i) text_ += (i > 0 ? ", " : "") + value(1);
      text_ += ")";
    }
    for (unsigned i = 0; i < operands; ++i) text_ += (i > 0 ? ", " : " ") + operand();
    text_ += ";\n";
  }

  std::string width(unsigned size) { return size == 0 ? "" : "[" + std::to_string(size) + "]"; }

  std::string type() {
    return pick({"int", "int[8]", "uint", "uint[4]", "float", "float[32]", "angle", "angle[6]", "bool", "bit",
                 "bit[4]", "complex", "complex[float[64]]", "duration"});
  }

  std::string operand() {
    if (qubits_.empty()) return "q";
    const Named& one = qubits_[choose(static_cast<unsigned>(qubits_.size()))];
    const unsigned form = choose(12);
    if (one.size == 0 || form == 0) return one.name;
    if (form == 1) return one.name + index();
    return one.name + "[" + std::to_string(choose(one.size)) + "]";
  }

  std::string bit() { return pick(bits_, "c") + pick({"", "[0]", "[1]", index()}); }

  std::string index() {
    return "[" +
           pick({"0", "1", "2", "-1", "0:1", "0:2:3", "{0, 1}", "1:", ":", "-2:-1", value(3),
                 value(4) + ":" + value(4)}) +
           "]";
  }

  std::string condition() {
    return pick({"true", bit() + " == 1", bit(), "!" + bit(),
                 value(2) + pick({" < ", " == ", " != ", " >= "}) + value(2), "false"});
  }

  std::string value(int depth) {
    const bool leaf = depth >= deepest;
    switch (choose(leaf ? 6 : 14)) {
      case 0:
        return pick({"0", "1", "2", "3", "5", "0.5", "1e-3", "2.", "true", "false"});
      case 1:
        return pick({"pi", "pi/2", "-pi/4", "tau", "euler", "1/2", "0x1F", "0b101", "\"0110\"", "\"1\"",
                     "2im", "10ns", "1267650600228229401496703205376", "-1"});
      case 2:
      case 3:
      case 4:
        return pick(numbers_, "n");
      case 5:
        return bit();
      case 6:
      case 7:
      case 8:
        return value(depth + 1) +
               pick({" + ", " - ", " * ", " / ", " % ", " ** ", " & ", " | ", " ^ ", " << ", " >> ", " && ",
                     " || ", " == ", " < ", " ++ "}) +
               value(depth + 1);
      case 9:
        return pick({"-", "~", "!"}) + value(depth + 1);
      case 10:
        return "(" + value(depth + 1) + ")";
      case 11:
        return type() + "(" + value(depth + 1) + ")";
      case 12:
        return pick({"sin", "cos", "sqrt", "exp", "log", "floor", "ceiling", "arctan", "popcount", "real",
                     "imag", "sizeof"}) +
               "(" + value(depth + 1) + ")";
      default:
        return pick({"mod(", "rotl(", "rotr(", "sizeof(", "pow("}) + value(depth + 1) + ", " +
               value(depth + 1) + ")";
    }
  }

  const std::uint8_t* bytes_;
  std::size_t size_;
  std::size_t at_ = 0;
  std::string text_;
  unsigned names_ = 0;
  std::vector<Named> qubits_, bits_, numbers_, arrays_, gates_, subroutines_;
};

}  // namespace isinglass::fuzz
