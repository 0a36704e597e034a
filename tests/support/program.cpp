// Running the program; see program.h.
#include "support/program.h"

#include <fcntl.h>
#include <sys/wait.h>
#include <unistd.h>

#include <algorithm>
#include <atomic>
#include <fstream>
#include <sstream>
#include <stdexcept>

namespace isinglass::support {

namespace fs = std::filesystem;

namespace {

fs::path fresh_path() {
  static std::atomic<int> counter{0};
  return fs::temp_directory_path() /
         ("isinglass-test-" + std::to_string(getpid()) + "-" + std::to_string(++counter));
}

void redirect(const std::string& path, int flags, int descriptor) {
  const int file = open(path.c_str(), flags, 0600);
  if (file < 0 || dup2(file, descriptor) < 0) _exit(126);
}

}  // namespace

std::string tree_path(const std::string& path) {
  return std::string(ISINGLASS_TREE) + "/" + path;
}

std::string text_of(const std::string& path) {
  std::ifstream file(path, std::ios::binary);
  if (!file) throw std::runtime_error("cannot read " + path);
  std::ostringstream text;
  text << file.rdbuf();
  return text.str();
}

Ran run_program(const std::vector<std::string>& arguments, const std::string& input) {
  const Folder folder;
  const std::string in = folder.write("in", input);
  const std::string out = folder.write("out", "");
  const std::string err = folder.write("err", "");
  std::vector<char*> argv;
  std::string program = ISINGLASS_PROGRAM;
  std::vector<std::string> copies = arguments;
  argv.push_back(program.data());
  for (std::string& argument : copies) argv.push_back(argument.data());
  argv.push_back(nullptr);
  const pid_t child = fork();
  if (child == 0) {
    redirect(in, O_RDONLY, 0);
    redirect(out, O_WRONLY, 1);
    redirect(err, O_WRONLY, 2);
    execv(program.c_str(), argv.data());
    _exit(127);
  }
  int state = 0;
  waitpid(child, &state, 0);
  Ran ran;
  ran.status = WIFEXITED(state) ? WEXITSTATUS(state) : 128 + WTERMSIG(state);
  ran.out = text_of(out);
  ran.err = text_of(err);
  return ran;
}

Folder::Folder() : path_(fresh_path()) {
  fs::create_directories(path_);
}

Folder::~Folder() {
  std::error_code ignored;
  fs::remove_all(path_, ignored);
}

std::string Folder::write(const std::string& name, const std::string& text) const {
  std::ofstream(path_ / name, std::ios::binary) << text;
  return path(name);
}

std::vector<std::string> Folder::names() const {
  std::vector<std::string> names;
  for (const auto& entry : fs::directory_iterator(path_)) names.push_back(entry.path().filename().string());
  std::sort(names.begin(), names.end());
  return names;
}

std::vector<std::string> corpus() {
  std::vector<std::string> paths;
  for (const auto& entry : fs::recursive_directory_iterator(tree_path("corpus"))) {
    if (entry.path().extension() == ".qasm") paths.push_back(entry.path().string());
  }
  std::sort(paths.begin(), paths.end());
  return paths;
}

}  // namespace isinglass::support
