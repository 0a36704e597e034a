// Whole files; see files.h.
#include "circuit/files.h"

#include <fmt/format.h>
#include <unistd.h>

#include <cerrno>
#include <cstring>
#include <filesystem>
#include <fstream>
#include <iostream>
#include <iterator>
#include <sstream>

#include "circuit/message.h"

namespace isinglass {

namespace {

[[noreturn]] void fail(const std::string& path, const char* action, int code) {
  Message message;
  message.place.file = path;
  message.text = fmt::format("cannot be {}: {}", action, code != 0 ? std::strerror(code) : "unknown reason");
  throw Failure(Exit::file_trouble, {std::move(message)});
}

/// Removes the temporary file unless it was renamed into place.
struct Temporary {
  std::filesystem::path path;
  bool keep = false;
  ~Temporary() {
    std::error_code ignored;
    if (!keep) std::filesystem::remove(path, ignored);
  }
};

void write_to(std::ofstream& file, const std::string& path, const std::function<void(std::ostream&)>& write) {
  if (!file) fail(path, "written", errno);
  write(file);
  file.flush();
  if (!file) fail(path, "written", errno);
}

}  // namespace

std::string read_text(const std::string& path) {
  if (path == "-") return {std::istreambuf_iterator<char>(std::cin), {}};
  errno = 0;
  if (std::filesystem::is_directory(path)) fail(path, "read", EISDIR);
  std::ifstream file(path, std::ios::binary);
  if (!file) fail(path, "read", errno);
  std::ostringstream bytes;
  bytes << file.rdbuf();
  if (file.bad()) fail(path, "read", errno);
  return std::move(bytes).str();
}

void write_whole(const std::string& path, const std::function<void(std::ostream&)>& write) {
  if (path == "-") {
    write(std::cout);
    std::cout.flush();
    if (!std::cout) fail("standard output", "written", errno);
    return;
  }
  errno = 0;
  std::error_code ignored;
  const auto status = std::filesystem::status(path, ignored);
  if (std::filesystem::is_directory(status)) fail(path, "written", EISDIR);
  if (std::filesystem::exists(status) && !std::filesystem::is_regular_file(status)) {
    std::ofstream file(path, std::ios::binary);
    write_to(file, path, write);
    return;
  }
  Temporary temporary{fmt::format("{}.{}.part", path, ::getpid())};
  errno = 0;
  std::ofstream file(temporary.path, std::ios::binary | std::ios::trunc);
  write_to(file, path, write);
  file.close();
  if (!file) fail(path, "written", errno);
  std::error_code trouble;
  std::filesystem::rename(temporary.path, path, trouble);
  if (trouble) fail(path, "written", trouble.value());
  temporary.keep = true;
}

}  // namespace isinglass
