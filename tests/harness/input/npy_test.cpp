#include "harness/input/npy.h"

#include "tests/harness/input/fixtures.h"

#include <catch2/catch.hpp>

#include <cmath>
#include <cstdint>
#include <limits>

namespace {

using Catch::Contains;
using input::NpyItems;
using tests::bytes_of;
using tests::npy;
using tests::npy_with_header;

std::vector<double> items_of(const std::string& bytes, NpyItems items) {
  const tests::TemporaryFolder folder;
  const input::NpyArray array = input::open_npy(folder.write("a.npy", bytes), "a.npy", items);
  std::vector<double> values(array.items);
  input::read_items(array, 0, values);
  return values;
}

std::string complaint(const std::string& bytes, NpyItems items = NpyItems::Real) {
  return tests::complaint([&] { items_of(bytes, items); });
}

std::string given_complaint(const std::string& bytes) {
  const tests::TemporaryFolder folder;
  return tests::complaint([&] { input::open_given(folder.write("g.npy", bytes), "g.npy"); });
}

template <typename Item>
void require_read(const std::string& descr, const std::vector<Item>& items, NpyItems kind) {
  INFO(descr);
  std::vector<double> expected;
  for (const Item item : items) expected.push_back(static_cast<double>(item));
  REQUIRE(items_of(npy(descr, "(" + std::to_string(items.size()) + ",)", bytes_of(items)), kind) ==
          expected);
}

}  // namespace

// Catches an item type that is read with another size or sign. The values are the ends of each
// type, which are exact in double up to 32 bits.
TEST_CASE("every item type is read as it was written") {
  require_read<float>("<f4", {0.1F, -2.5F, 3e38F}, NpyItems::Real);
  require_read<double>("<f8", {0.1, -1e300}, NpyItems::Real);
  require_read<double>("<f8", {0.1, -1e300}, NpyItems::Double);
  require_read<std::uint8_t>("|u1", {0, 200, 255}, NpyItems::Integer);
  require_read<std::uint8_t>("<u1", {255}, NpyItems::Integer);
  require_read<std::int8_t>("|i1", {-128, 127}, NpyItems::Integer);
  require_read<std::uint16_t>("<u2", {0, 65535}, NpyItems::Integer);
  require_read<std::int16_t>("<i2", {-32768, 32767}, NpyItems::Integer);
  require_read<std::uint32_t>("<u4", {0, 4294967295U}, NpyItems::Integer);
  require_read<std::int32_t>("<i4", {-2147483647, 7}, NpyItems::Integer);
  require_read<std::uint64_t>("<u8", {std::uint64_t{1} << 53}, NpyItems::Integer);
  require_read<std::int64_t>("<i8", {-5, 5}, NpyItems::Integer);
}

// Catches reading that starts at the wrong item, or goes wrong where one block of items ends and
// the next begins: more items than a block holds, each its own number.
TEST_CASE("items are found anywhere in the file") {
  std::vector<double> numbers(20000);
  for (std::size_t i = 0; i < numbers.size(); ++i) numbers[i] = static_cast<double>(i);
  const tests::TemporaryFolder folder;
  const input::NpyArray array = input::open_npy(
      folder.write("a.npy", npy("<f8", "(20000,)", bytes_of(numbers))), "a.npy", NpyItems::Real);
  std::vector<double> some(15000);
  input::read_items(array, 3000, some);
  for (std::size_t i = 0; i < some.size(); ++i) REQUIRE(some[i] == static_cast<double>(3000 + i));
}

// Catches a reader of format 2.0 that takes the header's length from two bytes, and a parser that
// wants the keys in NumPy's order.
TEST_CASE("format 2.0 and any order of keys are read") {
  const std::string header = "{\"shape\": (1, 2), 'fortran_order': False, 'descr': '<f8'}   \n";
  std::string file("\x93NUMPY\x02\x00", 8);
  file += tests::u32_bytes(header.size());
  file += header + bytes_of<double>({4, 5});
  REQUIRE(items_of(file, NpyItems::Real) == std::vector<double>{4, 5});
}

// Catches a type that is read although its bytes mean something else, and a message that does not
// name it or what to save instead.
TEST_CASE("other types are refused by name") {
  const std::string eight(8, '\0');
  REQUIRE_THAT(complaint(npy(">f8", "(1,)", eight)), Contains("'>f8', big-endian"));
  REQUIRE_THAT(complaint(npy("|O", "(1,)", eight)), Contains("'|O', Python objects"));
  REQUIRE_THAT(complaint(npy("<f2", "(4,)", eight)),
               Contains("a.npy: holds items of type '<f2'; expected '<f4' or '<f8'; save "
                        "array.astype('<f8')"));
  REQUIRE_THAT(complaint(npy("<i8", "(1,)", eight)), Contains("'<i8'; expected '<f4'"));
  REQUIRE_THAT(complaint(npy("|b1", "(8,)", eight), NpyItems::Integer), Contains("'|b1'"));
  REQUIRE_THAT(complaint(npy("|u2", "(4,)", eight), NpyItems::Integer), Contains("'|u2'"));
  REQUIRE_THAT(complaint(npy("<f4", "(2,)", eight), NpyItems::Double),
               Contains("'<f4'; expected '<f8'"));
  REQUIRE_THAT(complaint(npy("<f8", "(1,)", eight), NpyItems::Integer),
               Contains("expected an integer type"));
  REQUIRE_THAT(complaint(npy_with_header(
                   "{'descr': [('x', '<f8')], 'fortran_order': False, 'shape': (1,)}", eight)),
               Contains("records with fields"));
}

// Catches columns read as rows.
TEST_CASE("Fortran order is refused") {
  REQUIRE_THAT(complaint(npy_with_header("{'descr': '<f8', 'fortran_order': True, 'shape': (1, 2)}",
                                         std::string(16, '\0'))),
               Contains("Fortran order; C order is expected"));
}

// Catches sizes that are believed before the bytes are counted, above all where their product
// overflows 64 bits to the right number: 2^32 x 2^32 x 8 = 0 modulo 2^64.
TEST_CASE("the shape must be that of the bytes there") {
  REQUIRE_THAT(complaint(npy("<f8", "(3,)", std::string(23, '\0'))),
               Contains("has shape (3,) with items of 8 bytes, but 23 bytes follow"));
  REQUIRE_THAT(complaint(npy("<f8", "(3,)", std::string(25, '\0'))), Contains("25 bytes follow"));
  REQUIRE_THAT(complaint(npy("<f8", "(4294967296, 4294967296)", "")), Contains("0 bytes follow"));
  REQUIRE_THAT(complaint(npy("<f8", "(0, 5)", std::string(8, '\0'))), Contains("8 bytes follow"));
  REQUIRE(complaint(npy("<f8", "(0, 18446744073709551615)", "")).empty());
}

// Catches headers of which a part is guessed.
TEST_CASE("broken headers are refused") {
  const auto header = [](const std::string& text) {
    return complaint(npy_with_header(text, std::string(8, '\0')));
  };
  REQUIRE_THAT(header("{'descr': '<f8', 'shape': (1,)}"), Contains("lacks one of descr"));
  REQUIRE_THAT(header("{'descr': '<f8', 'descr': '<f8', 'fortran_order': False, 'shape': (1,)}"),
               Contains("has the key 'descr' where"));
  REQUIRE_THAT(header("{'descr': '<f8', 'fortran_order': No, 'shape': (1,)}"),
               Contains("neither True nor False"));
  REQUIRE_THAT(header("{'descr': '<f8', 'fortran_order': False, 'shape': (-1,)}"),
               Contains("no short list of sizes"));
  REQUIRE_THAT(header("{'descr': '<f8', 'fortran_order': False, 'shape': (99999999999999999999,)}"),
               Contains("no short list of sizes"));
  REQUIRE_THAT(header("{'descr': '<f8', 'fortran_order': False, 'shape': (1,)} x"),
               Contains("text after its dictionary"));
  REQUIRE_THAT(header("{'descr"), Contains("lacks a quoted name"));
  REQUIRE_THAT(header("{'descr': '<f8'"), Contains("lacks a ','"));
  REQUIRE_THAT(header(""), Contains("lacks a '{'"));
}

// Catches files that are no .npy, of a later format, or shorter than they say.
TEST_CASE("broken beginnings are refused") {
  REQUIRE_THAT(complaint("v 1 2 3\nf 1 2 3\n"), Contains("is no .npy file"));
  REQUIRE_THAT(complaint("\x93NUM"), Contains("is no .npy file"));
  REQUIRE_THAT(complaint(""), Contains("is no .npy file"));
  REQUIRE_THAT(complaint(std::string("\x93NUMPY\x03\x00\x00\x00\x00\x00", 12)),
               Contains("format 3.0; formats 1.0 and 2.0 are read"));
  REQUIRE_THAT(complaint(std::string("\x93NUMPY\x01\x00\xff\xff{'", 12)),
               Contains("claims a .npy header of 65535 bytes in a file of 12"));
  REQUIRE_THAT(complaint(std::string("\x93NUMPY\x02\x00\xff\xff\xff\xff", 12)),
               Contains("claims a .npy header of 4294967295 bytes"));
}

// Catches frames that are read from the wrong place, coordinates out of order, and numbers that
// are no number but must reach the measurements.
TEST_CASE("given frames are read one by one") {
  const tests::TemporaryFolder folder;
  const float nan = std::numeric_limits<float>::quiet_NaN();
  const std::vector<float> numbers = {0, 1, 2, 3, 4, 5, 6, 7, 8, 9, nan, 11};
  const auto path = folder.write("g.npy", npy("<f4", "(2, 2, 3)", bytes_of(numbers)));
  const model::GivenFrames given = input::open_given(path, "g.npy");
  REQUIRE(given.frames == 2);
  REQUIRE(given.vertices == 2);
  REQUIRE(given.file == "g.npy");
  model::Points points;
  given.read(1, points);
  REQUIRE(points.size() == 2);
  REQUIRE(points[0] == model::Point(6, 7, 8));
  REQUIRE(points[1].x() == 9);
  REQUIRE(std::isnan(points[1].y()));
  REQUIRE(points[1].z() == 11);
  given.read(0, points);
  REQUIRE(points[1] == model::Point(3, 4, 5));
}

// Catches a single frame that is taken for many, or refused.
TEST_CASE("one frame may lack the axis of frames") {
  const tests::TemporaryFolder folder;
  const auto path =
      folder.write("g.npy", npy("<f8", "(2, 3)", bytes_of<double>({1, 2, 3, 4, 5, 6})));
  const model::GivenFrames given = input::open_given(path, "g.npy");
  REQUIRE(given.frames == 1);
  REQUIRE(given.vertices == 2);
  model::Points points;
  given.read(0, points);
  REQUIRE(points == model::Points{{1, 2, 3}, {4, 5, 6}});
}

// Catches shapes that are read as something they are not.
TEST_CASE("other shapes are no frames") {
  const std::string want = "expected positions as (frames, vertices, 3) or (vertices, 3)";
  REQUIRE_THAT(given_complaint(npy("<f8", "(6,)", std::string(48, '\0'))),
               Contains("has shape (6,); " + want));
  REQUIRE_THAT(given_complaint(npy("<f8", "(1, 4)", std::string(32, '\0'))), Contains(want));
  REQUIRE_THAT(given_complaint(npy("<f8", "(1, 1, 1, 3)", std::string(24, '\0'))), Contains(want));
  REQUIRE_THAT(given_complaint(npy("<f8", "()", std::string(8, '\0'))), Contains(want));
  REQUIRE_THAT(given_complaint(npy("<f8", "(0, 3)", "")), Contains(want));
  REQUIRE_THAT(given_complaint(npy("<f8", "(0, 4, 3)", "")), Contains(want));
}
