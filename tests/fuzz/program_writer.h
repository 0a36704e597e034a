// Turns bytes into an OpenQASM 3 program: each byte is one choice in a derivation. Most programs are right,
// for names are declared before use and used by their kind; some choices go astray on purpose.
#pragma once

#include <cstddef>
#include <cstdint>
#include <string>
#include <utility>
#include <vector>

namespace isinglass::fuzz {

class ProgramWriter {
 public:
  ProgramWriter(const std::uint8_t* bytes, std::size_t size) : bytes_(bytes), size_(size) {}

  std::string program() {
    text_ =
        "OPENQASM 3.1;\ninclude \"stdgates.inc\";\nqubit[4] q;\nbit[4] c;\nint n = 3;\nfloat t = "
        "0.25;\nextern ex(int) -> uint[5];\n";
    qubits_ = {{"q", 4}};
    bits_ = {{"c", 4}};
    wholes_ = {{"n"}};
    reals_ = {{"t"}};
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
            "bit" + width(size) + " " + bits_.back().name + (choose(6) == 1 ? " = " + value(0) : "") + ";\n";
        break;
      }
      case 4: {
        const auto variables = std::exchange(wholes_, {});  // a constant sees none
        const std::string expression = whole(2);
        wholes_ = variables;
        wholes_.push_back({fresh("n")});
        text_ += "const " + pick({"int", "uint", "uint[8]", "int[16]"}) + " " + wholes_.back().name + " = " +
                 expression + ";\n";
        break;
      }
      case 5: {
        const auto variables = std::exchange(reals_, {});
        const auto integers = std::exchange(wholes_, {});
        const bool outside = std::exchange(may_run_, false);
        const std::string expression = real(2);
        may_run_ = outside;
        reals_ = variables;
        wholes_ = integers;
        reals_.push_back({fresh("e")});
        text_ += "const " + pick({"float", "float[32]", "angle", "angle[8]"}) + " " + reals_.back().name +
                 " = " + expression + ";\n";
        break;
      }
      case 6:
        variable();
        break;
      case 7:
        reals_.push_back({fresh("t")});
        text_ += "input " + pick({"float", "angle", "angle[16]"}) + " " + reals_.back().name + ";\n";
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
        times_.push_back({fresh("d")});
        text_ += pick({"duration ", "const duration ", "stretch ", "stretch "}) + times_.back().name +
                 pick({" = 100ns", " = 2 * 1.5us", "", "", " = durationof({ cx q[0], q[1]; })"}) + ";\n";
        break;
      case 14:
        text_ += pick(
            {"pragma keep this\n", "@note here\n", "extern ey(int) -> float;\n", "output bit[2] out;\n"});
        break;
      default:
        statement(0);
    }
  }

  /// A classical variable; now and then of a type that its value does not fit.
  void variable() {
    if (choose(6) == 1) {
      numbers_.push_back({fresh("w")});
      text_ += type() + " " + numbers_.back().name + pick({"", " = " + value(1)}) + ";\n";
    } else if (choose(2) == 0) {
      const std::string expression = whole(1);
      wholes_.push_back({fresh("v")});
      text_ +=
          pick({"int ", "uint ", "int[8] ", "uint[4] "}) + wholes_.back().name + " = " + expression + ";\n";
    } else {
      const std::string expression = real(1);
      reals_.push_back({fresh("v")});
      text_ += pick({"float ", "float[64] ", "angle ", "angle[6] "}) + reals_.back().name + " = " +
               expression + ";\n";
    }
  }

  void gate() {
    const std::string name = fresh("g");
    const unsigned angles = choose(3);
    const unsigned arity = 1 + choose(3);
    std::vector<Named> outer_qubits = std::move(qubits_);
    std::vector<Named> outer_reals = std::exchange(reals_, {});
    qubits_.clear();
    may_run_ = false;
    text_ += "gate " + name + "(";
    for (unsigned i = 0; i < angles; ++i) {
      reals_.push_back({"p" + std::to_string(i)});
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
    reals_ = std::move(outer_reals);
    may_run_ = true;
    gates_.push_back({name, arity, angles});
  }

  void subroutine() {
    const ProgramWriter outside = *this;  // its names come back at the end
    qubits_ = bits_ = wholes_ = reals_ = numbers_ = arrays_ = times_ = {};
    may_run_ = false;
    const std::string name = fresh("f");
    text_ += "def " + name + "(" +
             pick({"", "int k", "qubit z", "qubit[2] z, float k", "readonly array[int[8], #dim = 1] z"}) +
             ")" + pick({"", " -> int", " -> bit", " -> float[32]"}) + " {";
    for (unsigned i = choose(4); i > 0; --i) statement(2);
    text_ += pick({"", "return 1;", "return;", "return measure z;", "return k + 1;"}) + "}\n";
    restore(outside);
    subroutines_.push_back({name});
  }

  void statement(int depth) {
    if (choose(24) == 23) text_ += pick({"@note here\n", "@a.b\n"});
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
                       "delay[" + time() + "] " + operand(), "delay[" + time() + "] " + operand(),
                       "delay[" + value(3) + "] " + operand()}) +
                 ";\n";
        break;
      case 6:
        assignment();
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
        wholes_.push_back({fresh("i")});
        text_ += "for " + pick({"int", "int", "uint", "uint[4]", "bit"}) + " " + wholes_.back().name +
                 " in " +
                 pick({"[0:2]", "{1, 2, 5}", "[" + whole(3) + ":" + whole(3) + "]", "[3:-1:0]",
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
        text_ += "switch (" + whole(3) + ") { case 0, 1 ";
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
        box(depth);
        break;
      case 17:
      case 18:
        variable();
        break;
      case 19:
        if (choose(4) != 1) break;
        text_ += pick(
            {"cal { x }\n", "defcal x $0 { }\n", "h $0;\n", "include \"stdgates.inc\";\n", "x q\n", "(;\n"});
        break;
      default:
        gate_call();
    }
  }

  /// A block, sometimes with stretches that are to fill it.
  void box(int depth) {
    text_ += pick({"box ", "box[1ms] ", "box[1ms] ", "box[" + time() + "] ", ""});
    if (choose(2) == 0) return block(depth);
    const ProgramWriter outside = *this;
    text_ += "{ ";
    for (unsigned i = choose(3); i > 0; --i) {
      times_.push_back({fresh("s")});
      text_ += "stretch " + times_.back().name + "; ";
    }
    for (unsigned i = choose(6); i > 0; --i) {
      if (choose(2) == 0) {
        text_ += "delay[" + time() + "] " + operand() + "; ";
      } else {
        statement(depth + 1);
      }
    }
    text_ += "} ";
    restore(outside);
  }

  void assignment() {
    switch (choose(4)) {
      case 0:
        text_ += pick(wholes_, "n") + pick({" = ", " += ", " -= ", " *= ", " %= "}) + whole(1) + ";\n";
        break;
      case 1:
        text_ += pick(reals_, "t") + pick({" = ", " += ", " -= ", " *= ", " /= "}) + real(1) + ";\n";
        break;
      case 2:
        text_ += bit() + pick({" = ", " = !", " |= ", " ^= "}) + bit() + ";\n";
        break;
      default:
        text_ += pick(numbers_, "n") + pick({"", "", index()}) +
                 pick({" = ", " += ", " /= ", " **= ", " &= ", " |= ", " ^= ", " <<= ", " >>= "}) + value(0) +
                 ";\n";
    }
  }

  void body(int depth) {
    if (choose(3) == 0) {
      statement(depth + 1);
    } else {
      block(depth);
    }
  }

  void restore(const ProgramWriter& outside) {
    qubits_ = outside.qubits_;
    bits_ = outside.bits_;
    wholes_ = outside.wholes_;
    reals_ = outside.reals_;
    numbers_ = outside.numbers_;
    arrays_ = outside.arrays_;
    times_ = outside.times_;
    may_run_ = outside.may_run_;
  }

  void block(int depth) {
    const ProgramWriter outside = *this;
    text_ += "{ ";
    for (unsigned i = choose(4); i > 0; --i) statement(depth + 1);
    text_ += "} ";
    restore(outside);
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
      for (unsigned i = 0; i < gate.angles; ++i) text_ += (i > 0 ? ", " : "") + real(2);
      text_ += ")";
    }
    const unsigned first = choose(4);
    const bool distinct = choose(8) != 1;
    for (unsigned i = 0; i < operands; ++i) {
      text_ += i > 0 ? ", " : " ";
      text_ += distinct ? distinct_operand(first + i) : operand();
    }
    text_ += ";\n";
  }

  std::string width(unsigned size) { return size == 0 ? "" : "[" + std::to_string(size) + "]"; }

  std::string type() {
    return pick({"int", "int[8]", "uint", "uint[4]", "float", "float[32]", "angle", "angle[6]", "bool", "bit",
                 "bit[4]", "complex", "complex[float[64]]", "duration"});
  }

  std::string operand() {
    if (choose(16) == 15) return pick({"$0", "$1", "$3"});
    if (qubits_.empty()) return pick({"$0", "$1", "$2"});
    const Named& one = qubits_[choose(static_cast<unsigned>(qubits_.size()))];
    const unsigned form = choose(12);
    if (one.size == 0 || form == 0) return one.name;
    if (form == 1) return one.name + index();
    return one.name + "[" + std::to_string(choose(one.size)) + "]";
  }

  std::string distinct_operand(unsigned k) {
    if (qubits_.empty()) return "$" + std::to_string(k % 4);
    if (qubits_[0].name == "q") return "q[" + std::to_string(k % 4) + "]";
    return qubits_[k % qubits_.size()].name;
  }

  std::string bit() { return pick(bits_, "c") + pick({"", "[0]", "[1]", index()}); }

  std::string index() {
    return "[" +
           pick({"0", "1", "2", "-1", "0:1", "0:2:3", "{0, 1}", "1:", ":", "-2:-1", value(3),
                 value(4) + ":" + value(4)}) +
           "]";
  }

  std::string condition() {
    if (choose(8) == 1) return value(2);
    return pick({"true", bit() + " == 1", bit(), "!" + bit(),
                 whole(3) + pick({" < ", " == ", " != ", " >= "}) + whole(3), "false"});
  }

  /// An expression of whole numbers.
  std::string whole(int depth) {
    const unsigned form = choose(depth >= deepest ? 6 : 9);
    if (form < 2) return pick({"0", "1", "2", "3", "5", "0x1F", "0b101", "-1"});
    if (form < 6) return pick(wholes_, "4");
    return whole(depth + 1) + pick({" + ", " - ", " * ", " % ", " / ", " ** "}) + whole(depth + 1);
  }

  /// An expression of floats and angles.
  std::string real(int depth) {
    const unsigned form = choose(depth >= deepest ? 6 : 10);
    if (form < 3) return pick({"pi", "pi/2", "-pi/4", "0.5", "1e-3", "2.", "tau", "1/2"});
    if (form < 6) return pick(reals_, "0.25");
    if (form == 9 && may_run_ && choose(2) == 0) {  // bits of the running program
      return pick({"c[0] * 0.3", "uint[4](c) * pi / 8", "angle[4](c)", "-angle[4](c)", "ex(1) * 0.1",
                   "pow(2, c[1])"});
    }
    if (form == 6) return pick({"sin(", "cos(", "sqrt(", "exp(", "arctan("}) + real(depth + 1) + ")";
    return real(depth + 1) + pick({" + ", " - ", " * ", " / "}) +
           (choose(3) == 0 ? whole(depth + 1) : real(depth + 1));
  }

  /// A duration.
  std::string time() {
    switch (choose(6)) {
      case 0:
        return pick({"10ns", "1.5us", "100dt", "0s"});
      case 1:
        return pick({"2 * ", "0.5 * ", "-1 * ", "3us - "}) + pick(times_, "7ns");
      case 2:
        return pick(times_, "7ns") + pick({" + ", " - "}) + pick(times_, "10us");
      default:
        return pick(times_, "20us");
    }
  }

  /// An expression of anything.
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
        return pick({"mod(", "rotl(", "rotr(", "sizeof("}) + value(depth + 1) + ", " + value(depth + 1) + ")";
    }
  }

  const std::uint8_t* bytes_;
  std::size_t size_;
  std::size_t at_ = 0;
  std::string text_;
  unsigned names_ = 0;
  bool may_run_ = true;  // whether values of the running program may stand here
  std::vector<Named> qubits_, bits_, wholes_, reals_, numbers_, arrays_, times_, gates_, subroutines_;
};

}  // namespace isinglass::fuzz
