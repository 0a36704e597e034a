// Where the source's annotations stand in the native program.
#pragma once

#include <map>
#include <span>
#include <string>
#include <unordered_map>
#include <vector>

#include "circuit/annotation.h"

namespace isinglass {

/// Each annotation stands before the declaration of its variable; or before the first operation of its
/// statement's kind that came from the statement's lines, or else the first of any kind. Where nothing is
/// left of the statement, the annotation is lost.
struct AnnotationPlaces {
  std::unordered_map<const Operation*, std::vector<std::string>> before;
  std::map<std::string, std::vector<std::string>> before_declaration;  // by the variable's name in the source
  std::vector<Annotation> lost;
};

/// The operations are those of `circuit`, which must stay where it is.
AnnotationPlaces places_of(std::span<const Annotation> annotations, const Circuit& circuit);

}  // namespace isinglass
