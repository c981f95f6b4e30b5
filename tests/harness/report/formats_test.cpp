#include "harness/report/formats.h"

#include "tests/harness/report/sample.h"

#include <catch2/catch.hpp>

#include <set>

namespace {

// What base::visible leaves of the text but its line feeds.
std::string without_line_feeds(std::string text) {
  std::erase(text, '\n');
  return text;
}

}  // namespace

// Catches: a format without a name, or two that write the same file over each other.
TEST_CASE("every format has a name and a file of its own") {
  std::set<std::string_view> names, files;
  for (const report::Format& format : report::formats()) {
    CHECK(!format.summary.empty());
    CHECK(names.insert(format.name).second);
    CHECK(files.insert(format.file).second);
    CHECK(format.write != nullptr);
  }
  CHECK(names.size() >= 4);
}

// Catches: a name from outside that puts control or bidirectional characters, or bytes that are no
// UTF-8, into a report, and a report that differs between two calls.
TEST_CASE("every format is safe to look at and the same each time") {
  std::vector<std::string> names = sample::hostile_names();
  names.emplace_back("no \xFF UTF-8 \xE2\x80");
  for (const std::string& name : names) {
    const model::RunResult run = sample::hostile(name, true);
    for (const report::Format& format : report::formats()) {
      CAPTURE(format.name, name);
      const std::string text = format.write(run, {});
      CHECK(text == format.write(run, {}));
      const std::string plain = without_line_feeds(text);
      CHECK(base::visible(plain) == plain);
    }
  }
}
