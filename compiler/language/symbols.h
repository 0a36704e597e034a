// What names stand for, and which of them are seen where.
#pragma once

#include <cstdint>
#include <memory>
#include <string>
#include <string_view>
#include <unordered_map>
#include <vector>

#include "language/gate.h"
#include "language/syntax.h"
#include "language/value.h"

namespace isinglass {

inline constexpr std::uint32_t no_variable = 0xffffffffu;
inline constexpr std::uint32_t most_qubits = 1'000'000;  // of a program, and of the machines it may name

struct Symbol;

/// One bit or one array cell that an alias names.
struct Part {
  Symbol* symbol = nullptr;
  std::uint32_t cell = 0;
  std::uint32_t bit = 0;
};

/// What a declared name stands for. A plain record: which fields count depends on the kind.
struct Symbol {
  enum class Kind : std::uint8_t {
    constant,    // type, cells
    variable,    // type, cells or native variable
    input,       // type, cells (values over the circuit's inputs)
    alias,       // of classical bits or cells: parts
    qubits,      // wires
    gate,        // gate
    subroutine,  // definition
    external,    // definition_of_extern
    broken,      // its declaration was an error: uses are not reported again
  };
  Kind kind = Kind::broken;
  std::string name;
  syntax::Span at;

  // Classical.
  Type type;
  std::vector<std::uint32_t> shape;  // of an array; empty for a scalar
  std::vector<Value> cells;          // one for a scalar; known, affine or an expression
  bool runs = false;                 // the value lives in the native variable; cells are stale
  bool is_set = false;               // something was assigned
  bool was_native = false;           // a native variable held it once
  bool is_global = false;
  bool is_readonly = false;
  bool is_output = false;
  std::vector<bool> set_bits;  // of a register: which bits something was assigned to
  std::uint32_t variable = no_variable;
  std::uint32_t block = 0;            // of the circuit, in which it was declared
  const void* declaration = nullptr;  // the syntax it came from: a native variable is used again
  std::vector<Part> parts;
  bool parts_are_bits = true;

  // Quantum.
  std::vector<std::uint32_t> wires;
  bool is_scalar = false;

  // Callable.
  const GateTemplate* gate = nullptr;
  std::vector<Expression> derived;  // of a gate: expressions in its parameters, used as further parameters
  bool is_library = false;
  bool is_opaque = false;
  const syntax::Subroutine* definition = nullptr;
  const syntax::Extern* extern_definition = nullptr;

  bool is_array() const { return !shape.empty(); }
  bool is_callable() const {
    return kind == Kind::gate || kind == Kind::subroutine || kind == Kind::external;
  }
};

/// Nested scopes. Depth 0 holds the built-in names, depth 1 the global scope.
class Scopes {
 public:
  Scopes() : levels_(1) {}

  void open() { levels_.emplace_back(); }
  void close();
  std::size_t depth() const { return levels_.size() - 1; }

  /// Adds a symbol to the innermost scope, hiding outer ones.
  Symbol& add(Symbol symbol);
  /// Lets a name of the innermost scope stand for a symbol that lives elsewhere (a reference).
  void bind(const std::string& name, Symbol& symbol);

  /// Adds a symbol that lives elsewhere to the outermost level, for all scopes.
  Symbol& add_everywhere(Symbol& symbol);

  /// The symbol that a name stands for here, or null. Within a gate or def (see frame) only its own scopes
  /// and global constants and callables are seen.
  Symbol* find(std::string_view name) const;
  /// The same without that rule.
  Symbol* find_anywhere(std::string_view name) const;
  /// The symbol of that name in the innermost scope.
  Symbol* find_innermost(std::string_view name) const;
  /// The visible name that is one slip away from this one; empty if none is.
  std::string similar(std::string_view name, bool callable) const;

  /// The depth at which the body of the running gate or def begins; 0 outside.
  std::size_t frame = 0;

  /// The symbols of the global scope, in order of declaration.
  std::vector<Symbol*> globals() const;
  /// The symbols of the innermost scope, in order of declaration.
  const std::vector<std::unique_ptr<Symbol>>& innermost() const { return levels_.back().owned; }

 private:
  struct Binding {
    Symbol* symbol;
    std::size_t depth;
  };
  struct Level {
    std::vector<std::unique_ptr<Symbol>> owned;
    std::vector<std::vector<Binding>*> bound;
  };
  struct Hash {
    using is_transparent = void;
    std::size_t operator()(std::string_view text) const { return std::hash<std::string_view>{}(text); }
  };
  bool sees(const Binding& binding) const;

  std::vector<Level> levels_;
  std::unordered_map<std::string, std::vector<Binding>, Hash, std::equal_to<>> names_;
};

}  // namespace isinglass
