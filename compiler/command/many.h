// Compiling several sources in one run: a fault in one does not hide the others.
#pragma once

#include <functional>
#include <string>
#include <vector>

#include "circuit/message.h"
#include "command/pipeline.h"

namespace isinglass {

/// Compiles each source and hands its result on. What goes wrong with a source is printed and, if wanted,
/// handed to `on_failure` with the first message; then the next one's turn comes. Returns the gravest status
/// of all: an internal fault, else the first failure's, else done.
Exit compile_each(
    const std::vector<std::string>& sources, const Settings& settings,
    const std::function<void(const Result&)>& on_result,
    const std::function<void(const std::string& source, const std::string& why)>& on_failure = {});

}  // namespace isinglass
