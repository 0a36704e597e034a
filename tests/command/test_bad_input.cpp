// Bad input ends in one clear message and the right exit status, and nothing is written.
#include <doctest/doctest.h>

#include <string>

#include "support/program.h"

using namespace isinglass::support;

namespace {

const std::string heading = "OPENQASM 3.0;\ninclude \"stdgates.inc\";\n";
const std::string bell = heading + "qubit[2] q;\nh q[0];\ncx q[0], q[1];\n";

std::size_t count(const std::string& text, const std::string& part) {
  std::size_t found = 0;
  for (std::size_t at = text.find(part); at != std::string::npos; at = text.find(part, at + 1)) ++found;
  return found;
}

/// Compiles `source` and expects one error with this status that mentions `words` at `place`
/// (":line:column:").
void expect_fault(const std::string& source, int status, const std::string& place, const std::string& words,
                  const std::vector<std::string>& more = {}) {
  const Folder folder;
  const std::string file = folder.write("source.qasm", source);
  const std::string out = folder.path("native.qasm");
  std::vector<std::string> arguments = {"compile", file, "--out", out};
  arguments.insert(arguments.end(), more.begin(), more.end());
  const Ran ran = run_program(arguments);
  INFO(ran.err);
  CHECK(ran.status == status);
  CHECK(count(ran.err, "error: ") == 1);
  CHECK(ran.err.find(words) != std::string::npos);
  if (!place.empty()) CHECK(ran.err.find("source.qasm" + place) != std::string::npos);
  CHECK(ran.err.size() < 2000);
  CHECK(ran.out.empty());
  CHECK(folder.names() == std::vector<std::string>{"source.qasm"});
}

}  // namespace

TEST_CASE("an empty file") {
  expect_fault("", 3, "", "no program");
}

TEST_CASE("a binary file") {
  std::string bytes =
      "\x7f"
      "ELF";
  for (int i = 0; i < 5000; ++i) bytes += static_cast<char>(i * 37 % 256);
  expect_fault(bytes, 3, "", "");
}

TEST_CASE("ten megabytes on one line") {
  std::string text = heading + "qubit q; ";
  while (text.size() < 10'000'000) text += "x q; ";
  expect_fault(text + "x nothing;", 3, ":3:", "nothing");
}

TEST_CASE("an unknown gate") {
  expect_fault(bell + "hadamard q[0];\n", 3, ":6:1:", "hadamard");
}

TEST_CASE("wrong arity") {
  expect_fault(bell + "cx q[0];\n", 3, ":6:1:", "cx");
  expect_fault(bell + "rx q[0];\n", 3, ":6:1:", "rx");
}

TEST_CASE("an index out of range") {
  expect_fault(bell + "x q[2];\n", 3, ":6:5:", "2");
}

TEST_CASE("a qubit used twice") {
  expect_fault(bell + "cx q[1], q[1];\n", 3, ":6:", "twice");
}

TEST_CASE("a missing source") {
  const Ran ran = run_program({"compile", "/nowhere/at/all.qasm"});
  CHECK(ran.status == 5);
  CHECK(count(ran.err, "error: ") == 1);
  CHECK(ran.err.find("/nowhere/at/all.qasm") != std::string::npos);
}

TEST_CASE("a missing target") {
  expect_fault(bell, 5, "", "nowhere.toml", {"--target", "/nowhere.toml"});
}

TEST_CASE("a target that is too small") {
  expect_fault(heading + "qubit[6] q;\nx q;\n", 4, "", "6", {"--target", tree_path("targets/wherry-5.toml")});
}

TEST_CASE("a physical qubit that the machine does not have") {
  expect_fault(heading + "x $5;\n", 4, "", "$5 is ion 5", {"--target", tree_path("targets/wherry-5.toml")});
}

TEST_CASE("an output that cannot be written") {
  const Folder folder;
  const std::string file = folder.write("source.qasm", bell);
  for (const std::string& out :
       {folder.path("no/such/folder/native.qasm"), std::string("/proc/native.qasm")}) {
    const Ran ran = run_program({"compile", file, "--out", out});
    INFO(ran.err);
    CHECK(ran.status == 5);
    CHECK(count(ran.err, "error: ") == 1);
  }
  CHECK(folder.names().size() == 1);
}

TEST_CASE("wrong usage") {
  for (const std::vector<std::string>& arguments : {std::vector<std::string>{},
                                                    {"polish"},
                                                    {"compile"},
                                                    {"compile", "x.qasm", "--effort", "heroic"},
                                                    {"compile", "x.qasm", "--spend", "-1"},
                                                    {"guard", "x.qasm"},
                                                    {"tally", "x.qasm", "--unheard-of"}}) {
    const Ran ran = run_program(arguments);
    INFO(ran.err);
    CHECK(ran.status == 2);
    CHECK(count(ran.err, "error: ") == 1);
  }
}

TEST_CASE("all errors of a file in one run") {
  const Folder folder;
  const std::string file = folder.write("source.qasm", bell + "hadamard q[0];\nx q[7];\ncx q[0], q[0];\n");
  const Ran ran = run_program({"compile", file});
  INFO(ran.err);
  CHECK(ran.status == 3);
  CHECK(count(ran.err, "error: ") == 3);
}

TEST_CASE("help and version go to the standard output") {
  for (const char* flag : {"--help", "-h", "--version"}) {
    const Ran ran = run_program({flag});
    CHECK(ran.status == 0);
    CHECK(!ran.out.empty());
    CHECK(ran.err.empty());
  }
}
