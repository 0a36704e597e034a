// The classical side of a running program: values of its variables and what statements do to them.
//
// It covers bits, bit registers, bool, int, uint, float and angle up to 64 bits, and arrays of them. Anything
// else (extern calls, complex numbers, durations) throws Unsupported: the caller then says that it cannot
// decide.
#pragma once

#include <cstdint>
#include <span>
#include <stdexcept>
#include <string>
#include <vector>

#include "circuit/circuit.h"

namespace isinglass {

struct Unsupported : std::runtime_error {
  using std::runtime_error::runtime_error;
};

/// One scalar. Integers, bits and angles are patterns in the low `width` bits of `whole`.
struct Value {
  enum class Type : std::uint8_t { boolean, bits, integer, natural, real, angle };
  Type type = Type::boolean;
  unsigned width = 1;
  std::uint64_t whole = 0;
  double real = 0;
  bool operator==(const Value&) const = default;
};

/// The value as a number; angles in radians.
double number(const Value& value);
bool truth(const Value& value);
/// The value brought to a type (and width) by the standard's casts.
Value cast(const Value& value, Value::Type type, unsigned width);

/// The variables of one run of a circuit. Everything starts as zero, as this compiler chooses.
class Memory {
 public:
  /// inputs[i] is the value of input i; it must outlive the memory, as must the circuit.
  Memory(const Circuit& circuit, std::span<const double> inputs);

  void set_bit(std::uint32_t flat_bit, bool value) { bits_[flat_bit] = value; }

  Value evaluate(const Expression& expression) const;
  /// assign and call; the kinds that steer the flow are the caller's.
  void run(const ClassicalStatement& statement);
  /// The values that a `for` goes through.
  std::vector<Value> round_values(const Expression& set) const;
  void set_variable(std::uint32_t variable, const Value& value);

  /// The bytes of the named variables, for telling runs apart.
  std::string key(std::span<const std::uint32_t> variables) const;
  /// Whether all variables have the same values; both of the same circuit and inputs.
  bool operator==(const Memory& other) const { return bits_ == other.bits_ && slots_ == other.slots_; }

 private:
  struct Slot {
    Value::Type type = Value::Type::boolean;
    unsigned width = 1;
    std::vector<std::uint32_t> shape;  // of an array
    std::vector<Value> values;         // one, or all elements of an array; none for bit variables
    bool operator==(const Slot&) const = default;
  };

  Value get(std::uint32_t variable) const;
  std::size_t element(const Slot& slot, std::span<const Expression> indices) const;
  std::vector<unsigned> positions(const Expression& index, unsigned width) const;
  void assign(const Expression& target, const Value& value);

  const Circuit* circuit_;
  std::span<const double> inputs_;
  std::vector<bool> bits_;
  std::vector<Slot> slots_;
};

/// Values of all inputs where those that are declared have the given values: derived ones are evaluated.
std::vector<double> with_derived(const Circuit& circuit, std::vector<double> declared);

}  // namespace isinglass
