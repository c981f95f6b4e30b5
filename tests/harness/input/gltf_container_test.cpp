#include "tests/harness/input/gltf_reading.h"

#include <catch2/catch.hpp>

namespace tests {

namespace {

// Catches: one way of packing read differently from the others.
TEST_CASE("glTF packed in three ways gives the same rig") {
  const GltfBuilder file = arm();
  const TemporaryFolder folder;
  folder.write("rigs/parts/an arm.bin", file.bytes() + "tail");
  const std::string name = "rigs/arm.gltf";
  const Rig external = input::read_gltf(folder.write(name, file.gltf("parts/an%20arm.bin")), name,
                                        folder.path(), {});
  const Rig binary = read(file);
  require_same(binary, external);
  require_same(binary, read(file.embedded(), "arm.gltf"));
  REQUIRE(external.file == name);
}

// Catches: padding of base64 handled for some lengths only (RFC 4648).
TEST_CASE("a data URI of any length is read") {
  for (std::size_t extra = 0; extra < 4; ++extra) {
    GltfBuilder file = arm();
    file.bytes().append(extra, '\x11');
    file.set("/buffers/0/byteLength", std::to_string(file.bytes().size()));
    require_same(read(file), read(file.embedded(), "arm.gltf"));
  }
}

// Catches: unknown chunks read as data, or refused (glTF 4.4.3: clients must ignore them).
TEST_CASE("unknown chunks of a .glb are ignored") {
  const GltfBuilder file = arm();
  std::string bytes = file.glb() + u32_bytes(4) + "NOTEabcd";
  bytes.replace(8, 4, u32_bytes(bytes.size()));
  require_same(read(file), read(bytes, "arm.glb"));
}

// Catches: files outside the folder opened, URIs decoded loosely. RFC 3986, RFC 4648.
TEST_CASE("a glTF buffer that cannot be had is refused") {
  const GltfBuilder file = arm();
  const auto message = [&](const std::string& uri) {
    const Problem problem = refusal(file.gltf(uri), "arm.gltf");
    REQUIRE(problem.pointer == "/buffers/0/uri");
    REQUIRE(problem.line > 1);
    return problem.message;
  };
  using Catch::Contains;
  REQUIRE_THAT(message("no.bin"), Contains("'no.bin'") && Contains("no such file"));
  REQUIRE_THAT(message("../in2/arm.bin"), Contains("leaves the root folder"));
  REQUIRE_THAT(message("%2e%2e/arm.bin"), Contains("leaves the root folder"));
  REQUIRE_THAT(message("/etc/hostname"), Contains("is absolute"));
  REQUIRE_THAT(message("http://example.org/arm.bin"), Contains("has a scheme"));
  REQUIRE_THAT(message("file:arm.bin"), Contains("has a scheme"));
  REQUIRE_THAT(message("a%2.bin"), Contains("'%' at character 1"));
  REQUIRE_THAT(message("a%00.bin"), Contains("zero byte"));
  REQUIRE_THAT(message("a%g0"), Contains("two hexadecimal digits"));
  REQUIRE_THAT(message("data:text/plain,abcd"), Contains("data:TYPE;base64,TEXT"));
  REQUIRE_THAT(message("data:;base64,AAA"), Contains("not padded"));
  REQUIRE_THAT(message("data:;base64,AA-A"), Contains("character 2 of the base64"));
  REQUIRE_THAT(message("data:;base64,AA==AAAA"), Contains("character 2 of the base64"));
  REQUIRE_THAT(message("data:;base64,AAAA\n"), Contains("not padded"));
  REQUIRE_THAT(message("data:;base64,AAB="), Contains("bits that must be zero"));
  REQUIRE_THAT(message("data:;base64,AB=="), Contains("bits that must be zero"));
  const Problem none = refusal(file.gltf(), "arm.gltf");
  REQUIRE(none.pointer == "/buffers/0");
  REQUIRE_THAT(none.message, Contains("has no 'uri'"));
  const Problem small = refusal(file.gltf("data:;base64,AAAA"), "arm.gltf");
  REQUIRE(small.pointer == "/buffers/0/byteLength");
  REQUIRE_THAT(small.message, Contains("has 3 bytes, not " + std::to_string(file.bytes().size())));
}

// Catches: a damaged container read beyond its end. glTF 4.4.
TEST_CASE("a damaged .glb is refused") {
  const std::string good = arm().glb();
  const auto message = [](const std::string& bytes) { return refusal(bytes, "arm.glb").message; };
  const auto changed = [&](std::size_t at, const std::string& bytes) {
    return std::string(good).replace(at, bytes.size(), bytes);
  };
  const auto resized = [](std::string bytes) {
    return bytes.replace(8, 4, u32_bytes(bytes.size()));
  };
  using Catch::Contains;
  REQUIRE_THAT(message(changed(0, "glTf")), Contains("does not begin with 'glTF'"));
  REQUIRE_THAT(message(changed(4, u32_bytes(1))), Contains("container version 1"));
  REQUIRE_THAT(message(good + "tail"), Contains("the header says") && Contains("the file has"));
  REQUIRE_THAT(message(good.substr(0, good.size() - 4)), Contains("the header says"));
  REQUIRE_THAT(message(good.substr(0, 16)), Contains("too few"));
  REQUIRE_THAT(message(resized(good + "tail")), Contains("4 bytes after the last chunk"));
  REQUIRE_THAT(message(changed(12, u32_bytes(0xFFFFFFFC))), Contains("chunk 0 at byte 12"));
  REQUIRE_THAT(message(changed(12, u32_bytes(30))), Contains("no multiple of 4"));
  REQUIRE_THAT(message(changed(16, "NOSJ")), Contains("the first chunk is not JSON"));
  const std::string chunk = u32_bytes(4) + std::string("BIN\0", 4) + "abcd";
  REQUIRE_THAT(message(resized(good + chunk)), Contains("the BIN chunk is chunk 2"));
  REQUIRE_THAT(message(resized(good + u32_bytes(4) + "JSON{  }")), Contains("a second JSON chunk"));
  const GltfBuilder file = arm();
  const Problem longer = refusal(make_glb(file.gltf(), file.bytes() + "tail"), "arm.glb");
  REQUIRE_THAT(longer.message, Contains("BIN chunk has"));
  REQUIRE(longer.pointer == "/buffers/0/byteLength");
  REQUIRE_THAT(message(make_glb(file.gltf(), "abcd")), Contains("BIN chunk has 4 bytes"));
  REQUIRE_THAT(message(make_glb("{\"asset\"", file.bytes())),
               Contains("not valid JSON") && Contains("line 1 of the JSON chunk"));
  GltfBuilder second = file;
  second.append("/buffers", R"({"byteLength": 400})");
  second.set("/bufferViews/0/buffer", "1");
  REQUIRE_THAT(message(second.glb()), Contains("only the first buffer of a .glb"));
  const std::string alone = arm().gltf() + "  ";
  std::string json(alone, 0, alone.size() / 4 * 4);
  const std::string only_json =
      "glTF" + u32_bytes(2) + u32_bytes(20 + json.size()) + u32_bytes(json.size()) + "JSON" + json;
  REQUIRE_THAT(message(only_json), Contains("BIN chunk of the file, which has none"));
}

// Catches: a small file that asks for endless memory by naming one accessor again and again, and
// JSON that would grow into far more memory than its text.
TEST_CASE("a glTF file that would fill the memory is refused") {
  GltfBuilder file = arm();
  SECTION("by repetition") {
    const std::size_t keys = 100000;
    std::vector<double> times;
    for (std::size_t i = 0; i < keys; ++i) times.push_back(static_cast<double>(i));
    const std::string input = std::to_string(file.add("SCALAR", Component::F32, times));
    const std::string output =
        std::to_string(file.add("VEC3", Component::F32, std::vector<double>(9 * keys, 0)));
    std::string nodes = R"({"mesh": 0, "skin": 0}, {})";
    std::string channels;
    for (int node = 1; node < 400; ++node) {
      nodes += ", {}";
      channels += std::string(node > 1 ? ", " : "") + R"({"sampler": 0, "target": {"node": )" +
                  std::to_string(node) + R"(, "path": "scale"}})";
    }
    file.set("/nodes", "[" + nodes + "]");
    file.set("/animations", R"([{"channels": [)" + channels + R"(], "samplers": [{"input": )" +
                                input + R"(, "output": )" + output +
                                R"(, "interpolation": "CUBICSPLINE"}]}])");
    REQUIRE_THAT(refusal(file.glb(), "arm.glb").message,
                 Catch::Contains("more than 268435456 numbers together"));
  }
  SECTION("by JSON") {
    std::string text = "{\"extras\": [0";
    for (int i = 0; i < 5000000; ++i) text += ",0";
    REQUIRE_THAT(refusal(text + "]}", "arm.gltf").message,
                 Catch::Contains("the JSON holds more than 4194304 values"));
  }
}

}  // namespace

}  // namespace tests
