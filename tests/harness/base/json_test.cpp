#include "harness/base/json.h"

#include <catch2/catch.hpp>

using base::Json;
using base::JsonSource;
using base::JsonView;

namespace {

std::string fault(const std::string& text, base::JsonLimits limits = {}) {
  const JsonSource source{"f.json", "", text};
  try {
    base::parse_json(source, limits);
  } catch (const base::InputError& error) {
    return error.what();
  }
  return "";
}

}  // namespace

// Catches: places that drift after comments, escapes, nested values or a byte order mark.
TEST_CASE("every value knows where it begins") {
  const JsonSource source{"f.json", "",
                          "\xEF\xBB\xBF{ // a comment with \"quotes\", {and: brackets}\n"
                          "  \"a\\\"b\": [1, -2.5e3 , \"x\\\\\"],\n"
                          "  /* more */ \"c\": {\"d\": null, \"e\": true}\n}"};
  const Json root = base::parse_json(source, {.comments = true});
  const auto place = [](const Json& json) {
    const base::Problem problem = base::problem_at(json, "", "");
    return std::pair(problem.line, problem.column);
  };
  const Json& array = *root.find("a\"b");
  CHECK(place(array) == std::pair(2, 11));
  CHECK(place(array.items[1]) == std::pair(2, 15));
  CHECK(array.items[1].number == -2500);
  CHECK(array.items[1].integer);  // -2.5e3 is a whole number
  CHECK(place(array.items[2]) == std::pair(2, 24));
  CHECK(array.items[2].string == "x\\");
  const Json& object = *root.find("c");
  CHECK(place(object) == std::pair(3, 19));
  CHECK(place(*object.find("e")) == std::pair(3, 36));
}

// Catches: a hostile or mistyped file that is half accepted.
TEST_CASE("what is not JSON is refused with its place") {
  CHECK(fault("{\"a\": 1, \"a\": 2}").find("f.json:1:10: the key 'a' occurs twice") == 0);
  CHECK(fault("{\"a\": [1, 2").find("f.json:1:") == 0);
  CHECK(fault("{\"a\": 1e999}").find("too large for a double") != std::string::npos);
  CHECK(fault("{} x").find("not valid JSON") != std::string::npos);
  CHECK(fault("// c\n{}").find("not valid JSON") != std::string::npos);
  CHECK(fault("// c\n{}", {.comments = true}).empty());
  CHECK(fault(std::string(65, '[') + std::string(65, ']')).find("nested more than 64 deep") !=
        std::string::npos);
  CHECK(fault(std::string(64, '[') + std::string(64, ']')).empty());
  CHECK(fault(std::string(1000000, '[')).find("nested more than") != std::string::npos);
}

// Catches: a reader that stops at the first fault, or takes a value of the wrong type.
TEST_CASE("a view reports every wrong member and every unknown key") {
  const JsonSource source{
      "f.json", "",
      R"({"n": "1", "i": 1.5, "r": 7, "c": "lef", "v": [1, "2"], "w": [1], "typo": 0, "t": "x"})"};
  const Json root = base::parse_json(source);
  std::vector<base::Problem> problems;
  JsonView view(root, "", problems);
  CHECK(view.number("n", 4) == 4);
  CHECK(view.integer("i", 5) == 5);
  CHECK(view.number("r", 1, {0, 2}) == 1);
  CHECK(view.choice("c", {"left", "right"}) == "left");
  CHECK(view.numbers("v").empty());
  CHECK(view.numbers("w", 2).empty());
  CHECK(view.text("t") == "x");
  CHECK(view.text("absent", "fallback") == "fallback");
  CHECK(view.required("needed", Json::Kind::Array) == nullptr);
  view.member("type");
  view.close();
  std::vector<std::string> said;
  for (const auto& problem : problems) said.push_back(base::describe(problem));
  REQUIRE(said.size() == 8);
  CHECK(said[0] == "f.json:1:7: a number was expected, not a string (/n)");
  CHECK(said[1] == "f.json:1:17: a whole number was expected, not 1.5 (/i)");
  CHECK(said[2] == "f.json:1:27: a number from 0 to 2 was expected, not 7 (/r)");
  CHECK(said[3] == "f.json:1:35: unknown value 'lef'; did you mean 'left'? (/c)");
  CHECK(said[4] == "f.json:1:51: a number was expected, not a string (/v/1)");
  CHECK(said[5] == "f.json:1:62: 2 numbers were expected, not 1 (/w)");
  CHECK(said[6] == "f.json:1:1: the key 'needed' is missing (an array)");
  CHECK(said[7] == "f.json:1:75: unknown key 'typo'; did you mean 'type'? (/typo)");
}

// Catches: a pointer that an editor cannot follow. Source: RFC 6901.
TEST_CASE("pointers escape as RFC 6901 says") {
  CHECK(base::child_pointer("/a", "b/c~d") == "/a/b~1c~0d");
  CHECK(base::child_pointer("", std::size_t{3}) == "/3");
}
