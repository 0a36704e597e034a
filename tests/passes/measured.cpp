// Following every outcome of a small program; see measured.h.
#include "measured.h"

#include <algorithm>

namespace isinglass::support {

namespace {

std::uint32_t flat_bit(const Circuit& circuit, const Expression& place) {
  if (place.kind == Expression::Kind::variable) return circuit.variables[place.variable].first_bit;
  const Expression& base = place.arguments.at(0);
  return circuit.variables[base.variable].first_bit +
         static_cast<std::uint32_t>(std::stoul(place.arguments.at(1).text));
}

bool value_of(const Circuit& circuit, const Expression& expression, const std::vector<bool>& bits) {
  switch (expression.kind) {
    case Expression::Kind::unary:
      return !value_of(circuit, expression.arguments.at(0), bits);
    case Expression::Kind::binary: {
      const bool left = value_of(circuit, expression.arguments.at(0), bits);
      const bool right = value_of(circuit, expression.arguments.at(1), bits);
      return expression.text == "^" ? left != right : left && right;
    }
    default:
      return bits[flat_bit(circuit, expression)];
  }
}

class Walk {
 public:
  struct Place {
    std::uint32_t block;
    std::size_t operation;
  };

  Walk(const Circuit& circuit, const std::vector<std::uint32_t>& kept) : circuit_(circuit), kept_(kept) {}

  /// Follows the operation at the last of the places (each in a block that the one before it stands in front
  /// of), and all that come after it.
  void follow(std::vector<Place> places, State state, std::vector<bool> bits) {
    while (!places.empty()) {
      const Block& block = circuit_.blocks[places.back().block];
      if (places.back().operation == block.size()) {
        places.pop_back();
        continue;
      }
      const Operation& op = block[places.back().operation++];
      if (op.is_unitary()) {
        apply(state, circuit_, op);
      } else if (op.kind == Kind::measure || op.kind == Kind::reset) {
        for (const bool outcome : {false, true}) {
          State branch = state;
          if (branch.project(op.operand[0], outcome) < 1e-20) continue;
          std::vector<bool> known = bits;
          if (op.kind == Kind::measure && op.payload != no_bit) known[op.payload] = outcome;
          if (op.kind == Kind::reset && outcome) branch.apply(pauli_x(), std::span(op.operand, 1));
          follow(places, branch, known);
        }
        return;
      } else if (op.kind == Kind::classical) {
        const ClassicalStatement& statement = circuit_.statements[op.payload];
        if (statement.kind == ClassicalStatement::Kind::end_program) break;
        bits[flat_bit(circuit_, statement.target)] = value_of(circuit_, statement.value, bits);
      } else if (op.kind == Kind::branch) {
        const Branch& branch = circuit_.branches[op.payload];
        const std::size_t arm = value_of(circuit_, branch.condition, bits) ? 0 : 1;
        if (arm < branch.arms.size()) places.push_back({branch.arms[arm].block, 0});
      }
    }
    end(state, bits);
  }

  Outcomes outcomes;

 private:
  void end(const State& state, const std::vector<bool>& bits) {
    const std::size_t size = std::size_t{1} << kept_.size();
    Matrix& density = outcomes.try_emplace(bits, Matrix::Zero(size, size)).first->second;
    std::size_t mask = 0;
    for (const std::uint32_t q : kept_) mask |= std::size_t{1} << circuit_.end_wire[q];
    const auto spread = [&](std::size_t k) {
      std::size_t index = 0;
      for (std::size_t j = 0; j < kept_.size(); ++j) {
        if (k >> j & 1) index |= std::size_t{1} << circuit_.end_wire[kept_[j]];
      }
      return index;
    };
    for (std::size_t rest = 0; rest < state.amplitudes.size(); ++rest) {
      if (rest & mask) continue;
      Eigen::VectorXcd part(size);
      for (std::size_t k = 0; k < size; ++k) part(k) = state.amplitudes[rest | spread(k)];
      density += part * part.adjoint();
    }
  }

  const Circuit& circuit_;
  const std::vector<std::uint32_t>& kept_;
};

}  // namespace

Outcomes outcomes_of(const Circuit& circuit, const State& start, const std::vector<std::uint32_t>& kept) {
  State state(circuit.wires);
  std::copy(start.amplitudes.begin(), start.amplitudes.end(), state.amplitudes.begin());
  Walk walk(circuit, kept);
  walk.follow({{0, 0}}, state, std::vector<bool>(circuit.bits, false));
  return walk.outcomes;
}

double distance(const Outcomes& a, const Outcomes& b) {
  double largest = 0;
  for (const auto* pair : {&a, &b}) {
    const Outcomes& other = pair == &a ? b : a;
    for (const auto& [bits, density] : *pair) {
      const auto place = other.find(bits);
      const Matrix difference = place == other.end() ? density : Matrix(density - place->second);
      largest = std::max(largest, difference.cwiseAbs().maxCoeff());
    }
  }
  return largest;
}

std::vector<std::uint32_t> unmeasured_at_end(const Circuit& source) {
  std::vector<bool> is_measured(source.wires, false);
  for (const Operation& op : source.body()) {
    if (op.kind == Kind::barrier) continue;
    for (const std::uint32_t wire : source.operands(op)) is_measured[wire] = op.kind == Kind::measure;
  }
  std::vector<std::uint32_t> kept;
  for (std::uint32_t q = 0; q < source.source_qubits; ++q) {
    if (!is_measured[source.end_wire[q]]) kept.push_back(q);
  }
  return kept;
}

}  // namespace isinglass::support
