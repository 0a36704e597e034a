// The report: one well-formed page that needs nothing else, tells the figures, and survives hostile names.
#include <doctest/doctest.h>
#include <fmt/format.h>

#include <pugixml.hpp>
#include <sstream>

#include "output/report.h"
#include "output/sample.h"
#include "support/random_circuits.h"

using namespace isinglass;

namespace {

std::string page(const Compiled& compiled) {
  std::ostringstream text;
  write_report(text, compiled);
  return text.str();
}

bool is_well_formed(const std::string& text) {
  pugi::xml_document document;
  return static_cast<bool>(document.load_buffer(text.data(), text.size(), pugi::parse_full));
}

std::size_t count(const std::string& text, const std::string& word) {
  std::size_t found = 0;
  for (std::size_t at = text.find(word); at != std::string::npos; at = text.find(word, at + 1)) ++found;
  return found;
}

}  // namespace

TEST_CASE("the page is well-formed, whole and tells the figures") {
  const Sample sample;
  const std::string text = page(sample.compiled);
  CHECK(is_well_formed(text));
  CHECK(count(text, "http") == 0);
  CHECK(count(text, "<script") == 0);
  CHECK(count(text, "url(") == 0);
  CHECK(text.find("lang=\"en\"") != std::string::npos);
  CHECK(count(text, "role=\"img\"") == 5);
  CHECK(count(text, "<title>") >= 6);
  CHECK(text.find(fmt::format("{:.2f} %", 100 * sample.timed.totals.success)) != std::string::npos);
  CHECK(text.find("q[0]") != std::string::npos);
  CHECK(text.find("if (c[0] == 1)") != std::string::npos);
}

TEST_CASE("a rehearsal has its own picture") {
  Sample sample;
  Rehearsal rehearsal;
  rehearsal.outcomes = {{"c=01", 0.75, 0.7}, {"c=10", 0.25, 0.3}};
  sample.compiled.rehearsal = &rehearsal;
  const std::string text = page(sample.compiled);
  CHECK(is_well_formed(text));
  CHECK(count(text, "role=\"img\"") == 6);
  CHECK(text.find("70.00 %") != std::string::npos);
}

TEST_CASE("names cannot break out of the page") {
  Sample sample;
  sample.compiled.source_file = "<script>\"&'</script>.qasm";
  const std::string text = page(sample.compiled);
  CHECK(is_well_formed(text));
  CHECK(count(text, "<script") == 0);
}

TEST_CASE("a long chain is drawn in bounded size") {
  Circuit c;
  add_register(c, "q", 3000);
  for (std::uint32_t q = 0; q + 1 < 3000; ++q)
    c.body().push_back(c.make(Kind::xx, {q, q + 1}, {{1}, {0}, {0}}));
  const Target target = typical(3000);
  const Placed placed = place(c, target);
  const Timed timed = schedule(placed, target, {});
  const std::string text = page({"a", "", target, placed, timed, {}, ""});
  CHECK(is_well_formed(text));
  CHECK(text.size() < 3000000);
}

TEST_CASE("a long program is drawn in bounded size") {
  support::Random random(4);
  const auto size = [&](int gates) {
    const Circuit c = support::random_circuit(random, {6, gates, 0, support::Family::native});
    const Target target = typical(6);
    const Placed placed = place(c, target);
    const Timed timed = schedule(placed, target, {});
    const std::string text = page({"a", "", target, placed, timed, {}, ""});
    CHECK(is_well_formed(text));
    return text.size();
  };
  CHECK(size(20000) < 600000);
  CHECK(size(200000) < 600000);
  CHECK(size(0) > 1000);
}
