// The commands as a user runs them: what they print, what they write, how they end.
#include <doctest/doctest.h>

#include <algorithm>
#include <nlohmann/json.hpp>
#include <pugixml.hpp>
#include <string>

#include "support/program.h"

using namespace isinglass::support;
using nlohmann::json;

namespace {

// The turn between the interaction and the measurement keeps the interaction from becoming work on the bits.
const std::string bell =
    "OPENQASM 3.0;\ninclude \"stdgates.inc\";\nqubit[2] q;\nbit[2] c;\nh q[0];\ncx q[0], q[1];\nry(0.4) q;\n"
    "c = measure q;\n";

std::string target(const std::string& name) {
  return tree_path("targets/" + name);
}

}  // namespace

TEST_CASE("compile writes the native program to the standard output and the summary beside it") {
  const Ran ran = run_program({"compile", "-"}, bell);
  INFO(ran.err);
  CHECK(ran.status == 0);
  CHECK(ran.out.find("xx(") != std::string::npos);
  CHECK(ran.out.find("pragma isinglass start q[0] ion[") != std::string::npos);
  CHECK(!ran.err.empty());
}

TEST_CASE("with --out the summary goes to the standard output, and --quiet leaves it out") {
  const Folder folder;
  const std::string out = folder.path("native.qasm");
  Ran ran = run_program({"compile", "-", "--out", out}, bell);
  CHECK(ran.status == 0);
  CHECK(ran.out.find("check: same. ") != std::string::npos);
  CHECK(ran.err.empty());
  ran = run_program({"compile", "-", "--out", out, "--quiet"}, bell);
  CHECK(ran.out.empty());
  CHECK(ran.err.empty());
}

TEST_CASE("the JSON summary has the promised keys") {
  const Folder folder;
  const Ran ran =
      run_program({"compile", "-", "--out", folder.path("n.qasm"), "--format", "json", "--trace"}, bell);
  const json summary = json::parse(ran.out);
  for (const char* key : {"source", "target", "totals", "before", "check", "seconds", "trace"}) {
    CHECK(summary.contains(key));
  }
  CHECK(summary["totals"]["xx"] == 1);
  CHECK(summary["before"]["two_qubit"] == 1);
  CHECK(summary["check"]["answer"] == "same");
}

TEST_CASE("the timed list has the promised keys, as JSON and as CSV") {
  const Folder folder;
  const std::string file = folder.write("bell.qasm", bell);
  const Ran ran =
      run_program({"compile", file, "--out", folder.path("n.qasm"), "--timeline", folder.path("t.json"),
                   "--report", folder.path("r.html"), "--target", target("wherry-5.toml")});
  INFO(ran.err);
  REQUIRE(ran.status == 0);
  const json timeline = json::parse(text_of(folder.path("t.json")));
  CHECK(timeline["format"] == "isinglass-timeline");
  CHECK(timeline["version"] == 1);
  CHECK(timeline["ions"] == 5);
  CHECK(timeline["placement"].size() == 2);
  CHECK(timeline["source"]["sha256"].get<std::string>().size() == 64);
  std::size_t interactions = 0;
  for (const json& operation : timeline["operations"]) interactions += operation["kind"] == "xx" ? 1 : 0;
  CHECK(interactions == timeline["totals"]["xx"]);
  run_program({"compile", file, "--out", folder.path("n.qasm"), "--timeline", folder.path("t.csv")});
  CHECK(text_of(folder.path("t.csv")).find("kind") != std::string::npos);
  CHECK(text_of(folder.path("r.html")).find("<svg") != std::string::npos);
}

TEST_CASE("the same seed gives the same bytes") {
  const Folder folder;
  for (const char* name : {"a.qasm", "b.qasm"}) {
    run_program({"compile", tree_path("corpus/search/search_4.qasm"), "--seed", "5", "--out",
                 folder.path(name), "--quiet"});
  }
  CHECK(text_of(folder.path("a.qasm")) == text_of(folder.path("b.qasm")));
}

TEST_CASE("verify says yes to what compile wrote and no to a changed angle") {
  const Folder folder;
  const std::string file = folder.write("bell.qasm", bell);
  const std::string native = folder.path("native.qasm");
  REQUIRE(run_program({"compile", file, "--out", native, "--quiet"}).status == 0);
  const Ran good = run_program({"verify", file, native, "--format", "json"});
  INFO(good.err);
  CHECK(good.status == 0);
  CHECK(json::parse(good.out)["answer"] == "same");
  std::string text = text_of(native);
  const std::size_t at = text.rfind("xx(");
  REQUIRE(at != std::string::npos);
  text.replace(at, text.find(',', at) - at, "xx(0.8");
  const Ran bad = run_program({"verify", file, folder.write("changed.qasm", text)});
  CHECK(bad.status == 1);
  CHECK(bad.out.find("different") != std::string::npos);
}

TEST_CASE("tally prints a row a circuit, goes on after a fault, and ends with its status") {
  const Folder folder;
  const std::string good = folder.write("good.qasm", bell);
  const std::string bad = folder.write("bad.qasm", "OPENQASM 3.0;\nqubit q;\nfoo q;\n");
  Ran ran = run_program({"tally", good, bad, good, "--format", "json"});
  CHECK(ran.status == 3);
  CHECK(json::parse(ran.out).size() == 2);
  ran = run_program({"tally", good});
  CHECK(ran.status == 0);
  CHECK(ran.out.find("good.qasm") != std::string::npos);
}

TEST_CASE("guard holds circuits against limits and against a baseline") {
  const Folder folder;
  const std::string file = folder.write("bell.qasm", bell);
  const std::string wide = folder.write("wide.toml", "[limits]\nxx = 10\nerror = 0.5\n");
  const std::string tight =
      folder.write("tight.toml", "[limits]\nxx = 10\n[limits.\"" + file + "\"]\nxx = 0\n");
  CHECK(run_program({"guard", file, "--limits", wide}).status == 0);
  const Ran over = run_program({"guard", file, "--limits", tight, "--junit", folder.path("j.xml")});
  CHECK(over.status == 1);
  CHECK(over.out.find("xx is 1, limit 0") != std::string::npos);
  pugi::xml_document junit;
  CHECK(junit.load_file(folder.path("j.xml").c_str()));
  CHECK(junit.child("testsuites").child("testsuite").attribute("failures").as_int() == 1);

  const Ran first = run_program({"guard", file, "--limits", wide, "--format", "json"});
  const std::string same = folder.write("same.json", first.out);
  CHECK(run_program({"guard", file, "--limits", wide, "--baseline", same}).status == 0);
  json better = json::parse(first.out);
  better[0]["totals"]["duration"] = better[0]["totals"]["duration"].get<double>() * 0.9;
  const std::string lower = folder.write("better.json", better.dump());
  CHECK(run_program({"guard", file, "--limits", wide, "--baseline", lower}).status == 1);
  CHECK(run_program({"guard", file, "--limits", wide, "--baseline", lower, "--slack", "20"}).status == 0);
}

TEST_CASE("a limits file at fault is wrong usage, each fault at its place") {
  const Folder folder;
  const std::string file = folder.write("bell.qasm", bell);
  const std::string limits = folder.write("limits.toml", "[limits]\nxx = -1\ndepth = 3\n\"r\" = \"few\"\n");
  const Ran ran = run_program({"guard", file, "--limits", limits});
  INFO(ran.err);
  CHECK(ran.status == 2);
  CHECK(ran.err.find("limits.toml:2:6: error:") != std::string::npos);
  CHECK(ran.err.find("limits.toml:3:1: error:") != std::string::npos);
  CHECK(ran.err.find("limits.toml:4:7: error:") != std::string::npos);
  CHECK(run_program({"guard", file, "--limits", folder.write("x.toml", "xx = = 3")}).status == 2);
}

TEST_CASE("every circuit of the corpus compiles, is checked, and reads back as the same program") {
  const Folder folder;
  for (const std::string& circuit : corpus()) {
    const std::string native = folder.path("native.qasm");
    const Ran compiled = run_program({"compile", circuit, "--out", native, "--format", "json"});
    INFO(circuit << "\n" << compiled.err);
    REQUIRE(compiled.status == 0);
    CHECK(json::parse(compiled.out)["check"]["answer"] == "same");
    const Ran verified = run_program({"verify", circuit, native});
    INFO(verified.out << verified.err);
    CHECK(verified.status == 0);
  }
}

TEST_CASE("a loop until success is followed to its end, and a changed turn inside it is found") {
  const Folder folder;
  const std::string source = tree_path("corpus/protocols/try_until_it_works.qasm");
  const std::string native = folder.path("native.qasm");
  REQUIRE(run_program({"compile", source, "--out", native, "--quiet"}).status == 0);
  CHECK(run_program({"verify", source, native}).status == 0);
  std::string changed = text_of(source);
  changed.replace(changed.find("  s target;"), 11, "  t target;");
  const Ran ran = run_program({"verify", folder.write("changed.qasm", changed), native});
  CHECK(ran.status == 1);
  CHECK(ran.out.find("different") != std::string::npos);
}

TEST_CASE("pragmas of the source are kept, and a native program can be compiled again") {
  const Folder folder;
  const Ran ran = run_program({"compile", "-"}, "OPENQASM 3.0;\ninclude \"stdgates.inc\";\npragma lamp on\n" +
                                                    bell.substr(bell.find("qubit")));
  INFO(ran.err);
  CHECK(ran.status == 0);
  CHECK(ran.out.find("pragma lamp on\n") != std::string::npos);
  const std::string once = folder.write("once.qasm", ran.out);
  const std::string twice = folder.path("twice.qasm");
  CHECK(run_program({"compile", once, "--out", twice, "--quiet"}).status == 0);
  CHECK(run_program({"verify", once, twice}).status == 0);
}

TEST_CASE("bind puts sets of values into a plan") {
  const Folder folder;
  const std::string heading = "OPENQASM 3.0;\ninclude \"stdgates.inc\";\n";
  const std::string body = "qubit[2] q;\nrx(t) q[0];\ncp(3 * u) q[0], q[1];\nry(t - u) q;\n";
  const std::string source = folder.write("s.qasm", heading + "input float t;\ninput float u;\n" + body);
  const std::string plan = folder.path("plan.qasm");
  REQUIRE(run_program({"compile", source, "--out", plan, "--quiet"}).status == 0);
  const std::string csv = folder.write("v.csv", "t,u\n0.5,1.25\n-2,3\n");
  const std::string lines = folder.write("v.jsonl", "{\"t\": 0.5, \"u\": 1.25}\n{\"u\": 3, \"t\": -2}\n");
  for (const std::string& values : {csv, lines}) {
    REQUIRE(run_program({"bind", plan, "--values", values, "--out", folder.path("bound-{}.qasm")}).status ==
            0);
    const char* given[2] = {"const float t = 0.5;\nconst float u = 1.25;\n",
                            "const float t = -2.0;\nconst float u = 3;\n"};
    for (int set = 0; set < 2; ++set) {
      const std::string bound_source = folder.write("b.qasm", heading + given[set] + body);
      const Ran same =
          run_program({"verify", bound_source, folder.path(set == 0 ? "bound-1.qasm" : "bound-2.qasm")});
      INFO(same.out << same.err);
      CHECK(same.status == 0);
    }
  }
  const Ran tally = run_program({"bind", plan, "--values", csv, "--tally"});
  CHECK(tally.status == 0);
  CHECK(tally.out.starts_with("set,xx,"));
  CHECK(std::count(tally.out.begin(), tally.out.end(), '\n') == 3);
  CHECK(run_program({"bind", plan, "--values", csv, "--out", folder.path("one.qasm")}).status == 2);
}

TEST_CASE("faults of a values file are said with their line") {
  const Folder folder;
  const std::string source = folder.write(
      "s.qasm",
      "OPENQASM 3.0;\ninclude \"stdgates.inc\";\ninput float t;\nqubit q;\nrx(t) q;\nry(2 * t) q;\n");
  const std::string plan = folder.path("plan.qasm");
  REQUIRE(run_program({"compile", source, "--out", plan, "--quiet"}).status == 0);
  const std::pair<std::string, std::string> faults[] = {
      {"t\n0.5\nhalf\n", ":3:"},   {"u\n0.5\n", ":1:"},
      {"t\n1,2\n", ":2:"},         {"{\"t\": 1}\n{\"t\": \"x\"}\n", ":2:"},
      {"{\"t\": 1}\n{}\n", ":2:"}, {"{\"t\": 1, \"v\": 2}\n", ":1:"},
      {"", "no values"},           {"t\n", "no set"}};
  for (const auto& [text, place] : faults) {
    const Ran ran =
        run_program({"bind", plan, "--values", folder.write("v", text), "--out", folder.path("o{}")});
    INFO(text << "\n" << ran.err);
    CHECK(ran.status == 2);
    CHECK(ran.err.find(place) != std::string::npos);
  }
  CHECK(run_program({"bind", source, "--values", folder.write("v", "t\n1\n")}).status == 3);
  CHECK(run_program({"bind", plan, "--values", folder.path("nowhere")}).status == 5);
}

TEST_CASE("an extern is kept as a call, and its declaration with it") {
  const Ran ran =
      run_program({"compile", "-"},
                  "OPENQASM 3.0;\ninclude \"stdgates.inc\";\nextern weigh(bit[2]) -> bool;\nqubit[2] q;\n"
                  "bit[2] c;\nh q;\nc = measure q;\nif (weigh(c)) { x q[0]; }\n");
  INFO(ran.err);
  CHECK(ran.status == 0);
  CHECK(ran.out.find("extern weigh(bit[2]) -> bool;") != std::string::npos);
  CHECK(ran.out.find("weigh(c)") != std::string::npos);
}

TEST_CASE("durationof takes the figures of the target, and a missing target is the target's fault") {
  const Folder folder;
  const std::string source = folder.write(
      "s.qasm",
      "OPENQASM 3.1;\ninclude \"stdgates.inc\";\nqubit[2] q;\n"
      "delay[durationof({ x q[0]; reset q[0]; })] q[1];\nstretch a;\nbox[1ms] { x q[0]; delay[a] q[0]; }\n");
  const auto compiled = [&](const std::string& figures) {
    const std::string target = folder.write(
        "m.toml", "name = \"m\"\n[machine]\nions = 3\n[ion]\npulse_error = 1e-4\nmeasure_error = 1e-3\n" +
                      figures + "[pair]\ninteraction_us = 300\nerror_floor = 1e-3\nerror_slope = 1e-3\n");
    const Ran ran = run_program({"compile", source, "--quiet", "--target", target});
    INFO(ran.err);
    CHECK(ran.status == 0);
    return ran.out;
  };
  const std::string typical = run_program({"compile", source, "--quiet"}).out;
  CHECK(typical.find("delay[25us]") != std::string::npos);
  CHECK(typical.find("delay[995us]") != std::string::npos);
  const std::string slow = compiled("pulse_us = 8\nreset_us = 100\n");
  CHECK(slow.find("delay[108us]") != std::string::npos);
  CHECK(slow.find("delay[992us]") != std::string::npos);
  CHECK(run_program({"compile", source, "--quiet", "--target", folder.path("none.toml")}).status == 5);
}

TEST_CASE("annotations stand before what their statement became; those of vanished gates are told") {
  const Folder folder;
  const std::string source = folder.write("s.qasm", R"(OPENQASM 3.1;
include "stdgates.inc";
@wires
qubit[2] q;
@results of all
bit[2] c;
@gone
h q[0];
@also.gone
h q[0];
h q;
@both
for int i in [0:1] {
  @turn
  crx(0.3) q[i], q[1 - i];
}
@reads
c[0] = measure q[0];
@choice
if (c[0]) {
  @inner
  cy q[0], q[1];
}
@last
c[1] = measure q[1];
)");
  const Ran ran = run_program({"compile", source});
  INFO(ran.out << ran.err);
  REQUIRE(ran.status == 0);
  for (const std::string wanted :
       {"@results of all\nbit[2] c;\n", "@both\n@turn\nxx(", "@reads\nc[0] = measure",
        "@choice\nif (c[0]) {\n", "  @inner\n  ", "@last\nc[1] = measure"}) {
    INFO(wanted);
    CHECK(ran.out.find(wanted) != std::string::npos);
  }
  CHECK(ran.out.find("gone") == std::string::npos);
  CHECK(ran.out.find("@wires") == std::string::npos);
  CHECK(ran.err.find("s.qasm:3:1: warning: the annotation @wires is dropped") != std::string::npos);
  CHECK(ran.err.find("s.qasm:7:1: warning: 2 annotations are dropped") != std::string::npos);
  CHECK(ran.err.find("@gone (line 7), @also.gone (line 9)") != std::string::npos);
  // They survive a second time, and binding.
  const std::string native = folder.write("n.qasm", ran.out);
  const Ran again = run_program({"compile", native, "--quiet"});
  CHECK(again.out.find("@choice\nif (c[0]) {\n") != std::string::npos);
  CHECK(run_program({"verify", source, native}).status == 0);
  CHECK(run_program({"compile", folder.write("e.qasm", "OPENQASM 3.0;\nqubit q;\n@alone\n")}).status == 3);
}

TEST_CASE("bind: arithmetic on an input angle[n] wraps, on other inputs it does not, under a control too") {
  const Folder folder;
  const std::string heading = "OPENQASM 3.1;\ninclude \"stdgates.inc\";\n";
  const std::string body =
      "qubit[2] q;\nctrl @ rx(a + b) q[0], q[1];\nctrl @ rx(3 * a) q[0], q[1];\ncrz(a) q[1], q[0];\n"
      "ctrl @ rx(a * k) q[0], q[1];\nctrl @ rx(w * v) q[0], q[1];\nctrl @ rx(2 * w + 0.1) q[0], q[1];\n";
  const std::string source = folder.write(
      "s.qasm", heading +
                    "input angle[4] a; input angle[4] b; input uint[3] k; input angle w; input float v;\n" +
                    body);
  // 13 and 7 sixteenths of a turn.
  const std::string bound =
      folder.write("b.qasm", heading +
                                 "const angle[4] a = angle[4](\"1101\"); const angle[4] b = "
                                 "angle[4](\"0111\"); const uint[3] k = 5; "
                                 "const float w = 2.5; const float v = 3.5;\n" +
                                 body);
  const std::string values =
      folder.write("v.csv", "a,b,k,w,v\n5.105088062083414,2.748893571891069,5,2.5,3.5\n");
  const std::string plan = folder.path("plan.qasm");
  REQUIRE(run_program({"compile", source, "--out", plan, "--quiet"}).status == 0);
  REQUIRE(run_program({"bind", plan, "--values", values, "--out", folder.path("n.qasm"), "--quiet"}).status ==
          0);
  const Ran same = run_program({"verify", bound, folder.path("n.qasm")});
  INFO(same.out << same.err);
  CHECK(same.status == 0);
}
