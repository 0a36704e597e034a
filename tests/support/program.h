// Running the isinglass program as a user does, from outside.
#pragma once

#include <filesystem>
#include <string>
#include <vector>

namespace isinglass::support {

struct Ran {
  int status = -1;
  std::string out;
  std::string err;
};

/// Runs the program with these arguments; `input` is its standard input. No shell reads the arguments.
Ran run_program(const std::vector<std::string>& arguments, const std::string& input = "");

/// A folder of its own that is removed at the end.
class Folder {
 public:
  Folder();
  ~Folder();
  Folder(const Folder&) = delete;
  Folder& operator=(const Folder&) = delete;

  std::string path(const std::string& name) const { return (path_ / name).string(); }
  /// Writes a file into it and returns its path.
  std::string write(const std::string& name, const std::string& text) const;
  /// Names of what lies in it, sorted.
  std::vector<std::string> names() const;

 private:
  std::filesystem::path path_;
};

/// A path in the project's tree, whatever the current directory: tree_path("targets/x.toml").
std::string tree_path(const std::string& path);

/// All bytes of a file.
std::string text_of(const std::string& path);

/// All circuits of the corpus, sorted.
std::vector<std::string> corpus();

}  // namespace isinglass::support
