// Annotations and the operations left of their statements; see annotations.h.
#include "output/annotations.h"

#include <algorithm>
#include <set>

namespace isinglass {

namespace {

class Finder {
 public:
  Finder(std::span<const Annotation> annotations, const Circuit& circuit)
      : annotations_(annotations),
        circuit_(circuit),
        first_(annotations.size()),
        first_of_kind_(annotations.size()) {
    for (std::size_t i = 0; i < annotations.size(); ++i) {
      for (std::uint32_t line = annotations[i].first_line; line <= annotations[i].last_line; ++line) {
        of_line_[line].push_back(i);
      }
    }
  }

  /// In the order of the native program.
  void look_at(std::uint32_t block) {
    for (const Operation& op : circuit_.blocks[block]) {
      for (const std::uint32_t line : circuit_.origins.lines(op.origin)) {
        const auto found = of_line_.find(line);
        if (found == of_line_.end()) continue;
        for (const std::size_t i : found->second) {
          if (first_[i] == nullptr) first_[i] = &op;
          if (first_of_kind_[i] == nullptr && op.kind == annotations_[i].kind) first_of_kind_[i] = &op;
        }
      }
      if (op.kind != Kind::branch) continue;
      for (const Branch::Arm& arm : circuit_.branches[op.payload].arms) look_at(arm.block);
    }
  }

  const Operation* operation_of(std::size_t i) const {
    return first_of_kind_[i] != nullptr ? first_of_kind_[i] : first_[i];
  }

 private:
  std::span<const Annotation> annotations_;
  const Circuit& circuit_;
  std::vector<const Operation*> first_;
  std::vector<const Operation*> first_of_kind_;
  std::unordered_map<std::uint32_t, std::vector<std::size_t>> of_line_;
};

/// Names of the source that the native program declares.
std::set<std::string> declared_names(const Circuit& circuit) {
  std::set<std::string> names;
  for (const Variable& variable : circuit.variables) {
    names.insert(variable.source.empty() ? variable.name : variable.source);
  }
  for (const Input& input : circuit.inputs) {
    if (!input.is_derived) names.insert(input.source.empty() ? input.name : input.source);
  }
  return names;
}

}  // namespace

AnnotationPlaces places_of(std::span<const Annotation> annotations, const Circuit& circuit) {
  AnnotationPlaces places;
  if (annotations.empty()) return places;
  Finder finder(annotations, circuit);
  finder.look_at(0);
  const std::set<std::string> declared = declared_names(circuit);
  for (std::size_t i = 0; i < annotations.size(); ++i) {
    const Annotation& annotation = annotations[i];
    const Operation* const op = finder.operation_of(i);
    if (declared.contains(annotation.declares)) {
      places.before_declaration[annotation.declares].push_back(annotation.text);
    } else if (op != nullptr) {
      places.before[op].push_back(annotation.text);
    } else {
      places.lost.push_back(annotation);
    }
  }
  return places;
}

}  // namespace isinglass
