// Several sources in one run; see many.h.
#include "command/many.h"

#include <iostream>

namespace isinglass {

Exit compile_each(const std::vector<std::string>& sources, const Settings& settings,
                  const std::function<void(const Result&)>& on_result,
                  const std::function<void(const std::string& source, const std::string& why)>& on_failure) {
  Exit status = Exit::done;
  const auto failed = [&](const std::string& source, const std::string& why, Exit exit) {
    if (status == Exit::done || exit == Exit::internal) status = exit;
    if (on_failure) on_failure(source, why);
  };
  Progress progress(settings.quiet);
  for (const std::string& source : sources) {
    try {
      const Result result = compile(source, settings, progress);
      on_result(result);
    } catch (const Failure& failure) {
      progress.clear();
      for (const Message& message : failure.messages) std::cerr << printed(message);
      failed(source, failure.what(), failure.exit);
    } catch (const std::logic_error& error) {
      progress.clear();
      std::cerr << "error: isinglass itself is at fault: " << error.what() << "\n";
      failed(source, error.what(), Exit::internal);
    }
  }
  return status;
}

}  // namespace isinglass
