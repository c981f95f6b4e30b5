#include "harness/base/sha256.h"
#include "harness/golden/container.h"
#include "harness/golden/golden.h"
#include "tests/harness/golden/motion.h"
#include "tests/harness/golden/scratch.h"
#include "tests/support/shapes.h"

#include <catch2/catch.hpp>

#include <bit>
#include <cmath>
#include <thread>

using golden::FramesReader;
using golden::FramesWriter;
using metrics::Points;
using tests::contents;
using tests::kInfinity;
using tests::kNaN;
using tests::Motion;
using tests::Scratch;
using tests::time_of;
using tests::wandering;
using tests::write;

namespace {

// Bits, so that -0 and 0 differ; every NaN is the same.
std::uint64_t bits(double value) {
  return std::isnan(value) ? 1 : std::bit_cast<std::uint64_t>(value);
}

bool same_bits(const Points& a, const Points& b) {
  if (a.size() != b.size()) return false;
  for (std::size_t i = 0; i < a.size(); ++i)
    for (const int axis : {0, 1, 2})
      if (bits(a[i][axis]) != bits(b[i][axis])) return false;
  return true;
}

}  // namespace

// Fault: any change of a value on its way through a file without rounding.
TEST_CASE("frames without a grain come back bit by bit") {
  const Scratch scratch;
  const tests::Shape shape = tests::icosphere(2);
  Motion motion = wandering(shape.points, 37, 0.1);
  motion[3][5] = {-0.0, 5e-324, -1.7976931348623157e308};
  motion[20][0] = {kNaN, kInfinity, -kInfinity};
  const auto written = write(scratch.folder(), shape, 0, motion);
  CHECK(written.frames == 37);
  CHECK(written.non_finite == 3);
  motion[20][0] = {kNaN, kNaN, kNaN};

  const FramesReader reader(scratch / written.file, "f");
  CHECK(reader.grain() == 0);
  CHECK(same_bits(reader.rest(), shape.points));
  CHECK(reader.faces() == shape.faces);
  REQUIRE(reader.frames() == 37);
  Points out;
  for (std::size_t f = 0; f < motion.size(); ++f) {
    CHECK(reader.times()[f] == time_of(f));
    reader.read(f, out);
    CHECK(same_bits(out, motion[f]));
  }
}

// Fault: a wrong prediction, rounding to one side, a block boundary off by one: the error of a
// coordinate would pass half a grain (elementary), up to the rounding of k * grain itself.
TEST_CASE("frames with a grain come back within half of it") {
  const tests::Shape shape = tests::icosphere(1);
  for (const double grain : {1e-6, 0.3, 1.0 / 1024}) {
    for (const std::size_t frames : {std::size_t{1}, std::size_t{2}, std::size_t{3},
                                     std::size_t{16}, std::size_t{17}, std::size_t{50}}) {
      const Scratch scratch;
      Motion motion = wandering(shape.points, frames, 0.2);
      const auto written = write(scratch.folder(), shape, grain, motion);
      CHECK(written.non_finite == 0);
      const FramesReader reader(scratch / written.file, "f");
      CHECK(reader.grain() == grain);
      REQUIRE(reader.frames() == frames);
      double largest = 0;
      Points out;
      for (std::size_t f = 0; f < frames; ++f) {
        reader.read(f, out);
        for (std::size_t i = 0; i < out.size(); ++i)
          largest = std::max(largest, (out[i] - motion[f][i]).cwiseAbs().maxCoeff());
      }
      CHECK(largest <= grain / 2 * (1 + 1e-9));
      CHECK(largest > grain / 8);  // the bound is one: something was rounded
    }
  }
}

// Fault: a NaN that turns into a number or spoils its neighbours, or is not counted.
TEST_CASE("what is no number, or too far for the grain, comes back as NaN and is counted") {
  const Scratch scratch;
  const tests::Shape shape = tests::tetra();
  const double grain = 0.25;
  Motion motion(20, shape.points);
  motion[0][0].x() = kNaN;
  motion[0][1].y() = kInfinity;
  motion[7][2].z() = -kInfinity;
  motion[8][2].z() = 0x1p51 * grain;  // the largest that is representable
  motion[8][2].x() = -0x1p51 * grain;
  motion[9][2].z() = 0x1p51 * grain * 1.001;  // no longer
  for (auto& frame : motion) frame[3].z() = kNaN;
  const auto written = write(scratch.folder(), shape, grain, motion);
  CHECK(written.non_finite == 24);
  motion[0][1].y() = motion[7][2].z() = motion[9][2].z() = kNaN;
  const FramesReader reader(scratch / written.file, "f");
  Points out;
  for (std::size_t f = 0; f < motion.size(); ++f) {
    reader.read(f, out);
    CHECK(same_bits(out, motion[f]));  // all others are multiples of the grain
  }
}

// Fault: a frame that depends on what was read before it, or on other threads.
TEST_CASE("any order and several threads read the same frames") {
  const Scratch scratch;
  const tests::Shape shape = tests::icosphere(1);
  const auto written = write(scratch.folder(), shape, 1e-5, wandering(shape.points, 70, 0.1));
  const FramesReader reader(scratch / written.file, "f");
  Motion forward(reader.frames());
  for (std::size_t f = 0; f < forward.size(); ++f) reader.read(f, forward[f]);
  for (std::size_t f = forward.size(); f-- > 0;) {
    Points out;
    FramesReader(scratch / written.file, "f").read(f, out);
    CHECK(same_bits(out, forward[f]));
  }
  const FramesReader shared(scratch / written.file, "f");
  std::vector<std::size_t> wrong(4);
  std::vector<std::thread> threads;
  for (std::size_t t = 0; t < wrong.size(); ++t)
    threads.emplace_back([&, t] {
      Points out;
      for (std::size_t i = 0; i < 200; ++i) {
        const std::size_t f = (i * 31 + t * 17) % forward.size();
        shared.read(f, out);
        if (!same_bits(out, forward[f])) ++wrong[t];
      }
    });
  for (std::thread& thread : threads) thread.join();
  CHECK(wrong == std::vector<std::size_t>(4));
}

// Fault: a name or hash that is not the file's, bytes that change from run to run.
TEST_CASE("a frames file is named by its hash and is the same every time") {
  const Scratch scratch;
  const tests::Shape shape = tests::cube();
  const Motion motion = wandering(shape.points, 20, 0.1);
  const auto a = write(scratch / "a", shape, 1e-6, motion);
  const auto b = write(scratch / "b", shape, 1e-6, motion);
  const std::string text = contents(scratch / "a" / a.file);
  CHECK(text == contents(scratch / "b" / b.file));
  base::Sha256 sha;
  sha.add(std::as_bytes(std::span(text)));
  CHECK(a.sha256 == sha.hex());
  CHECK(a.file == "frames-" + a.sha256.substr(0, 16) + ".bin");
  CHECK(tests::names_in(scratch / "a") == std::set<std::string>{a.file});
}

// Fault: hashing rounded positions, another byte order, -0 apart from +0.
// Check value: SHA-256 of the doubles 1, 0, -2.5 as 24 little-endian bytes, by CPython's hashlib.
TEST_CASE("the hash of a frame is that of its unrounded doubles") {
  const std::string expected = "ed8cf5b9cf27638cf188f8a747ddd3b7672820f27ef56070e4cd9e029a430bbe";
  CHECK(golden::frame_sha256({{1, 0, -2.5}}) == expected);
  CHECK(golden::frame_sha256({{1, -0.0, -2.5}}) == expected);
  CHECK(golden::frame_sha256({{1, 1e-300, -2.5}}) != expected);
  const Scratch scratch;
  const auto written = write(scratch.folder(), {{{0, 0, 0}}, {}}, 10, {{{1, 0, -2.5}}});
  CHECK(written.frame_sha256 == std::vector<std::string>{expected});
}

// Fault: a writer that dies leaves something that looks like a result.
TEST_CASE("an uncommitted frames file leaves nothing behind") {
  const Scratch scratch;
  const tests::Shape shape = tests::cube();
  {
    FramesWriter writer(scratch.folder(), shape.points, shape.faces, 0);
    for (int i = 0; i < 40; ++i) writer.add(i, shape.points);
  }
  CHECK(tests::names_in(scratch.folder()).empty());
}

// Fault: an empty block that cannot be read back.
TEST_CASE("files without frames, faces or vertices come back") {
  for (const double grain : {0.0, 0.5}) {
    const Scratch scratch;
    const auto none = write(scratch.folder(), tests::cube(), grain, {});
    CHECK(FramesReader(scratch / none.file, "f").frames() == 0);
    const auto bare = write(scratch.folder(), {}, grain, Motion(18));
    const FramesReader reader(scratch / bare.file, "f");
    CHECK(reader.frames() == 18);
    Points out(1);
    reader.read(17, out);
    CHECK(out.empty());
  }
}

// Fault: a prediction from the wrong frame. Motion by whole grains at constant speed is predicted
// without any error from the third frame on (elementary), so further frames cost next to nothing.
TEST_CASE("steady motion costs nothing after the second frame") {
  const tests::Shape shape = tests::icosphere(3);
  tests::Random random(3);
  Points speed(shape.points.size());
  for (auto& v : speed) v = random.point(-500, 500).array().floor();
  const auto size = [&](int frames) {
    Motion motion(static_cast<std::size_t>(frames), shape.points);
    for (std::size_t f = 0; f < motion.size(); ++f)
      for (std::size_t i = 0; i < speed.size(); ++i)
        motion[f][i] =
            (shape.points[i] * 1e6).array().floor().matrix() + static_cast<double>(f) * speed[i];
    const Scratch scratch;
    return std::filesystem::file_size(scratch / write(scratch.folder(), shape, 1, motion).file);
  };
  CHECK(size(2) - size(1) > 2000);
  CHECK(size(16) - size(2) < 500);
}

// Fault: arithmetic that is not undone at its limits.
TEST_CASE("predictions are undone exactly") {
  tests::Random random(11);
  for (const std::size_t frames : {std::size_t{1}, std::size_t{2}, std::size_t{5}}) {
    golden::Words words(frames * 12);
    for (auto& word : words) word = random.bits() % 3 == 0 ? golden::kNoNumber : random.bits();
    golden::Words coded = words;
    golden::to_steps(coded, 12);
    CHECK(coded != words);
    golden::from_steps(coded, 12);
    CHECK(coded == words);
  }
}

// Fault: a change of the format that goes unnoticed, because writer and reader changed together:
// goldens live for years. The bytes were written by version 1 and read, besides, by a separate
// decoder that knew the description in container.h alone.
TEST_CASE("a file of version 1 stays readable") {
  const std::string_view hex =
      "534b46520d0a1a0a010000007265737400000000000000000000000000000000030000000400000000000000"
      "00000000000000000000000000000000000000000000000060000000000000001700000000000000aeb07afd"
      "2ae0c25371d39143854d736a28b52ffd2060750000200000f03f030080c8ceb886022c666163657300000000"
      "0000000000000001000000030000000400000000000000000000000000000000000000000000000000000000"
      "00000060000000000000001c00000000000000efc757cd436fc1b9be8fc4abafa3a15828b52ffd20609d0000"
      "6800040101020405060101020200010030812f706f736974696f6e0000000000000000020000000300000004"
      "0000000000000000000000000000000400000000000000000000000000d03f80010000000000003c00000000"
      "000000136bd0f1b65a1a40fd6023a383a3bb2428b52ffd608000950100140200080700000202020203030303"
      "0008101804040404000000f7000000000f00ff000500fea928303031ce615ef24056de6672616d655f74696d"
      "6500000000000000000000010000000100000000000000000000000000000004000000000000000000000000"
      "00000020000000000000001800000000000000b8799d2d38b355cf8980289db15bf8b028b52ffd20207d0000"
      "480000e0f0f8003f3f3f010035c002656e640000000000000000000000000000000000000000000400000000"
      "00000000000000000000000400000000000000000000000000000000000000000000000000000000000000e3"
      "b0c44298fc1c1482f1866ec3ca0af2";
  const auto digit = [](char c) { return c <= '9' ? c - '0' : c - 'a' + 10; };
  std::string bytes;
  for (std::size_t i = 0; i < hex.size(); i += 2)
    bytes += static_cast<char>(digit(hex[i]) * 16 + digit(hex[i + 1]));
  const Scratch scratch;
  base::write_file(scratch / "f", bytes);
  const FramesReader reader(scratch / "f", "f");
  CHECK(same_bits(reader.rest(), {{0, 0, 0}, {1, 0, 0}, {0, 1, 0}, {0, 0, 1}}));
  CHECK(reader.faces() == std::vector<metrics::Face>{{0, 2, 1}, {0, 1, 3}, {0, 3, 2}, {1, 2, 3}});
  CHECK(reader.times() == std::vector<double>{0, 0.5, 1, 1.5});
  CHECK(reader.grain() == 0.25);
  Points out;
  for (std::size_t f = 0; f < 4; ++f) {
    const auto t = static_cast<double>(f);
    const metrics::Point moved(t * t * 0.25, -0.5 * t, 0);
    Points expected = reader.rest();
    for (std::size_t i = 0; i < 4; ++i)
      expected[i] += moved + metrics::Point(0, 0, static_cast<double>(i) * t);
    if (f == 2) expected[3].y() = kNaN;
    reader.read(f, out);
    CHECK(same_bits(out, expected));
  }
}
