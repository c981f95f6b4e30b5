#include "harness/base/error.h"
#include "harness/golden/container.h"
#include "harness/golden/golden.h"
#include "tests/harness/golden/motion.h"
#include "tests/harness/golden/scratch.h"
#include "tests/support/shapes.h"

#include <catch2/catch.hpp>

#include <bit>
#include <fstream>

using golden::FramesReader;
using metrics::Points;
using tests::contents;
using tests::kInfinity;
using tests::kNaN;
using tests::Scratch;
using tests::wandering;
using tests::write;

namespace {

void read_all(const std::filesystem::path& path) {
  const FramesReader reader(path, "frames of the test");
  Points out;
  for (std::size_t f = 0; f < reader.frames(); ++f) reader.read(f, out);
}

// Reads a whole file that must be refused, and returns what is said.
std::string file_refusal(const std::filesystem::path& path) {
  try {
    read_all(path);
  } catch (const base::InputError& error) {
    return error.what();
  }
  return "accepted";
}

std::string refusal(const std::string& bytes) {
  const Scratch scratch;
  base::write_file(scratch / "f", bytes);
  return file_refusal(scratch / "f");
}

golden::Block block(const std::string& channel, golden::Encoding encoding, std::uint64_t elements,
                    std::uint64_t frames) {
  return {.channel = channel,
          .encoding = encoding,
          .components = 3,
          .elements = elements,
          .frames = frames};
}

// Files built block by block with checksums that match, as only malice or a fault of ours would.
class Forge {
 public:
  Forge() { add(golden::file_prefix()); }

  Forge& put(golden::Block block, const golden::Words& words) {
    golden::Packer packer;
    return put_raw(std::move(block), words.size() * 8, packer.payload(words));
  }
  Forge& put_raw(golden::Block block, std::uint64_t decoded, const golden::Bytes& payload) {
    block.decoded = decoded;
    block.stored = payload.size();
    block.checksum = golden::checksum_of(payload);
    add(golden::header_bytes(block));
    add(payload);
    ++blocks_;
    return *this;
  }
  // One triangle at rest.
  Forge& rest() { return put(block("rest", golden::Encoding::Doubles, 3, 0), golden::Words(9)); }
  Forge& faces() {
    // zigzag of 0, 1, 2 from 0: 0, +1, +1.
    return put(block("faces", golden::Encoding::Differences, 1, 0), {0, 2, 2});
  }
  Forge& times(std::uint64_t frames) {
    golden::Block times = block("frame_time", golden::Encoding::Doubles, 1, frames);
    times.components = 1;
    return put(times, golden::Words(frames));
  }
  Forge& positions(std::uint64_t first, std::uint64_t frames, double grain = 1) {
    golden::Block positions = block("position", golden::Encoding::Steps, 3, frames);
    positions.first_frame = first;
    positions.grain = grain;
    return put(positions, golden::Words(9 * frames));
  }
  std::string end(std::uint64_t frames) { return end(frames, blocks_); }
  std::string end(std::uint64_t frames, std::uint64_t blocks) {
    golden::Block end = block("end", golden::Encoding::Doubles, blocks, frames);
    end.checksum = golden::checksum_of({});
    add(golden::header_bytes(end));
    return text_;
  }

 private:
  void add(const golden::Bytes& bytes) {
    for (const std::byte byte : bytes) text_ += static_cast<char>(byte);
  }
  std::string text_;
  std::uint64_t blocks_ = 0;
};

}  // namespace

// Fault: damage that goes unseen, or ends the program. Every byte is covered by a checksum, the
// magic or the version, so each flip must be refused and the file named.
TEST_CASE("every flipped byte is found") {
  const Scratch scratch;
  const tests::Shape shape = tests::tetra();
  const auto written = write(scratch.folder(), shape, 1e-3, wandering(shape.points, 17, 0.1));
  const std::string whole = contents(scratch / written.file);
  const auto path = scratch / "damaged";
  for (std::size_t i = 0; i < whole.size(); ++i) {
    for (const int mask : {0x01, 0xFF}) {
      std::string text = whole;
      text[i] = static_cast<char>(text[i] ^ mask);
      std::ofstream(path, std::ios::binary) << text;
      const std::string said = file_refusal(path);
      if (!said.starts_with("frames of the test: ")) FAIL("byte " << i << ": " << said);
    }
  }
}

// Fault: a file cut short, or one with something behind it, that is taken as whole.
TEST_CASE("every truncation and any extension is found") {
  const Scratch scratch;
  const tests::Shape shape = tests::tetra();
  const auto written = write(scratch.folder(), shape, 1e-3, wandering(shape.points, 18, 0.1));
  const std::string whole = contents(scratch / written.file);
  const auto path = scratch / "damaged";
  for (std::size_t size = 0; size < whole.size(); ++size) {
    std::ofstream(path, std::ios::binary) << whole.substr(0, size);
    const std::string said = file_refusal(path);
    if (!said.starts_with("frames of the test: ")) FAIL("length " << size << ": " << said);
  }
  CHECK_THAT(refusal(whole + '\0'), Catch::Contains("not the end of the file"));
  CHECK_THAT(refusal(whole + whole), Catch::Contains("not the end of the file"));
}

// Fault: sizes that are believed before they are checked. None of these may allocate what it
// claims: with the limits of the program 2^60 bytes end in std::bad_alloc, which is no InputError.
TEST_CASE("hostile lengths are refused before anything is allocated") {
  const golden::Encoding doubles = golden::Encoding::Doubles;
  const auto rest_of = [&](std::uint64_t elements, std::uint64_t decoded, std::size_t stored) {
    return refusal(Forge()
                       .put_raw(block("rest", doubles, elements, 0), decoded, golden::Bytes(stored))
                       .end(0));
  };
  const std::uint64_t huge = std::uint64_t{1} << 60;
  CHECK_THAT(rest_of(huge / 24, huge, 100), Catch::Contains("are allowed"));
  CHECK_THAT(rest_of(100000, 2400000, 50), Catch::Contains("which no compression does"));
  CHECK_THAT(rest_of(1, 24, 4000), Catch::Contains("4000 bytes for 24"));
  CHECK_THAT(rest_of(3, 24, 20), Catch::Contains("contradict its length"));
  // 3 * 8 * elements wraps around to 24.
  CHECK_THAT(rest_of((std::uint64_t{1} << 61) + 1, 24, 20),
             Catch::Contains("contradict its length"));
  CHECK_THAT(rest_of(3, 72, 20), Catch::Contains("does not unpack"));

  std::string text = Forge().rest().faces().times(0).end(0);
  golden::Block claim = block("rest", doubles, 3, 0);
  claim.stored = huge;
  const golden::Bytes header = golden::header_bytes(claim);
  for (std::size_t i = 0; i < header.size(); ++i)
    text[golden::kPrefixBytes + i] = static_cast<char>(header[i]);
  CHECK_THAT(refusal(text), Catch::Contains("bytes long, but only"));
}

// Fault: a payload that unpacks to more than its header says and is written past the end.
TEST_CASE("a payload that unpacks to another size is refused") {
  golden::Packer packer;
  const golden::Bytes bomb = packer.payload(golden::Words(4000000));  // 32 MB from a few kB
  REQUIRE(bomb.size() < 4000);
  const auto said = refusal(
      Forge().put_raw(block("rest", golden::Encoding::Doubles, 10000, 0), 240000, bomb).end(0));
  CHECK_THAT(said, Catch::Contains("does not unpack to 240000 bytes"));
  // Two frames of Zstandard, the first as long as it should be.
  golden::Bytes twice = packer.payload(golden::Words(9));
  const golden::Bytes once = twice;
  twice.insert(twice.end(), once.begin(), once.end());
  CHECK_THAT(
      refusal(Forge().put_raw(block("rest", golden::Encoding::Doubles, 3, 0), 72, twice).end(0)),
      Catch::Contains("cannot be unpacked"));
}

// Fault: blocks that contradict each other and are believed one by one.
TEST_CASE("blocks that contradict each other are refused") {
  const golden::Encoding doubles = golden::Encoding::Doubles;
  const golden::Encoding steps = golden::Encoding::Steps;
  CHECK(refusal(Forge().rest().faces().positions(0, 2).times(2).end(2)) == "accepted");
  const auto said = [](const std::string& text, const std::string& part) {
    CHECK_THAT(refusal(text), Catch::Contains(part));
  };
  said(Forge().faces().times(0).end(0), "has no block 'rest'");
  said(Forge().rest().times(0).end(0), "has no block 'faces'");
  said(Forge().rest().faces().end(0), "has no block 'frame_time'");
  said(Forge().rest().rest().faces().times(0).end(0), "second one");
  said(Forge().rest().faces().positions(0, 2).times(3).end(3), "2 frames and times of 3");
  said(Forge().rest().faces().positions(0, 2).times(2).end(3), "contradicts the 2 times");
  said(Forge().rest().faces().positions(0, 2).times(2).end(2, 3), "contradicts the file");
  said(Forge().rest().faces().positions(1, 2).times(2).end(2), "does not fit");
  said(Forge().rest().faces().positions(0, 2).positions(3, 1).times(3).end(3), "does not fit");
  said(Forge().rest().faces().positions(0, 2).positions(2, 1, 2).times(3).end(3), "does not fit");
  said(Forge().rest().faces().positions(0, 17).times(17).end(17), "does not fit");
  said(Forge().rest().faces().positions(0, 1, -1).times(1).end(1), "impossible grain");
  said(Forge().rest().faces().positions(0, 1, kNaN).times(1).end(1), "impossible grain");
  said(Forge().rest().faces().positions(0, 1, kInfinity).times(1).end(1), "impossible grain");
  said(Forge().rest().faces().positions(0, 1, 0).times(1).end(1), "does not read");
  said(Forge().rest().faces().put(block("position", steps, 2, 1), golden::Words(6)).times(1).end(1),
       "does not fit");
  said(Forge()
           .rest()
           .put(block("faces", golden::Encoding::Differences, 1, 0), {0, 2, 4})  // 0 1 3
           .times(0)
           .end(0),
       "names vertex 3 of 3");
  said(Forge()
           .rest()
           .put(block("faces", golden::Encoding::Differences, 1, 0), {1, 0, 0})  // -1
           .times(0)
           .end(0),
       "names vertex 18446744073709551615 of 3");
  said(Forge().put(block("rest", doubles, 1, 0), {0, std::bit_cast<std::uint64_t>(kNaN), 0}).end(0),
       "no number");
  said(Forge().put(block("rest", golden::Encoding{9}, 3, 0), golden::Words(9)).end(0),
       "(9) that this Skinfold does not read");
  golden::Words far(9);
  far[0] = std::uint64_t{1} << 53;  // zigzag of 2^52
  golden::Block positions = block("position", steps, 3, 1);
  positions.grain = 1;
  said(Forge().rest().faces().put(positions, far).times(1).end(1), "out of range");
}

// Fault: other files taken for frames files, or a later version read as if it were this one.
TEST_CASE("other files and versions are refused by name") {
  std::string text = Forge().rest().faces().times(0).end(0);
  REQUIRE(refusal(text) == "accepted");
  text[8] = 2;
  CHECK_THAT(refusal(text), Catch::Contains("version 2; this Skinfold reads version 1"));
  CHECK_THAT(refusal("version https://example.org/spec\noid sha256:1\n"),
             Catch::Contains("is no frames file"));
  CHECK_THAT(refusal(""), Catch::Contains("frames of the test: ends after 0 bytes"));
  CHECK_THROWS_AS(FramesReader("/no/such/file", "f"), base::InputError);
}

// Fault: a reader that cannot live with what later versions add.
TEST_CASE("unknown channels are skipped") {
  golden::Block later = block("normal", golden::Encoding{77}, 12345, 2);
  later.components = 99;
  const golden::Bytes payload(300, std::byte{0xA5});
  const auto text = Forge()
                        .put_raw(later, 1u << 31, payload)
                        .rest()
                        .faces()
                        .positions(0, 2)
                        .put_raw(later, 7, payload)
                        .times(2)
                        .end(2);
  CHECK(refusal(text) == "accepted");
}
