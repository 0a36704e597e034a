// Reading and writing whole files: a file that is read is read completely, a file that is written appears
// whole or not at all.
#pragma once

#include <functional>
#include <ostream>
#include <string>

namespace isinglass {

/// All bytes of the file; "-" is the standard input. Throws Failure(file_trouble) that says why.
std::string read_text(const std::string& path);

/// Writes through `write` into a temporary file beside `path` and renames it when all went well; "-" is the
/// standard output. Whatever was at `path` stays untouched on failure: Failure(file_trouble) that says why,
/// or the exception that `write` threw. Devices and pipes are written in place.
void write_whole(const std::string& path, const std::function<void(std::ostream&)>& write);

}  // namespace isinglass
