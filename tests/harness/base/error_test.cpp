#include "harness/base/error.h"

#include <catch2/catch.hpp>

using base::Problem;

// Catches: a place that is left out or in another form than editors and build servers can follow.
TEST_CASE("a problem reads file:line:column: message (pointer)") {
  CHECK(base::describe({"bad", "a.json", 12, 20, "/x/0"}) == "a.json:12:20: bad (/x/0)");
  CHECK(base::describe({"bad", "a.json", 0, 0, ""}) == "a.json: bad");
  CHECK(base::describe({"bad", "", 0, 0, ""}) == "bad");
}

// Catches: a message that a name of a million letters makes unreadable, or cuts a character in two.
TEST_CASE("a message stays readable whatever the name") {
  std::string name;
  for (int i = 0; i < 100000; ++i) name += "\u00e4";
  const std::string text = base::describe({"no joint '" + name + "' here", "f", 0, 0, "/" + name});
  CHECK(text.size() < 1300);
  CHECK(text.find("no joint '") != std::string::npos);
  CHECK(text.find("' here") != std::string::npos);
  CHECK(base::visible(text) == text);  // still valid UTF-8
}

// Catches: names from an asset that rearrange or hide the text around them. Code points: Unicode
// Standard Annex 9 (bidirectional formatting characters).
TEST_CASE("treacherous characters become visible") {
  CHECK(base::visible("plain äöü 足") == "plain äöü 足");
  CHECK(base::visible("a\nb\x1b[31m") == "a\\u{000A}b\\u{001B}[31m");
  CHECK(base::visible("x\xE2\x80\xAEy") == "x\\u{202E}y");
  CHECK(base::visible("\xE2\x81\xA6") == "\\u{2066}");
  CHECK(base::visible("\xFF\xC0\x80") == "\\x{FF}\\x{C0}\\x{80}");  // invalid and overlong UTF-8
  CHECK(base::visible("\xED\xA0\x80") == "\\x{ED}\\x{A0}\\x{80}");  // surrogate
}

// Catches: a hint that points at a name nobody would have meant, or none for a slip of the finger.
TEST_CASE("the nearest name is hinted at, else the known ones are listed") {
  const std::vector<std::string> known{"linear_blend", "dual_quaternion", "rigid"};
  CHECK(base::nearest_name("linear_blnd", known) == "linear_blend");
  CHECK(base::nearest_name("RIGID", known) == "rigid");
  CHECK(base::nearest_name("qqqqqqqq", known).empty());
  CHECK(base::hint("rigd", known) == "; did you mean 'rigid'?");
  CHECK(base::hint("qqqqqqqq", known) == "; known: linear_blend, dual_quaternion, rigid");
  CHECK(base::hint("x", {}).empty());
}
