// Ensembles of final states, outcome by outcome; see programs.h.
#include "verify/programs.h"

#include <Eigen/Dense>
#include <algorithm>
#include <cmath>

#include "verify/outcomes.h"

namespace isinglass {

namespace {

/// Distance of two ensembles of unnormalized vectors: of the vectors where there is one each, else of the
/// density matrices in the space that both span.
double ensemble_distance(const std::vector<std::vector<Amplitude>>& a,
                         const std::vector<std::vector<Amplitude>>& b) {
  const auto rows = static_cast<Eigen::Index>(a.empty() ? b[0].size() : a[0].size());
  const auto matrix = [&](const std::vector<std::vector<Amplitude>>& states) {
    Eigen::MatrixXcd m(rows, static_cast<Eigen::Index>(states.size()));
    for (std::size_t k = 0; k < states.size(); ++k) {
      m.col(static_cast<Eigen::Index>(k)) = Eigen::Map<const Eigen::VectorXcd>(states[k].data(), rows);
    }
    return m;
  };
  const Eigen::MatrixXcd ma = matrix(a);
  const Eigen::MatrixXcd mb = matrix(b);
  if (a.size() == 1 && b.size() == 1) {
    const Amplitude overlap = ma.col(0).dot(mb.col(0));
    const Amplitude phase = std::abs(overlap) < 1e-12 ? Amplitude(1) : overlap / std::abs(overlap);
    return (phase * ma - mb).norm();
  }
  const Eigen::Index all = ma.cols() + mb.cols();
  if (rows <= 256 || rows <= all) return (ma * ma.adjoint() - mb * mb.adjoint()).norm();
  Eigen::MatrixXcd both(rows, all);
  both << ma, mb;
  const Eigen::HouseholderQR<Eigen::MatrixXcd> qr(both);
  const Eigen::MatrixXcd q = qr.householderQ() * Eigen::MatrixXcd::Identity(rows, all);
  const Eigen::MatrixXcd ra = q.adjoint() * ma;
  const Eigen::MatrixXcd rb = q.adjoint() * mb;
  return (ra * ra.adjoint() - rb * rb.adjoint()).norm();
}

Deviation endings_deviation(const Endings& a, const Endings& b) {
  Deviation d;
  d.distance = std::sqrt(std::max(a.stray, b.stray));
  d.cut = std::max(a.cut, b.cut);
  static const Ending nothing;
  double squares = d.distance * d.distance;
  double variation = 0;
  const auto include = [&](const Ending& left, const Ending& right) {
    variation += std::abs(left.probability - right.probability);
    const double roots = std::abs(std::sqrt(left.probability) - std::sqrt(right.probability));
    const bool has_states = !left.states.empty() || !right.states.empty();
    squares += std::pow(has_states ? ensemble_distance(left.states, right.states) : roots, 2);
  };
  for (const auto& [bits, left] : a.by_bits) {
    const auto other = b.by_bits.find(bits);
    include(left, other == b.by_bits.end() ? nothing : other->second);
  }
  for (const auto& [bits, right] : b.by_bits) {
    if (!a.by_bits.contains(bits)) include(nothing, right);
  }
  d.distance = std::sqrt(squares);
  d.infidelity = std::max(variation / 2, squares);
  return d;
}

void renumber(Expression& expression, std::span<const std::uint32_t> number) {
  if (expression.kind == Expression::Kind::variable) expression.variable = number[expression.variable];
  for (Expression& argument : expression.arguments) renumber(argument, number);
}

}  // namespace

Renumbered with_variables_of(const Circuit& source, Circuit compiled) {
  Renumbered result;
  std::vector<Variable> variables = source.variables;
  std::uint32_t bits = source.bits;
  std::vector<std::uint32_t> number(compiled.variables.size());
  std::vector<std::uint32_t> bit_number(compiled.bits);
  const auto source_name = [](const Variable& v) { return v.source.empty() ? v.name : v.source; };
  for (std::uint32_t k = 0; k < compiled.variables.size(); ++k) {
    Variable variable = compiled.variables[k];
    const auto same_name = [&](const Variable& v) { return source_name(v) == source_name(variable); };
    const auto found = std::find_if(source.variables.begin(), source.variables.end(), same_name);
    number[k] = static_cast<std::uint32_t>(variables.size());
    if (found != source.variables.end()) {
      number[k] = static_cast<std::uint32_t>(found - source.variables.begin());
      if (found->type != variable.type) result.mismatch = source_name(variable);
    }
    const bool is_new = number[k] == variables.size();
    const std::uint32_t first = is_new ? bits : found->first_bit;
    for (std::uint32_t b = 0; b < variable.bits; ++b) bit_number[variable.first_bit + b] = first + b;
    if (!is_new) continue;
    variable.first_bit = first;
    bits += variable.bits;
    variables.push_back(std::move(variable));
  }
  for (ClassicalStatement& statement : compiled.statements) {
    renumber(statement.target, number);
    renumber(statement.value, number);
  }
  for (Branch& branch : compiled.branches) {
    renumber(branch.condition, number);
    if (branch.kind == Branch::Kind::for_loop) branch.variable = number[branch.variable];
    for (Branch::Arm& arm : branch.arms) {
      for (Expression& label : arm.labels) renumber(label, number);
    }
  }
  for (Block& block : compiled.blocks) {
    for (Operation& op : block) {
      if (op.kind == Kind::measure && op.payload != no_bit) op.payload = bit_number[op.payload];
    }
  }
  compiled.variables = std::move(variables);
  compiled.bits = bits;
  result.circuit = std::move(compiled);
  return result;
}

ProgramCheck by_branches(const Job& job, const InputValues& inputs) {
  std::vector<std::uint32_t> shown;  // what the source declared; the rest was made by the compiler
  for (std::uint32_t k = 0; k < job.source.variables.size(); ++k) {
    if (!job.source.variables[k].source.empty()) shown.push_back(k);
  }
  const std::uint32_t qubits = job.source.source_qubits;
  const std::uint32_t wires = std::max(job.source.wires, job.compiled.wires);
  std::vector<bool> kept = kept_qubits(job.source);
  if (job.promise.keep_bits_only) kept.assign(qubits, false);
  const RunLimits limits{job.options.most_branches, job.options.most_rounds, job.options.deadline};
  ProgramCheck check;
  check.with_references = !job.promise.zero_start && wires + qubits <= 12;
  check.states = job.promise.zero_start || check.with_references ? 1 : std::max(1, job.options.states);
  std::mt19937_64 engine(job.options.seed);
  for (int k = 0; k < check.states; ++k) {
    Start start;
    start.with_references = check.with_references;
    if (!job.promise.zero_start && !check.with_references) start.product = random_product(qubits, engine);
    const bool ends_clean = !job.promise.keep_bits_only;
    const Endings a = endings_of(job.source, start, inputs.source, shown, kept, ends_clean, limits);
    const Endings b = endings_of(job.compiled, start, inputs.compiled, shown, kept, ends_clean, limits);
    check.deviation.include(endings_deviation(a, b));
    check.runs = std::max({check.runs, a.runs, b.runs});
    check.endings = std::max({check.endings, a.by_bits.size(), b.by_bits.size()});
  }
  return check;
}

}  // namespace isinglass
