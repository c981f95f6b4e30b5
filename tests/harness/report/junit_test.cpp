#include "tests/harness/report/sample.h"

#include <catch2/catch.hpp>

#include <cctype>
#include <map>
#include <set>
#include <stdexcept>

namespace {

struct Element {
  std::string tag, text;
  std::map<std::string, std::string> attributes;
  std::vector<Element> children;

  std::size_t count(const std::string& wanted) const {
    std::size_t found = tag == wanted ? 1 : 0;
    for (const Element& child : children) found += child.count(wanted);
    return found;
  }
};

// A strict reader of the part of XML 1.0 that elements, attributes and text make; anything else,
// and anything not well-formed, throws.
class Scanner {
 public:
  explicit Scanner(const std::string& text) : text_(text) {}

  Element document() {
    expect("<?xml version=\"1.0\" encoding=\"UTF-8\"?>\n");
    Element root = element();
    expect("\n");
    if (at_ != text_.size()) throw std::runtime_error("text after the root");
    return root;
  }

 private:
  char peek() const {
    if (at_ >= text_.size()) throw std::runtime_error("ends early");
    return text_[at_];
  }
  bool starts(const std::string& wanted) const {
    return text_.compare(at_, wanted.size(), wanted) == 0;
  }
  void expect(const std::string& wanted) {
    if (!starts(wanted))
      throw std::runtime_error("expected " + wanted + " at " + text_.substr(at_, 40));
    at_ += wanted.size();
  }
  std::string name() {
    std::string out;
    while (std::isalpha(static_cast<unsigned char>(peek())) != 0) out += text_[at_++];
    if (out.empty()) throw std::runtime_error("no name at " + text_.substr(at_, 40));
    return out;
  }
  // One character of text, references resolved.
  std::string character() {
    const std::pair<const char*, const char*> known[] = {
        {"&amp;", "&"}, {"&lt;", "<"}, {"&gt;", ">"}, {"&quot;", "\""}, {"&apos;", "'"}};
    if (peek() == '&') {
      for (const auto& [reference, meaning] : known)
        if (starts(reference)) return at_ += std::string(reference).size(), meaning;
      throw std::runtime_error("unknown reference");
    }
    if (starts("]]>") || starts("\xEF\xBF\xBE") || starts("\xEF\xBF\xBF"))
      throw std::runtime_error("a character that XML text may not hold");
    if (static_cast<unsigned char>(peek()) < 0x20 && peek() != '\n')
      throw std::runtime_error("a control character");
    return {text_[at_++]};
  }
  Element element() {
    Element out;
    expect("<");
    out.tag = name();
    while (starts(" ")) {
      expect(" ");
      const std::string key = name();
      expect("=\"");
      std::string value;
      while (peek() != '"') {
        if (peek() == '<' || peek() == '\n') throw std::runtime_error("in an attribute");
        value += character();
      }
      expect("\"");
      if (!out.attributes.emplace(key, value).second) throw std::runtime_error("attribute twice");
    }
    if (starts("/>")) {
      expect("/>");
      return out;
    }
    expect(">");
    while (!starts("</")) {
      if (peek() == '<')
        out.children.push_back(element());
      else
        out.text += character();
    }
    expect("</" + out.tag + ">");
    return out;
  }

  const std::string& text_;
  std::size_t at_ = 0;
};

Element parsed(const model::RunResult& run) {
  const std::string text = report::junit_xml(run);
  return Scanner(text).document();
}

}  // namespace

// Catches: a verdict told as another outcome, and totals that do not match what is listed.
TEST_CASE("junit.xml tells every verdict as its outcome") {
  const Element root = parsed(sample::run());
  REQUIRE(root.tag == "testsuites");
  REQUIRE(root.children.size() == 2);
  const Element& suite = root.children[0];
  CHECK(suite.attributes.at("name") == "mire-strider");
  REQUIRE(suite.children.size() == 5);
  for (const Element& one : suite.children)
    CHECK(one.attributes.at("classname") == "skinfold.mire-strider");

  CHECK(suite.children[0].attributes.at("name") == "lod0/walk/ship");
  CHECK(suite.children[0].children.empty());

  const Element& waived = suite.children[1].children.at(0);
  CHECK(waived.tag == "skipped");
  CHECK(waived.attributes.at("message") == "known until the new rig");

  const Element& not_signed = suite.children[2].children.at(0);
  CHECK(not_signed.tag == "failure");
  CHECK(not_signed.attributes.at("type") == "unsigned");
  CHECK_THAT(not_signed.text, Catch::Contains("skinfold signoff OUT_DIR"));

  const Element& beyond = suite.children[3].children.at(0);
  CHECK(beyond.tag == "failure");
  CHECK(beyond.attributes.at("type") == "beyond");
  CHECK(beyond.attributes.at("message") ==
        "edge_stretch.max drifted by 0.031 from the golden, allowed ≤ 0.005 (6.2x), frame 9 at "
        "0.375 s, joint shin.L");
  CHECK_THAT(beyond.text, Catch::Contains("volume.change") &&
                              Catch::Contains("changed since sign-off: weights"));

  const Element& broken = suite.children[4].children.at(0);
  CHECK(broken.tag == "error");
  CHECK(broken.attributes.at("message") == "strider.glb:3:7: ends after 12 bytes (/nodes/2)");

  for (const Element& part : root.children) {
    CHECK(part.attributes.at("tests") == std::to_string(part.count("testcase")));
    CHECK(part.attributes.at("failures") == std::to_string(part.count("failure")));
    CHECK(part.attributes.at("errors") == std::to_string(part.count("error")));
    CHECK(part.attributes.at("skipped") == std::to_string(part.count("skipped")));
  }
  CHECK(root.attributes.at("tests") == "6");
  CHECK(root.attributes.at("failures") == "2");
  CHECK(root.attributes.at("errors") == "2");
}

// Catches: a suite that was not read and that a build server then shows as passed.
TEST_CASE("junit.xml has an error for a suite that could not be read") {
  const Element root = parsed(sample::run());
  const Element& unread = root.children[1];
  REQUIRE(unread.children.size() == 1);
  CHECK(unread.children[0].attributes.at("classname") == "skinfold.house");
  CHECK(unread.children[0].attributes.at("name") == "suite");
  const Element& error = unread.children[0].children.at(0);
  CHECK(error.tag == "error");
  CHECK_THAT(error.text, Catch::Contains("rigz") && Catch::Contains("'motions' is missing"));
}

// Catches: a time that servers refuse: more than three decimals, an exponent, nan or a sign.
TEST_CASE("junit.xml writes times with three decimals") {
  const auto [seconds, text] = GENERATE(table<double, std::string>({{1.23456, "1.235"},
                                                                    {0.0, "0.000"},
                                                                    {2e-9, "0.000"},
                                                                    {1e7, "10000000.000"},
                                                                    {-1.0, "0.000"},
                                                                    {sample::kNaN, "0.000"}}));
  model::RunResult run = sample::run();
  run.suites.resize(1);
  run.suites[0].cases.resize(1);
  run.suites[0].cases[0].seconds = seconds;
  const Element root = parsed(run);
  CHECK(root.children[0].children[0].attributes.at("time") == text);
  CHECK(root.attributes.at("time") == text);
}

// Catches: two test cases of one identity, of which servers drop one.
TEST_CASE("junit.xml never names two test cases alike") {
  model::RunResult run = sample::run();
  run.suites.push_back(run.suites[1]);  // two suites that were not read
  run.suites.push_back(run.suites[0]);
  run.suites[0].cases[0].name = "a\u202E";  // alike once made visible
  run.suites[0].cases[1].name = "a\\u{202E}";
  std::set<std::string> identities;
  std::size_t cases = 0;
  for (const Element& suite : parsed(run).children)
    for (const Element& one : suite.children) {
      ++cases;
      identities.insert(one.attributes.at("classname") + '\n' + one.attributes.at("name"));
    }
  CHECK(cases == 12);
  CHECK(identities.size() == cases);
}

// Catches: a name that ends an attribute or element, or a character that makes the file unreadable.
TEST_CASE("hostile names leave junit.xml well-formed") {
  const std::size_t which = GENERATE(range(std::size_t{0}, sample::hostile_names().size()));
  const std::string& name = sample::hostile_names()[which];
  const Element root = parsed(sample::hostile(name, true));
  CHECK(root.count("testcase") == 6);
  CHECK(root.count("script") == 0);
  if (name.find("script") != std::string::npos || name.size() == 300)
    CHECK(root.children[0].attributes.at("name") == name);
}
