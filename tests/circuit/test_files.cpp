// Files appear whole or not at all; what cannot be read or written is said once, with the reason.
#include <doctest/doctest.h>
#include <fmt/format.h>
#include <unistd.h>

#include <filesystem>
#include <fstream>

#include "circuit/files.h"
#include "circuit/message.h"

using namespace isinglass;
namespace fs = std::filesystem;

namespace {

struct Folder {
  fs::path path = fs::temp_directory_path() / fmt::format("isinglass-files-{}", ::getpid());
  Folder() { fs::create_directory(path); }
  ~Folder() { fs::remove_all(path); }
  std::string operator/(const char* name) const { return (path / name).string(); }
  std::size_t entries() const {
    return static_cast<std::size_t>(std::distance(fs::directory_iterator(path), fs::directory_iterator{}));
  }
};

template <class Action>
std::string trouble(Action action) {
  try {
    action();
  } catch (const Failure& failure) {
    CHECK(failure.exit == Exit::file_trouble);
    return printed(failure.messages.front());
  }
  return {};
}

}  // namespace

TEST_CASE("what is written is read back, and replaces what was there") {
  const Folder folder;
  const std::string bytes("a\0b\r\n", 5);
  for (const std::string& text : {bytes, std::string("second")}) {
    write_whole(folder / "x", [&](std::ostream& out) { out << text; });
    CHECK(read_text(folder / "x") == text);
  }
  CHECK(folder.entries() == 1);
}

TEST_CASE("when writing fails the old file stays and nothing else is left") {
  const Folder folder;
  write_whole(folder / "x", [](std::ostream& out) { out << "old"; });
  CHECK_THROWS_AS(write_whole(folder / "x",
                              [](std::ostream& out) {
                                out << "half";
                                throw std::runtime_error("in the middle");
                              }),
                  std::runtime_error);
  CHECK(read_text(folder / "x") == "old");
  CHECK(folder.entries() == 1);
}

TEST_CASE("trouble has a name and a reason") {
  const Folder folder;
  const auto nothing = [](std::ostream&) {};
  CHECK(trouble([&] { read_text(folder / "none"); }) ==
        fmt::format("{}: error: cannot be read: No such file or directory\n", folder / "none"));
  CHECK(trouble([&] { read_text(folder.path.string()); }) ==
        fmt::format("{}: error: cannot be read: Is a directory\n", folder.path.string()));
  CHECK(trouble([&] { write_whole(folder / "no/such/place", nothing); }) ==
        fmt::format("{}: error: cannot be written: No such file or directory\n", folder / "no/such/place"));
  CHECK(trouble([&] { write_whole(folder.path.string(), nothing); }) ==
        fmt::format("{}: error: cannot be written: Is a directory\n", folder.path.string()));
  CHECK(trouble([&] {
          write_whole("/dev/full", [](std::ostream& out) { out << std::string(100000, 'x'); });
        }) == "/dev/full: error: cannot be written: No space left on device\n");
}
