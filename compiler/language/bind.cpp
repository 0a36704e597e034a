// The pass of bind; see bind.h. X(f) stands for cos f X + sin f Y, the flip r(pi, f) without its phase.
#include "language/bind.h"

#include <fmt/format.h>

#include <cmath>

#include "circuit/message.h"
#include "language/evaluate.h"
#include "language/value.h"

namespace isinglass {

namespace {

constexpr double nothing = 1e-15;  // radians: shorter pulses are left out

/// "array[int[8], 2, 3]" has 6 cells; everything else is one.
std::vector<std::uint32_t> shape_of(const std::string& type) {
  std::vector<std::uint32_t> shape;
  if (!type.starts_with("array[")) return shape;
  for (std::size_t at = type.find(','); at != std::string::npos; at = type.find(',', at + 1)) {
    shape.push_back(static_cast<std::uint32_t>(std::stoul(type.substr(at + 1))));
  }
  return shape;
}

Value given_value(double number, Type type) {
  Rules rules;
  if (!std::isfinite(number)) throw Fault{"is not a finite number", {}};
  if (type.base == Base::real || type.base == Base::angle) return converted(of_real(number), type, rules);
  if (number != std::trunc(number)) throw Fault{fmt::format("takes whole numbers, not {}", number), {}};
  const Integer whole = *Integer::truncated(number);
  if (type.base == Base::bits || type.base == Base::bit || type.base == Base::boolean) {
    const std::uint32_t width = type.base == Base::bits ? type.width : 1;
    if (whole.is_negative() || whole.length() > width) throw Fault{fmt::format("cannot hold {}", number), {}};
    Value value = of_bits(whole, width);
    value.type = type;
    return value;
  }
  Value value = converted(of_int(whole), type, rules);
  if (value.integer != whole) throw Fault{fmt::format("cannot hold {}", number), {}};
  return value;
}

/// What an input is worth in an angle.
double number_of(const Value& value) {
  return value.type.base == Base::bits ? value.integer.to_double() : radians_of(value);
}

bool leaves_block(const ClassicalStatement& statement) {
  using Of = ClassicalStatement::Kind;
  return statement.kind == Of::leave_loop || statement.kind == Of::next_round ||
         statement.kind == Of::end_program;
}

}  // namespace

std::vector<DeclaredInput> declared_inputs(const Circuit& circuit) {
  std::vector<DeclaredInput> declared;
  for (std::uint32_t i = 0; i < circuit.inputs.size(); ++i) {
    const Input& input = circuit.inputs[i];
    if (input.is_derived) continue;
    DeclaredInput entry{input.source.empty() ? input.name : input.source, input.type, 1, i};
    for (const std::uint32_t size : shape_of(input.type)) entry.count *= size;
    declared.push_back(std::move(entry));
  }
  return declared;
}

Binder::Binder(Circuit plan) : plan_(std::move(plan)), declared_(declared_inputs(plan_)) {
  bound_ = plan_;
  bound_.inputs.clear();
  bound_.forms = Forms();
  number_.resize(plan_.inputs.size());
  form_value_.resize(plan_.forms.size());
  frame_.resize(plan_.wires);
}

void Binder::set_inputs(std::span<const std::vector<double>> values) {
  std::vector<std::vector<Value>> given(plan_.inputs.size());
  const auto fail = [](const std::string& text) { throw Failure(Exit::source_at_fault, text); };
  for (std::size_t i = 0; i < declared_.size(); ++i) {
    const DeclaredInput& input = declared_[i];
    if (i >= values.size() || values[i].size() != input.count) {
      fail(fmt::format("input {} takes {} number{}, not {}", input.name, input.count,
                       input.count == 1 ? "" : "s", i < values.size() ? values[i].size() : 0));
    }
    const Type type = type_of(input.type);
    for (const double number : values[i]) {
      try {
        given[input.index].push_back(given_value(number, type));
      } catch (const Fault& fault) {
        fail(fmt::format("input {}: {} {}", input.name, input.type, fault.text));
      }
    }
    if (shape_of(input.type).empty()) number_[input.index] = number_of(given[input.index][0]);
  }
  Rules rules;
  const auto leaf = [&](const Expression& node) -> Value {
    if (node.kind == Expression::Kind::input)
      return given[node.variable].empty() ? Value{} : given[node.variable][0];
    if (node.kind != Expression::Kind::index || node.arguments[0].kind != Expression::Kind::input) return {};
    // A cell of an array input: its indices are literals.
    const std::uint32_t input = node.arguments[0].variable;
    const auto shape = shape_of(plan_.inputs[input].type);
    if (shape.empty()) return {};
    std::size_t cell = 0;
    for (std::size_t d = 0; d < shape.size(); ++d)
      cell = cell * shape[d] + std::stoul(node.arguments[d + 1].text);
    return given[input].at(cell);
  };
  for (std::size_t i = 0; i < plan_.inputs.size(); ++i) {
    const Input& input = plan_.inputs[i];
    if (!input.is_derived) continue;
    try {
      number_[i] = number_of(evaluate(input.expression, leaf, rules));
    } catch (const Fault& fault) {
      fail(fmt::format("{}: {}", printed(input.expression, plan_), fault.text));
    }
  }
  for (std::uint32_t form = 0; form < form_value_.size(); ++form) {
    form_value_[form] = plan_.forms.value(form, number_);
    if (!std::isfinite(form_value_[form])) fail("an angle becomes infinite with these values");
  }
  // Conditions and assignments that name inputs get their values as literals.
  const auto put_in = [&](const auto& self, Expression& node) -> void {
    const Value value = leaf(node);
    if (value.type.base != Base::none) {
      node = expression_of(value, rules);
      return;
    }
    for (Expression& argument : node.arguments) self(self, argument);
  };
  for (std::size_t i = 0; i < plan_.statements.size(); ++i) {
    bound_.statements[i].value = plan_.statements[i].value;
    bound_.statements[i].target = plan_.statements[i].target;
    put_in(put_in, bound_.statements[i].value);
    put_in(put_in, bound_.statements[i].target);
  }
  for (std::size_t i = 0; i < plan_.branches.size(); ++i) {
    bound_.branches[i].condition = plan_.branches[i].condition;
    put_in(put_in, bound_.branches[i].condition);
  }
}

const Circuit& Binder::bind(std::span<const std::vector<double>> values) {
  set_inputs(values);
  for (std::size_t block = 0; block < plan_.blocks.size(); ++block) {
    bind_block(plan_.blocks[block], bound_.blocks[block]);
  }
  return bound_;
}

void Binder::add_flip(Frame& frame, double axis) {
  // X(a) X(b) = rz(2a - 2b)
  if (frame.flip) frame.turn += 2 * (frame.axis - axis);
  frame.axis = axis;
  frame.flip = !frame.flip;
}

/// Performs a pending flip; the change of frame stays pending.
void Binder::settle_flip(std::uint32_t wire, Block& to) {
  Frame& frame = frame_[wire];
  if (!frame.flip) return;
  to.push_back(bound_.make(Kind::r, {wire}, {Angle{pi, 0}, Angle{wrapped(frame.axis), 0}}));
  frame.flip = false;
}

/// Performs all that is pending on a wire.
void Binder::settle(std::uint32_t wire, Block& to) {
  settle_flip(wire, to);
  const double turn = wrapped(frame_[wire].turn);
  if (std::abs(turn) > nothing) to.push_back(bound_.make(Kind::rz, {wire}, {Angle{turn, 0}}));
  frame_[wire] = {};
}

void Binder::bind_r(const Operation& op, Block& to) {
  Frame& frame = frame_[op.operand[0]];
  // Pending is rz(turn), perhaps after a flip: r(t, f) rz(turn) = rz(turn) r(t, f - turn).
  double theta = reduced(value(op, 0), 4 * pi);
  double phi = value(op, 1) - frame.turn;
  if (theta > pi) theta -= 2 * pi;
  if (theta <= -pi) theta += 2 * pi;
  if (theta < 0) {
    theta = -theta;
    phi += pi;
  }
  if (frame.flip) {
    // r(t, a + d) X(a) = rz(2d) r(pi - t, pi - d + a)
    const double difference = phi - frame.axis;
    theta = pi - theta;
    phi = pi - difference + frame.axis;
    frame.turn += 2 * difference;
    frame.flip = false;
  }
  if (theta <= nothing) return;
  Operation bound = op;
  bound.set_angle(0, {theta, 0});
  bound.set_angle(1, {wrapped(phi), 0});
  to.push_back(bound);
}

void Binder::bind_xx(const Operation& op, Block& to) {
  double theta = reduced(value(op, 0), 2 * pi);
  double phi[2];
  for (int side = 0; side < 2; ++side) {
    const Frame& frame = frame_[op.operand[side]];
    phi[side] = value(op, 1 + side) - frame.turn;
    if (frame.flip) phi[side] = 2 * frame.axis - phi[side];
  }
  if (theta < 0) {
    theta = -theta;
    phi[0] += pi;
  }
  if (theta > pi / 2 + nothing) {
    // xx(t, a, b) = xx(pi - t, a + pi, b) and the flips X(a), X(b)
    for (int side = 0; side < 2; ++side) add_flip(frame_[op.operand[side]], phi[side]);
    theta = pi - theta;
    phi[0] += pi;
  }
  if (theta <= nothing) return;
  Operation bound = op;
  bound.set_angle(0, {theta, 0});
  bound.set_angle(1, {wrapped(phi[0]), 0});
  bound.set_angle(2, {wrapped(phi[1]), 0});
  to.push_back(bound);
}

void Binder::bind_block(const Block& from, Block& to) {
  to.clear();
  for (const Operation& op : from) {
    switch (op.kind) {
      case Kind::r:
        bind_r(op, to);
        continue;
      case Kind::xx:
        bind_xx(op, to);
        continue;
      case Kind::rz:
        frame_[op.operand[0]].turn += value(op, 0);
        continue;
      case Kind::measure:
        settle_flip(op.operand[0], to);
        frame_[op.operand[0]] = {};  // a turn about z is not seen
        break;
      case Kind::reset:
        frame_[op.operand[0]] = {};
        break;
      case Kind::phase:
        continue;  // of the whole program: of no effect
      case Kind::classical:
        // What leaves the block must find everything done.
        if (leaves_block(plan_.statements[op.payload])) {
          for (std::uint32_t wire = 0; wire < frame_.size(); ++wire) settle(wire, to);
        }
        break;
      case Kind::barrier:
      case Kind::delay:
        for (const std::uint32_t wire : plan_.operands(op)) settle_flip(wire, to);
        break;
      default:
        for (const std::uint32_t wire : plan_.operands(op)) settle(wire, to);
    }
    to.push_back(op);
  }
  for (std::uint32_t wire = 0; wire < frame_.size(); ++wire) settle(wire, to);
}

}  // namespace isinglass
