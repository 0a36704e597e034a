// The tests' own reading and running of OpenQASM 3 programs, sources and compiled ones alike. It shares no
// code with the compiler: own parser, own values, own matrices (simulator.h), every measurement outcome
// followed.
//
// It covers what compiled programs and the tests' sources are made of: the standard gate library, gate
// definitions with modifiers, qubit, bit, bool, int, uint, float and angle variables up to 64 bits, inputs,
// measure, reset, barrier, delay, if, while, for, switch, break, continue, end. Anything else throws
// std::runtime_error.
#pragma once

#include <map>
#include <memory>
#include <string>
#include <vector>

#include "support/simulator.h"

namespace isinglass::support {

struct Syntax;  // the parsed program

/// A program that can be run many times.
class Program {
 public:
  explicit Program(const std::string& text);

  /// Qubits in the order of their declarations: "q[0]", "q[1]", "a".
  const std::vector<std::string>& qubits() const { return qubits_; }
  const std::vector<std::string>& pragmas() const { return pragmas_; }
  const Syntax& syntax() const { return *syntax_; }

 private:
  std::shared_ptr<const Syntax> syntax_;
  std::vector<std::string> qubits_;
  std::vector<std::string> pragmas_;
};

/// Where the qubits that count are among a program's own: by index of the program's qubits.
struct Placement {
  std::vector<std::size_t> start;
  std::vector<std::size_t> end;
  std::map<std::string, std::string>
      names;  // of renamed variables: name in the program to name in the source
};

/// What the pragmas of a compiled program say about the qubits of its source.
Placement placement_of(const Program& compiled, const Program& source);

/// One path through a program's measurements.
struct Path {
  std::string bits;               // values of all classical variables but inputs, by name: "b=01;c=1;"
  State state;                    // not normalized; wires above the program's own are references
  std::vector<bool> is_measured;  // by wire: whether its last act was a measurement
};

struct RunOptions {
  std::map<std::string, double> inputs;
  /// Every source qubit starts as half of a Bell pair with a reference wire; else in |0>.
  bool with_references = false;
  double least_weight = 1e-14;  // paths of less weight are left out
};

/// All paths. start[k]: the wire on which the k-th qubit that counts starts.
std::vector<Path> run(const Program& program, const std::vector<std::size_t>& start,
                      const RunOptions& options, const std::map<std::string, std::string>& names = {});

/// What a program without measurements does to the qubits that count; entries of anything that leaves another
/// qubit out of |0> are missing, so that such a program is not unitary.
Matrix unitary(const Program& program, const Placement& placement,
               const std::map<std::string, double>& inputs = {});

/// How far the compiled program is from its source: the largest difference of an entry of the density
/// matrices of the kept qubits given the bits (weighted by the probability of the bits). Variables that the
/// source does not have are summed over. With bits_only the probabilities alone.
double difference(const Program& source, const Program& compiled, const RunOptions& options = {},
                  bool bits_only = false);

/// The same for two texts.
double difference(const std::string& source, const std::string& compiled, const RunOptions& options = {},
                  bool bits_only = false);

}  // namespace isinglass::support
