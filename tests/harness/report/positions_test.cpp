#include "harness/report/positions.h"

#include "tests/harness/report/folder.h"
#include "tests/harness/report/sample.h"

#include <catch2/catch.hpp>
#include <nlohmann/json.hpp>

#include <bit>
#include <cmath>
#include <cstring>
#include <limits>
#include <sstream>

namespace {

using metrics::Face;
using metrics::Point;
using metrics::Points;
using nlohmann::json;

std::string bytes_of(const std::filesystem::path& path) {
  return base::read_file(path, "file");
}

template <class Number>
Number number_at(const std::string& bytes, std::size_t at) {
  static_assert(std::endian::native == std::endian::little);
  REQUIRE(at + sizeof(Number) <= bytes.size());
  Number out;
  std::memcpy(&out, bytes.data() + at, sizeof out);
  return out;
}

// Coordinates without short decimals or short binary forms, other for every one.
Points frame_of(std::size_t frame, std::size_t vertices) {
  Points points;
  for (std::size_t i = 0; i < vertices; ++i) {
    const double t = static_cast<double>(100 * frame + i + 1);
    points.emplace_back(t / 3, -1 / t, 1e-7 * t * t);
  }
  return points;
}

const std::vector<Face> kFaces = {{0, 1, 2}, {2, 1, 3}};

report::PosedFrames moving(std::size_t frames, std::size_t vertices = 4) {
  report::PosedFrames out;
  out.vertices = vertices;
  for (std::size_t i = 0; i < frames; ++i) out.times.push_back(static_cast<double>(i) / 24);
  out.read = [vertices](std::size_t frame, Points& points) { points = frame_of(frame, vertices); };
  return out;
}

// A GLB taken apart by the rules of glTF 2.0 section 4.4, and its numbers read through accessors.
struct Glb {
  json document;
  std::string binary;

  explicit Glb(const std::string& bytes) {
    REQUIRE(bytes.substr(0, 4) == "glTF");
    CHECK(number_at<std::uint32_t>(bytes, 4) == 2);
    CHECK(number_at<std::uint32_t>(bytes, 8) == bytes.size());
    const auto json_size = number_at<std::uint32_t>(bytes, 12);
    CHECK(json_size % 4 == 0);
    CHECK(bytes.substr(16, 4) == "JSON");
    document = json::parse(bytes.substr(20, json_size));
    const std::size_t second = 20 + json_size;
    const auto binary_size = number_at<std::uint32_t>(bytes, second);
    CHECK(binary_size % 4 == 0);
    CHECK(bytes.substr(second + 4, 4) == std::string("BIN\0", 4));
    binary = bytes.substr(second + 8);
    CHECK(binary.size() == binary_size);
    check_views();
    for (const json& accessor : document["accessors"]) check_accessor(accessor);
  }

  void check_views() const {
    CHECK(document["buffers"].size() == 1);
    CHECK(document["buffers"][0]["byteLength"] == binary.size());
    std::size_t end = 0;
    for (const json& view : document["bufferViews"]) {
      CHECK(view["byteOffset"].get<std::size_t>() == end);  // neither gaps nor overlaps
      end += view["byteLength"].get<std::size_t>();
    }
    CHECK(end == binary.size());
  }

  static std::size_t components(const json& accessor) { return accessor["type"] == "VEC3" ? 3 : 1; }

  void check_accessor(const json& accessor) const {
    const json& view = document["bufferViews"].at(accessor["bufferView"].get<std::size_t>());
    const std::size_t element = 4 * components(accessor), count = accessor["count"];
    const std::size_t stride = view.value("byteStride", element), start = accessor["byteOffset"];
    CHECK(count >= 1);
    CHECK(start % 4 == 0);
    CHECK(view["byteOffset"].get<std::size_t>() % 4 == 0);
    CHECK(start + stride * (count - 1) + element <= view["byteLength"].get<std::size_t>());
  }

  template <class Number>
  std::vector<Number> numbers(const json& index) const {
    const json& accessor = document["accessors"].at(index.get<std::size_t>());
    const json& view = document["bufferViews"].at(accessor["bufferView"].get<std::size_t>());
    const std::size_t width = components(accessor), count = accessor["count"];
    const std::size_t start =
        view["byteOffset"].get<std::size_t>() + accessor["byteOffset"].get<std::size_t>();
    CHECK(accessor["componentType"] == (std::is_same_v<Number, float> ? 5126 : 5125));
    std::vector<Number> out;
    for (std::size_t i = 0; i < width * count; ++i)
      out.push_back(number_at<Number>(binary, start + 4 * i));
    if (accessor.contains("min"))
      for (std::size_t k = 0; k < width; ++k) {
        Number low = out[k], high = out[k];
        for (std::size_t i = k; i < out.size(); i += width) {
          low = std::min(low, out[i]);
          high = std::max(high, out[i]);
        }
        CHECK(accessor["min"][k].get<double>() == static_cast<double>(low));
        CHECK(accessor["max"][k].get<double>() == static_cast<double>(high));
      }
    return out;
  }
};

}  // namespace

// Catches: a header that NumPy does not read, another order of axes, numbers that lose bits.
// Source: NumPy Enhancement Proposal 1.
TEST_CASE("positions in .npy are the doubles themselves") {
  const sample::Folder folder;
  const std::size_t frames = GENERATE(1u, 3u, 12345u);
  const std::size_t vertices = frames > 100 ? 1 : 4;
  report::PosedFrames posed = moving(frames, vertices);
  const double odd = GENERATE(0.1, -0.0, 5e-324, std::numeric_limits<double>::infinity());
  posed.read = [vertices, odd](std::size_t frame, Points& points) {
    points = frame_of(frame, vertices);
    points[0].y() = odd;
  };
  report::write_npy(folder / "a.npy", posed);
  const std::string bytes = bytes_of(folder / "a.npy");

  REQUIRE(bytes.substr(0, 8) == std::string("\x93NUMPY\x01\x00", 8));
  const std::size_t start = 10u + number_at<std::uint16_t>(bytes, 8);
  CHECK(start % 64 == 0);
  const std::string header = bytes.substr(10, start - 10);
  CHECK(header.back() == '\n');
  CHECK(header.find_last_not_of(" \n") == header.find('}'));
  CHECK(header.substr(0, header.find('}') + 1) ==
        "{'descr': '<f8', 'fortran_order': False, 'shape': (" + std::to_string(frames) + ", " +
            std::to_string(vertices) + ", 3), }");
  REQUIRE(bytes.size() == start + frames * vertices * 3 * sizeof(double));
  std::size_t at = start, different = 0;
  for (std::size_t frame = 0; frame < frames; ++frame) {
    Points points;
    posed.read(frame, points);
    for (const Point& point : points)
      for (int k = 0; k < 3; ++k, at += sizeof(double))
        different +=
            number_at<std::uint64_t>(bytes, at) == std::bit_cast<std::uint64_t>(point[k]) ? 0u : 1u;
  }
  CHECK(different == 0);
}

// Catches: coordinates that lose bits as text, faces counted from 0 or in another order.
TEST_CASE("positions in .obj read back the same") {
  const sample::Folder folder;
  Points points = frame_of(7, 4);
  points[3] = {-0.0, 5e-324, 1.7976931348623157e308};
  report::write_obj(folder / "a.obj", points, kFaces);
  std::istringstream stream(bytes_of(folder / "a.obj"));
  Points back;
  std::vector<Face> faces;
  for (std::string line; std::getline(stream, line);) {
    std::istringstream words(line);
    std::string tag, x, y, z;
    words >> tag >> x >> y >> z;
    if (tag == "v") back.emplace_back(std::stod(x), std::strtod(y.c_str(), nullptr), std::stod(z));
    if (tag == "f")
      faces.push_back({static_cast<metrics::Index>(std::stoul(x)) - 1,
                       static_cast<metrics::Index>(std::stoul(y)) - 1,
                       static_cast<metrics::Index>(std::stoul(z)) - 1});
  }
  CHECK(back == points);
  CHECK(std::signbit(back.at(3).x()));
  CHECK(faces == kFaces);
}

// Catches: a file no viewer opens, positions or faces of another place. Source: glTF 2.0, 3.6, 4.4.
TEST_CASE("one frame in .glb is a static mesh") {
  const sample::Folder folder;
  report::write_glb(folder / "a.glb", moving(1), kFaces);
  const Glb glb(bytes_of(folder / "a.glb"));
  CHECK(glb.document["asset"]["version"] == "2.0");
  CHECK(!glb.document.contains("animations"));
  CHECK(!glb.document.contains("skins"));
  const json& primitive = glb.document["meshes"][0]["primitives"][0];
  CHECK(!primitive.contains("targets"));
  const std::vector<float> positions = glb.numbers<float>(primitive["attributes"]["POSITION"]);
  const Points points = frame_of(0, 4);
  REQUIRE(positions.size() == 12);
  for (std::size_t i = 0; i < 12; ++i)
    CHECK(positions[i] == static_cast<float>(points[i / 3][static_cast<Eigen::Index>(i % 3)]));
  CHECK(glb.numbers<std::uint32_t>(primitive["indices"]) ==
        std::vector<std::uint32_t>{0, 1, 2, 2, 1, 3});
}

// Catches: a frame that plays at another time, as another frame, or mixed with a neighbour.
// Source: glTF 2.0, 3.7.2.2 (morph targets), 3.11 and appendix C (STEP).
TEST_CASE("several frames in .glb play back as they are") {
  const sample::Folder folder;
  const std::size_t frames = GENERATE(2u, 5u);
  report::write_glb(folder / "a.glb", moving(frames), kFaces);
  const Glb glb(bytes_of(folder / "a.glb"));
  const json& mesh = glb.document["meshes"][0];
  const json& primitive = mesh["primitives"][0];
  REQUIRE(primitive["targets"].size() == frames);
  REQUIRE(mesh["weights"].size() == frames);
  REQUIRE(glb.document["animations"].size() == 1);
  const json& animation = glb.document["animations"][0];
  CHECK(animation["channels"][0]["target"] == json{{"node", 0}, {"path", "weights"}});
  const json& sampler = animation["samplers"][0];
  CHECK(sampler["interpolation"] == "STEP");
  const std::vector<float> keys = glb.numbers<float>(sampler["input"]);
  const std::vector<float> weights = glb.numbers<float>(sampler["output"]);
  CHECK(glb.document["accessors"][sampler["input"].get<std::size_t>()].contains("min"));
  REQUIRE(keys.size() == frames + 1);  // the last frame is held
  REQUIRE(weights.size() == keys.size() * frames);

  const std::vector<float> base = glb.numbers<float>(primitive["attributes"]["POSITION"]);
  for (std::size_t key = 0; key < keys.size(); ++key) {
    CHECK(std::abs(keys[key] - static_cast<float>(key) / 24) <= 1e-6f);
    std::vector<double> shown(base.begin(), base.end());
    for (std::size_t target = 0; target < frames; ++target) {
      const std::vector<float> deltas =
          glb.numbers<float>(primitive["targets"][target]["POSITION"]);
      const double weight = static_cast<double>(weights[key * frames + target]);
      for (std::size_t i = 0; i < shown.size(); ++i)
        shown[i] += weight * static_cast<double>(deltas[i]);
    }
    const Points points = frame_of(std::min(key, frames - 1), 4);
    double worst = 0;
    for (std::size_t i = 0; i < shown.size(); ++i)
      worst = std::max(worst, std::abs(shown[i] - points[i / 3][static_cast<Eigen::Index>(i % 3)]));
    CHECK(worst <= std::ldexp(500.0, -24));  // half a unit in the last place of what is stored
  }
}

// Catches: key times that the format forbids: below 0, or alike in single precision.
TEST_CASE("key times in .glb ascend from 0 or later") {
  const sample::Folder folder;
  report::PosedFrames frames = moving(3);
  frames.times = GENERATE(std::vector<double>{-0.5, 0, 0.25}, std::vector<double>{2, 2.5, 2.75},
                          std::vector<double>{4096, 4096.00001, 4096.00002});
  report::write_glb(folder / "a.glb", frames, kFaces);
  const Glb glb(bytes_of(folder / "a.glb"));
  const std::vector<float> keys =
      glb.numbers<float>(glb.document["animations"][0]["samplers"][0]["input"]);
  CHECK(keys[0] == static_cast<float>(std::max(0.0, frames.times[0])));
  for (std::size_t i = 1; i < keys.size(); ++i) CHECK(keys[i] > keys[i - 1]);
}

// Catches: an index accessor of zero elements, which the format forbids.
TEST_CASE("a mesh without faces is points in .glb") {
  const sample::Folder folder;
  report::write_glb(folder / "a.glb", moving(2), {});
  const Glb glb(bytes_of(folder / "a.glb"));
  const json& primitive = glb.document["meshes"][0]["primitives"][0];
  CHECK(primitive["mode"] == 0);
  CHECK(!primitive.contains("indices"));
}

// Catches: a number that the format cannot hold written all the same, and half a file left behind.
TEST_CASE("what a format cannot hold is refused and leaves no file") {
  const sample::Folder folder;
  const double bad =
      GENERATE(as<double>{}, sample::kNaN, std::numeric_limits<double>::infinity(), 1e39);
  report::PosedFrames frames = moving(3);
  frames.read = [bad](std::size_t frame, Points& points) {
    points = frame_of(frame, 4);
    if (frame == 2) points[3].z() = bad;
  };
  std::filesystem::create_directories(folder / "out");
  CHECK_THROWS_WITH(report::write_glb(folder / "out/a.glb", frames, kFaces),
                    Catch::Contains("frame 2") && Catch::Contains(".npy"));
  if (bad != 1e39) {
    Points points;
    frames.read(2, points);
    CHECK_THROWS_WITH(report::write_obj(folder / "out/a.obj", points, kFaces),
                      Catch::Contains("vertex 3") && Catch::Contains(".npy"));
  }
  CHECK(std::filesystem::is_empty(folder / "out"));
}

// Catches: sizes that wrap around in the 32 bits of the format; no frame may be asked for before.
TEST_CASE("a .glb above 4 GiB is refused before any frame is computed") {
  const sample::Folder folder;
  report::PosedFrames frames;
  frames.read = [](std::size_t, Points&) { FAIL("a frame was asked for"); };
  const auto [count, vertices] = GENERATE(table<std::size_t, std::size_t>(
      {{60, 6000000}, {1, 400000000}, {70000, 1}, {2, std::size_t{1} << 62}}));
  frames.times.resize(count);
  for (std::size_t i = 0; i < count; ++i) frames.times[i] = static_cast<double>(i);
  frames.vertices = vertices;
  CHECK_THROWS_AS(report::write_glb(folder / "a.glb", frames, kFaces), base::OutputError);
}
