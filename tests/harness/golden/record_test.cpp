#include "harness/base/error.h"
#include "harness/golden/golden.h"
#include "tests/harness/golden/scratch.h"

#include <catch2/catch.hpp>

#include <cmath>
#include <fstream>
#include <limits>

using tests::Scratch;

namespace {

std::string digits(char c) {
  return std::string(64, c);
}

model::Record sample() {
  model::Record record;
  record.suite = "mire-strider";
  record.name = "lod0/knee/ship";
  record.program = "0.1.0";
  record.frames_file = "frames-" + std::string(16, 'a') + ".bin";
  record.frames_sha256 = digits('a');
  record.frames = 2;
  record.vertices = 8;
  record.faces = 12;
  record.diagonal = 0.1;
  record.grain = 1e-300;
  record.magnitude = std::numeric_limits<double>::max();
  record.weld = 5e-324;
  record.bind_scale = {{"Strider", 100}, {"a \"name\"", 1.0 / 3}};
  record.inputs = {{"weights", digits('1')}, {"bind", digits('2')}};
  record.worst = {{"volume.change", {-0.25, 1}}, {"edge_stretch.max", {1.21, 0}}};
  record.frame_sha256 = {digits('3'), digits('4')};
  record.non_finite = 3;
  record.signoffs = {{"Ada", "lead", "2024-05-02T10:00:00Z", "new weights", digits('5')},
                     {"Bo", "", "2024-05-01T10:00:00Z", "first", ""}};
  return record;
}

model::Record parsed(const std::string& text) {
  const Scratch scratch;
  std::ofstream(scratch / "record.json", std::ios::binary) << text;
  return golden::read_record(scratch / "record.json", "golden/record.json");
}

std::string refusal(const std::string& text) {
  try {
    parsed(text);
  } catch (const base::InputError& error) {
    return error.what();
  }
  return "accepted";
}

// The sample's text with one piece replaced; the piece must be there.
std::string changed(const std::string& from, const std::string& to) {
  std::string text = golden::write_record(sample());
  const std::size_t at = text.find(from);
  REQUIRE(at != std::string::npos);
  return text.replace(at, from.size(), to);
}

}  // namespace

// Fault: a field that is forgotten or loses digits on its way through the file.
TEST_CASE("a record comes back as it was written") {
  const model::Record a = sample();
  const std::string text = golden::write_record(a);
  const model::Record b = parsed(text);
  CHECK(b.suite == a.suite);
  CHECK(b.name == a.name);
  CHECK(b.program == a.program);
  CHECK(b.frames_file == a.frames_file);
  CHECK(b.frames_sha256 == a.frames_sha256);
  CHECK(b.frames == a.frames);
  CHECK(b.vertices == a.vertices);
  CHECK(b.faces == a.faces);
  CHECK(b.diagonal == a.diagonal);
  CHECK(b.grain == a.grain);
  CHECK(b.magnitude == a.magnitude);
  CHECK(b.weld == a.weld);
  CHECK(b.bind_scale == a.bind_scale);
  CHECK(b.inputs == a.inputs);
  REQUIRE(b.worst.size() == 2);
  CHECK(b.worst.at("volume.change").value == -0.25);
  CHECK(b.worst.at("volume.change").frame == 1);
  CHECK(b.worst.at("edge_stretch.max").value == 1.21);
  CHECK(b.frame_sha256 == a.frame_sha256);
  CHECK(b.non_finite == 3);
  REQUIRE(b.signoffs.size() == 2);
  CHECK(b.signoffs[0].by == "Ada");
  CHECK(b.signoffs[0].role == "lead");
  CHECK(b.signoffs[0].when == "2024-05-02T10:00:00Z");
  CHECK(b.signoffs[0].why == "new weights");
  CHECK(b.signoffs[0].predecessor == digits('5'));
  CHECK(b.signoffs[1].predecessor.empty());
  CHECK(golden::write_record(b) == text);
}

// Fault: keys out of order, other spacing, a format that drifts: records are reviewed as text and
// their hash is the next one's predecessor.
TEST_CASE("the text of a record is fixed") {
  model::Record record;
  record.suite = "arm";
  record.name = "main/bend/ship";
  record.program = "0.1.0";
  record.frames_sha256 = digits('0');
  record.frames_file = "frames-0000000000000000.bin";
  record.frames = 1;
  record.diagonal = 2.5;
  record.grain = 1e-6;
  record.frame_sha256 = {digits('1')};
  record.worst = {{"volume.change", {-0.125, 0}}};
  record.signoffs = {{"Ada", "", "2024-05-02T10:00:00Z", "first", ""}};
  CHECK(golden::write_record(record) == R"({
  "bind_scale": {},
  "diagonal": 2.5,
  "faces": 0,
  "frame_sha256": [
    "1111111111111111111111111111111111111111111111111111111111111111"
  ],
  "frames": 1,
  "frames_file": "frames-0000000000000000.bin",
  "frames_sha256": "0000000000000000000000000000000000000000000000000000000000000000",
  "grain": 1e-06,
  "inputs": {},
  "magnitude": 0.0,
  "name": "main/bend/ship",
  "non_finite": 0,
  "program": "0.1.0",
  "signoffs": [
    {
      "by": "Ada",
      "predecessor": "",
      "role": "",
      "when": "2024-05-02T10:00:00Z",
      "why": "first"
    }
  ],
  "skinfold": "record 1",
  "suite": "arm",
  "vertices": 0,
  "weld": 0.0,
  "worst": {
    "volume.change": {
      "frame": 0,
      "value": -0.125
    }
  }
}
)");
}

// Fault: a worst value that is no number breaks the file, or comes back as one.
TEST_CASE("a worst value that is no number is null") {
  model::Record record = sample();
  record.worst["volume.change"].value = std::numeric_limits<double>::quiet_NaN();
  const std::string text = golden::write_record(record);
  CHECK_THAT(text, Catch::Contains("\"value\": null"));
  CHECK(std::isnan(parsed(text).worst.at("volume.change").value));
}

// Fault: bytes from a command line that make a file no JSON reader takes.
TEST_CASE("text that is no UTF-8 is replaced") {
  model::Record record = sample();
  record.signoffs[0].why = "caf\xE9";
  CHECK(parsed(golden::write_record(record)).signoffs[0].why == "caf\xEF\xBF\xBD");
}

// Fault: a key that may be missing without anybody noticing.
TEST_CASE("every key of a record is required") {
  for (const std::string key :
       {"bind_scale",    "diagonal", "faces",       "frame_sha256", "frames",   "frames_file",
        "frames_sha256", "grain",    "inputs",      "magnitude",    "name",     "non_finite",
        "program",       "signoffs", "skinfold",    "suite",        "vertices", "weld",
        "worst",         "by",       "predecessor", "role",         "when",     "why",
        "frame",         "value"}) {
    const std::string said = refusal(changed("\"" + key + "\":", "\"" + key + "_\":"));
    CHECK_THAT(said, Catch::Contains("the key '" + key + "' is missing"));
    CHECK_THAT(said, Catch::StartsWith("golden/record.json:"));
  }
}

// Fault: a record of a later Skinfold that is half understood, or a small addition to this version
// that locks everybody out: within version 1, keys may be added.
TEST_CASE("another version is refused, another key is not") {
  CHECK_THAT(refusal(changed("record 1", "record 2")),
             Catch::Contains("this is 'record 2'; this version of Skinfold reads 'record 1'"));
  CHECK(refusal(changed("\"suite\":", "\"later\": [1, {}], \"suite\":")) == "accepted");
}

// Fault: fields that contradict each other, or lead out of the folder, and are believed.
TEST_CASE("wrong fields are refused at their place") {
  const auto said = [](const std::string& from, const std::string& to, const std::string& part) {
    const std::string text = refusal(changed(from, to));
    CHECK_THAT(text, Catch::Contains(part));
  };
  said("\"frames\": 2", "\"frames\": 3", "3 hashes were expected");
  said("\"frames\": 2", "\"frames\": 1", "there are only 1 frames");
  said("\"frames\": 2", "\"frames\": 2.5", "(/frames)");
  said("\"frames\": 2", "\"frames\": -2", "(/frames)");
  said("\"frames\": 2", "\"frames\": 1e300", "(/frames)");
  said("\"frames\": 2", "\"frames\": \"2\"", "a number was expected");
  said("\"diagonal\": 0.1", "\"diagonal\": -0.1", "(/diagonal)");
  said("\"diagonal\": 0.1", "\"diagonal\": null", "(/diagonal)");
  said("\"diagonal\": 0.1", "\"diagonal\": 1e999", "too large");
  said("\"frames_file\": \"", "\"frames_file\": \"../", "(/frames_file)");
  said("frames-aaaa", "frames-/aaa", "(/frames_file)");
  said("frames-aaaa", "frames-AAAA", "(/frames_file)");
  said("frames-aaaa", "frames-bbbb", "(/frames_file)");
  said("\"frames_sha256\": \"aaaa", "\"frames_sha256\": \"aaa", "64 hexadecimal digits");
  said("\"frames_sha256\": \"aaaa", "\"frames_sha256\": \"aaaA", "64 hexadecimal digits");
  said("\"bind\": \"22", "\"bind\": \"2g", "(/inputs/bind)");
  said("\"" + digits('4'), "\"x" + digits('4'), "entry 1 is no SHA-256");
  said(digits('5'), "", "the record before was expected");
  said("\"predecessor\": \"\"", "\"predecessor\": \"" + digits('5') + "\"", "oldest sign-off");
  said("\"mire-strider\"", "\"../strider\"", "(/suite)");
  said("lod0/knee/ship", "lod0/../ship", "(/name)");
  said("lod0/knee/ship", "lod0/knee", "(/name)");
  said("lod0/knee/ship", "lod0/knee/ship/more", "(/name)");
  said("\"faces\": 12,", "\"faces\": 12, \"faces\": 12,", "occurs twice");
  CHECK_THAT(refusal("[]"), Catch::Contains("an object was expected"));
  CHECK_THAT(refusal(""), Catch::StartsWith("golden/record.json"));
  CHECK_THAT(refusal("{}"), Catch::Contains("'skinfold' is missing"));
  CHECK_THAT(refusal(std::string(100000, '[')), Catch::Contains("nested"));
}

// Fault: an end of the program, or a record taken as whole, after any cut of its text.
TEST_CASE("every truncation of a record is refused") {
  const std::string text = golden::write_record(sample());
  for (std::size_t size = 0; size + 1 < text.size(); ++size)  // the last byte is a line feed
    if (refusal(text.substr(0, size)) == "accepted") FAIL("length " << size);
  CHECK(refusal(text) == "accepted");
}

// Fault: a name from outside that leads out of the golden folder.
TEST_CASE("folders of cases stay below the suite's") {
  CHECK(golden::case_folder("g", "arm", "main/bend/ship") == "g/arm/main/bend/ship");
  for (const std::string name :
       {"main/bend", "main/bend/..", "../bend/ship", "/bend/ship", "main//ship", "main/bend/ship/",
        "main/bend/ship/x", "a/b/c d", ""})
    CHECK_THROWS_AS(golden::case_folder("g", "arm", name), base::InputError);
  for (const std::string suite : {"..", "", "a/b", ".arm", "arm."})
    CHECK_THROWS_AS(golden::case_folder("g", suite, "main/bend/ship"), base::InputError);
}
