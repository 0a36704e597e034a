// The reader: takes a program's statements one by one, runs what can be run while compiling, and builds the
// circuit. Only files of this room include this header; everybody else uses language.h.
//
// Every value is in one of three stages (see value.h): known, affine in the inputs, or an expression. Every
// variable either has a known value here or lives in a native variable of the running program ("runs").
// Before code whose path depends on running values is entered (an arm, a loop), all variables that it may
// assign are moved to native variables, so that both paths agree where they meet.
//
// The implementation is cut by topic: reader.cpp (statements in, messages), expressions.cpp, variables.cpp,
// gates.cpp, statements.cpp, flow.cpp, timing.cpp.
#pragma once

#include <deque>
#include <map>
#include <memory>
#include <optional>
#include <set>
#include <string>
#include <string_view>
#include <unordered_map>
#include <vector>

#include "language/language.h"
#include "language/parser.h"
#include "language/source.h"
#include "language/stretch.h"
#include "language/symbols.h"
#include "language/value.h"

namespace isinglass {

/// An error at a place; caught a statement at a time. With an empty text nothing is reported (the cause was).
struct Trouble {
  syntax::Span at;
  std::string text;
  std::vector<std::string> notes;
};

/// One qubit given twice in a call. Where a running index has led there, it is the running program's fault.
struct GivenTwice : Trouble {};

/// A limit was exceeded: reading ends.
struct Overflow {
  Trouble trouble;
};

/// Thrown where a quantum operand or angle depends on a running value of few bits: the statement is run again
/// once for every value, each in its own arm.
struct Split {
  const syntax::Expression* node = nullptr;  // an index: its value is fixed in each arm; or
  std::uint32_t variable = no_variable;      // a native variable, and
  std::uint32_t bit = no_bit;                // if it has flat bits: which of them
  Expression selector;
  std::uint32_t count = 0;  // values 0 .. count-1
  Type type;
  syntax::Span at;
};

/// How a list of statements ends.
enum class Ending : std::uint8_t {
  falls,      // goes on with what follows
  breaks,     // the rest of it is not reached: a `break` was met
  continues,  // ... a `continue`
  returns,    // ... a `return`
  ends,       // ... an `end`
};

/// Qubits that an expression names.
struct Qubits {
  std::vector<std::uint32_t> wires;
  bool is_scalar = false;
};

/// What may be read or assigned: a variable, cells of an array, bits of a register or number.
struct Location {
  Symbol* symbol = nullptr;
  std::vector<Part> parts;  // cells or bits; empty = the whole symbol
  bool parts_are_bits = false;
  bool is_one = true;                // a whole scalar, one cell or one bit; else an array, slice or set
  std::vector<std::uint32_t> shape;  // of an array or a part of one
  Type type;                         // of the value; of an array its element type
  std::vector<Expression> running;   // indices that are known only while running, of one cell or bit
};

class Reader final : public StatementSink {
 public:
  explicit Reader(const ReadOptions& options);

  Reading run(const std::string& file_name, std::string_view text);

  int language() const override;
  bool plain_call(const PlainCall& call, const PlainNames& names) override;
  void statement(syntax::Statement&& statement) override;
  void syntax_message(Message message, std::vector<std::string> names) override;

 private:
  using SyntaxExpression = syntax::Expression;
  using Statements = std::vector<syntax::Statement>;

  // Messages (reader.cpp).
  void report(const Trouble& trouble);
  void warn(syntax::Span at, std::string text, std::vector<std::string> notes = {});
  [[noreturn]] void fail(syntax::Span at, std::string text, std::vector<std::string> notes = {}) const;
  /// Runs `action`; a Fault in it becomes a Trouble at this place.
  template <class Action>
  auto at_place(syntax::Span at, Action&& action) -> decltype(action()) {
    try {
      return action();
    } catch (const Fault& fault) {
      throw_fault(at, fault);
    }
  }
  [[noreturn]] void throw_fault(syntax::Span at, const Fault& fault) const;
  void count_step(syntax::Span at);
  void note_broken(const syntax::Statement& statement);
  void note_annotations(const syntax::Statement& statement);

  // Files and versions (reader.cpp).
  void decide_version(int version, syntax::Span at);
  void take(syntax::Statement&& statement);
  int version_of(const syntax::Statement& statement) const;
  void declare_version(const syntax::Version& version, syntax::Span at);
  void include(const syntax::Include& include, syntax::Span at);
  void declare_built_ins();
  void declare_library(Library which, syntax::Span at);
  void finish();
  void finish_values();

  // Names (variables.cpp).
  Symbol& declare(Symbol symbol);
  Symbol& found(std::string_view name, syntax::Span at, const char* what);
  std::string native_name(const std::string& wanted, syntax::Span at);

  // Types and constants (expressions.cpp).
  Type scalar_type(const syntax::Type& type);
  std::vector<std::uint32_t> array_shape(const syntax::Type& type);
  std::uint32_t size_of(const SyntaxExpression& expression, std::uint32_t least, const char* what);
  Value constant(const SyntaxExpression& expression, const char* what);

  // Expressions (expressions.cpp).
  Value evaluated(const SyntaxExpression& expression);
  Value evaluated_unchecked(const SyntaxExpression& expression);
  Value literal_value(const SyntaxExpression& expression);
  Value call_value(const SyntaxExpression& expression);
  Value size_value(const SyntaxExpression& expression);
  Value timing_value(const SyntaxExpression& expression);
  Value truth(const SyntaxExpression& expression);
  Angle angle_of(const Value& value, syntax::Span at);
  Angle angle_of(const SyntaxExpression& expression);
  [[noreturn]] void split_on(const Expression& expression, syntax::Span at);
  Angle derived_angle(const Value& value);
  Angle wrapped_angle(Angle angle);
  std::int64_t known_int(const SyntaxExpression& expression, const char* what);
  /// The numbers that an index item selects out of `size`; is_one tells a plain index from a slice.
  std::vector<std::uint32_t> indices(const SyntaxExpression& item, std::uint32_t size, bool& is_one,
                                     const char* what);
  std::vector<std::uint32_t> range_indices(const SyntaxExpression& range, std::uint32_t size,
                                           const char* what);
  Rules rules() { return {forms_, &lengths_, version_ == 20}; }

  // Qubits (expressions.cpp).
  Qubits qubits_of(const SyntaxExpression& expression);
  Symbol& hardware_qubit(const SyntaxExpression& expression);

  // Variables (variables.cpp).
  Location located(const SyntaxExpression& expression);
  Location whole(Symbol& symbol);
  std::vector<Part> parts_of(const Location& location) const;
  Location joined(const SyntaxExpression& expression);
  Location indexed(const Location& base, const SyntaxExpression& expression);
  Location indexed_cells(const Location& base, const SyntaxExpression& expression);
  Location indexed_bits(const Location& base, const SyntaxExpression& item);
  Value read(const Location& location, syntax::Span at);
  Value read_symbol(Symbol& symbol, syntax::Span at);
  Value read_bits(const Location& location, syntax::Span at);
  void warn_unset(Symbol& symbol, const std::vector<Part>& bits, syntax::Span at);
  void write(const Location& location, const Value& value, syntax::Span at);
  void write_parts(const Location& location, const Value& value, syntax::Span at);
  void mark_set(const Location& location);
  /// Lets the running program hold the variable. Its value is told to it unless all of it is overwritten
  /// next.
  void move_to_native(Symbol& symbol, bool overwritten = false, syntax::Span at = {});
  std::uint32_t native_variable(Symbol& symbol);
  std::uint32_t add_variable(const std::string& name, const std::string& source, Type type,
                             const std::vector<std::uint32_t>& shape, syntax::Span at);
  Expression native_cell(const Symbol& symbol, std::uint32_t cell) const;
  Expression native_target(const Location& location) const;
  std::optional<Expression> native_bits(const std::vector<Part>& parts) const;
  std::uint32_t temporary_array(Symbol& symbol, syntax::Span at);
  std::uint32_t temporary(Type type, const std::string& stem, std::size_t frame);
  /// The value in a variable of its own, so that it stays what it is.
  Value kept(const Value& value, const std::string& stem);
  Value variable_value(std::uint32_t variable, Type type) const;
  Value bit_value(std::uint32_t variable, std::uint32_t bit) const;
  void close_scope();
  void check_writable(const Location& location, syntax::Span at);
  void write_array(const Location& location, const std::vector<Value>& values, syntax::Span at);
  std::vector<Value> array_values(const SyntaxExpression& expression, Type type,
                                  const std::vector<std::uint32_t>& shape);
  Value assigned_value(const Value& value, Type type, syntax::Span at);

  // Gates (gates.cpp).
  struct Control {
    std::uint32_t count = 0;
    bool negated = false;
  };
  void define_gate(const syntax::GateDefinition& definition, syntax::Span at);
  void declare_gate_arguments(const syntax::GateDefinition& definition);
  std::vector<Angle> gate_arguments(const Symbol& symbol, std::vector<Angle> arguments, syntax::Span at);
  bool call_by_bits(const syntax::GateCall& call, const Symbol& symbol, const std::vector<Value>& values,
                    const std::vector<Control>& controls, const std::vector<Qubits>& operands,
                    syntax::Span at);
  void apply_gate(const syntax::GateCall& call, const Symbol& symbol, std::span<const Angle> arguments,
                  const std::vector<Control>& controls, const std::vector<Qubits>& operands, syntax::Span at);
  void call_gate(const syntax::GateCall& call, syntax::Span at);
  void call_old_form(const syntax::GateCall& call, const Symbol& symbol, syntax::Span at);
  void for_each_call(const syntax::GateCall& call, const std::vector<Qubits>& operands,
                     const std::function<void(const std::vector<std::uint32_t>&)>& one);
  std::vector<Control> controls_of(const syntax::GateCall& call);
  Acts modified(const syntax::GateCall& call, Acts acts, const std::vector<Control>& controls,
                std::span<const std::uint32_t> wires);
  Acts power_of(const syntax::Modifier& modifier, Acts acts);
  void check_distinct(const std::vector<std::uint32_t>& wires, const std::vector<std::size_t>& owner,
                      const std::vector<SyntaxExpression>& operands);
  void emit(Kind kind, std::span<const std::uint32_t> wires, std::span<const Angle> angles, syntax::Span at);
  void emit_template(const GateTemplate& gate, std::span<const Angle> arguments,
                     std::span<const std::uint32_t> wires, syntax::Span at);
  void append(Operation&& op, syntax::Span at);

  // Statements (statements.cpp).
  Ending run_list(const Statements& statements, std::size_t first = 0);
  Ending run_statement(const syntax::Statement& statement);
  Ending run_checked(const syntax::Statement& statement);
  void run_plain_statement(const syntax::Statement& statement);
  void run_expression(const syntax::ExpressionStatement& statement, const syntax::Statement& whole_statement);
  void hoist_calls(const syntax::GateCall& call);
  void hoist_calls(const SyntaxExpression& expression);
  /// Runs `action`; where it needs a running value (see Split), once for every value in an arm of its own.
  void with_splits(syntax::Span at, const std::set<std::string>& assigned,
                   const std::function<void()>& action);
  void run_split(const Split& split, const std::set<std::string>& assigned,
                 const std::function<void()>& action);
  void declare_qubits(const syntax::QubitDeclaration& declaration, syntax::Span at);
  void declare_variable(const syntax::Declaration& declaration, syntax::Span at);
  void declare_input(const syntax::Declaration& declaration, Symbol symbol, syntax::Span at);
  Value constant_value(const SyntaxExpression& expression, Type type);
  Value new_stretch(double least);
  void initialize(Symbol symbol, const syntax::Declaration& declaration, syntax::Span at);
  void declare_alias(const syntax::Alias& alias);
  void measure(const syntax::Measurement& measurement, syntax::Span at);
  void measure_into(const Qubits& qubits, const Location& target, syntax::Span at);
  Value measured(const SyntaxExpression& expression, std::size_t frame);
  void reset(const syntax::Reset& reset, syntax::Span at);
  void barrier(const syntax::Barrier& barrier, syntax::Span at);
  void assign(const syntax::Assignment& assignment, syntax::Span at);
  void emit_statement(ClassicalStatement statement, syntax::Span at);
  void emit_assignment(Expression target, Expression value, syntax::Span at);

  // Code that is not run (check.cpp).

  /// A name declared there.
  struct Local {
    Type type;  // none where it is not known
    bool is_qubit = false;
    bool is_scalar = false;  // a single qubit
    bool is_array = false;
    bool is_unknown = false;
  };
  /// What is known of an expression that is not evaluated.
  struct Checked {
    Type type;  // none where it is not known
    std::optional<Value> value;
  };
  void check_unrun(const syntax::Body& body);
  void check_subroutine(const syntax::Subroutine& definition);
  void check_list(const Statements& statements);
  void check_statement(const syntax::Statement& statement);
  void check_call(const syntax::GateCall& call);
  void check_declaration(const syntax::Declaration& declaration);
  void check_assignment(const syntax::Assignment& assignment);
  void check_measurement(const syntax::Measurement& measurement);
  void check_qubits(const SyntaxExpression& operand);
  void check_truth(const SyntaxExpression& condition);
  void check_fits(const Checked& value, Type type, syntax::Span at);
  Checked check_expression(const SyntaxExpression& expression);
  Checked checked_name(const SyntaxExpression& expression);
  Checked checked_call(const SyntaxExpression& expression);
  Checked checked_index(const SyntaxExpression& expression);
  Checked applied(const std::vector<Checked>& operands, syntax::Span at,
                  const std::function<Value(const std::vector<Value>&)>& operation);
  Type checked_type(const syntax::Type& type);
  Local local_of(const syntax::Type& type);
  const Local* local(const std::string& name) const;

  // Timing (timing.cpp).
  void delay(const syntax::Delay& delay, syntax::Span at);
  Ending box(const syntax::Box& box, syntax::Span at);
  Value duration_of(const SyntaxExpression& expression);
  /// When the last of some operations ends, in nanoseconds from the first, and on which wire.
  struct Length {
    double ns = 0;
    std::uint32_t wire = 0;
  };
  Length length_of(std::uint32_t block, std::size_t first);
  double time_of(const Operation& op);
  const GateTimes& times();
  bool can_stretch(const Operation& op) const { return op.kind == Kind::delay && op.form[0] != 0; }
  std::vector<TimedPiece> pieces_of(std::uint32_t block, const std::vector<std::size_t>& which);
  void add_spans_between_barriers(std::uint32_t block);
  void solve_stretches();

  // Control flow (flow.cpp).

  /// Where `break`, `continue` or `return` lead. Targets are nested; the innermost is last.
  struct Target {
    enum class Kind : std::uint8_t { unrolled_loop, native_loop, subroutine };
    Kind kind = Kind::unrolled_loop;
    std::size_t frame = 0;             // of temporaries, where flags and results stay
    std::uint32_t block = 0;           // the block in which it began,
    std::size_t position = 0;          // and where: its flag is cleared there
    std::uint32_t flag = no_variable;  // up when it was left
    std::uint32_t round_block = 0;     // the same for the running round
    std::size_t round_position = 0;
    std::uint32_t continue_flag = no_variable;
    Type result;                                  // of a subroutine:
    std::optional<Value> value;                   // what it returns, if known here,
    std::uint32_t result_variable = no_variable;  // or the variable that holds it
  };
  /// The values that a loop runs through.
  struct LoopValues {
    bool is_range = false;
    bool is_real = false;
    Integer first, step, last;
    double real_first = 0, real_step = 0, real_last = 0;
    std::vector<Value> list;
    std::size_t round = 0;
    std::optional<Value> next();
  };
  /// Arguments of a call before the callee's scope is open.
  struct Bound {
    std::vector<Symbol> symbols;
    std::vector<std::uint32_t> used;  // wires given so far
  };
  Ending run_block(const syntax::Body& body);
  Ending run_if(const syntax::If& choice, syntax::Span at);
  Ending run_switch(const syntax::Switch& choice, syntax::Span at);
  Ending run_for(const syntax::For& loop, syntax::Span at);
  Ending run_running_for(const syntax::For& loop, Type type, Expression over, syntax::Span at);
  Ending run_while(const syntax::While& loop, syntax::Span at);
  Ending run_running_while(const syntax::While& loop, syntax::Span at);
  Ending run_round(const std::function<Ending()>& body, const std::set<std::string>& assigned);
  Ending run_guarded(const std::function<Ending()>& rest, const std::set<std::string>& assigned);
  LoopValues loop_values(const syntax::For& loop, Type type, std::optional<Expression>& running);
  Target new_target(Target::Kind kind);
  void finish_loop();
  void leave_outer_loops(syntax::Span at);
  Ending exit_to(Ending ending, syntax::Span at);
  std::uint32_t raised(Target& target, std::uint32_t& flag, syntax::Span at);
  void insert_clear(std::uint32_t block, std::size_t position, std::uint32_t flag);
  void add_pending(std::uint32_t flag);
  void drop_pending(std::uint32_t flag);
  std::uint32_t open_arm();
  void close_arm();
  void append_branch(Branch branch, syntax::Span at);
  void move_assigned(const std::set<std::string>& names);
  void move_if_own(Symbol& symbol);
  std::set<std::string> assigned_in(const Statements& statements, std::size_t first) const;
  void collect_assigned(const syntax::Statement& statement, std::set<std::string>& names) const;
  void collect_assigned(const SyntaxExpression& expression, std::set<std::string>& names) const;
  void define_subroutine(const syntax::Subroutine& definition, syntax::Span at);
  void define_extern(const syntax::Extern& definition, syntax::Span at);
  Value call_subroutine(const Symbol& symbol, const std::vector<const SyntaxExpression*>& arguments,
                        syntax::Span at);
  Value call_extern(const Symbol& symbol, const std::vector<const SyntaxExpression*>& arguments,
                    syntax::Span at);
  void bind_qubits(const syntax::Parameter& parameter, const SyntaxExpression& argument, Bound& bound);
  void bind_array(const syntax::Parameter& parameter, const SyntaxExpression& argument, Bound& bound);
  void bind_value(const syntax::Parameter& parameter, const SyntaxExpression& argument, Bound& bound);
  void run_return(const syntax::Return& statement, syntax::Span at);

  const ReadOptions options_;
  Sources sources_;
  std::vector<Message> messages_;
  std::set<std::string> reported_;
  std::size_t errors_ = 0;

  Circuit circuit_;
  int version_ = 0;  // 0 = not known yet
  bool version_given_ = false;
  bool any_statement_ = false;
  std::vector<syntax::Statement> waiting_;  // until the version is known
  std::deque<syntax::Statement> kept_;      // definitions, whose syntax lives on
  std::vector<std::string> include_stack_;

  Scopes scopes_;
  std::vector<std::unique_ptr<Symbol>> hardware_;  // `$0`, `$1`, ...: not declared, seen everywhere
  Forms* forms_ = &circuit_.forms;
  Acts* capture_ = nullptr;                          // the body of a gate goes here
  std::vector<Expression>* gate_derived_ = nullptr;  // and its derived parameters there
  std::uint32_t gate_parameters_ = 0;
  std::deque<GateTemplate> templates_;

  std::uint32_t block_ = 0;                           // that operations are appended to
  std::vector<Angle> phase_ = std::vector<Angle>(1);  // of every block, not appended yet
  std::vector<std::uint32_t> arms_;                   // the blocks around block_
  std::vector<Target> targets_;
  std::vector<std::uint32_t> pending_;  // flags that may be up here: what follows stands under `if (!flag)`
  bool is_statement_call_ = false;      // the value of the call being evaluated is not used
  std::size_t call_depth_ = 0;
  std::size_t steps_ = 0;
  std::size_t operations_ = 0;
  bool read_variable_ = false;  // an evaluation met something that is not constant

  std::map<const syntax::Expression*, Value> fixed_;  // by splits
  std::map<std::uint32_t, Value> fixed_variables_;    // native variables
  std::map<std::uint32_t, bool> fixed_bits_;          // flat bits
  std::set<std::string> native_names_;
  /// Native variables whose source variable is gone, by declaration and type, for the next of its kind.
  std::map<std::pair<const void*, std::string>, std::vector<std::uint32_t>> free_variables_;
  /// Temporary variables of the statements being run, outermost first; free again when theirs is done.
  std::vector<std::vector<std::uint32_t>> temporaries_ = std::vector<std::vector<std::uint32_t>>(1);
  std::map<std::string, std::uint32_t> derived_;  // by printed expression

  std::vector<std::map<std::string, Local>> check_levels_;  // names declared in code that is not run
  std::optional<Type> check_result_;                        // of the subroutine that is checked
  std::set<const syntax::Body*> checked_;                   // of the statement being run
  std::vector<Annotation> annotations_;
  std::set<std::uint32_t> annotated_;  // places of annotations that are noted
  bool has_hoisted_ = false;           // subroutines or externs
  bool times_asked_ = false;
  std::optional<GateTimes> times_;
  Forms lengths_;  // over the stretches; the form of a delay until they are solved
  std::vector<Stretch> stretches_;
  std::vector<StretchedSpan> spans_;
  std::vector<std::optional<double>>
      boxes_;                         // their lengths; the barriers around a box carry its number from 1
  std::vector<syntax::Span> delays_;  // that can stretch: their payload until they are solved

  bool has_ended_ = false;
  std::size_t emitted_ = 0;  // operations, statements and phases so far
  std::string gate_name_;    // of the gate being defined
  std::vector<std::uint32_t> operand_buffer_;
  bool pi_is_hidden_ = false;
  std::uint64_t generation_ = 0;  // grows with every global declaration

  struct PlainSymbol {
    const Symbol* symbol = nullptr;
    bool is_known = false;
  };
  const PlainNames* plain_names_ = nullptr;
  std::uint64_t plain_generation_ = 0;
  std::vector<PlainSymbol> plain_symbols_;
  std::vector<std::uint32_t> plain_wires_;
  std::vector<Angle> plain_angles_;
};

}  // namespace isinglass
