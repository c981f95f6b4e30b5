#include "harness/input/npy.h"

#include "harness/input/formats.h"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <bit>
#include <charconv>
#include <cstdint>
#include <cstring>
#include <limits>
#include <optional>
#include <string_view>
#include <utility>

namespace input {

namespace {

constexpr std::string_view kMagic("\x93NUMPY", 6);
constexpr std::size_t kLongestHeader = 65536;
constexpr std::size_t kMostDimensions = 32;
constexpr std::size_t kBlock = 8192;  // items decoded at a time

struct Header {
  std::optional<std::string> descr;
  std::optional<bool> fortran_order;
  std::optional<std::vector<std::size_t>> shape;
};

// Reads the Python dictionary of a header; only what NumPy itself writes is understood.
class HeaderParser {
 public:
  HeaderParser(std::string_view text, const std::string& shown) : rest_(text), shown_(shown) {}

  Header dictionary() {
    Header header;
    expect('{');
    while (!accept('}')) {
      const std::string key = string();
      expect(':');
      if (key == "descr" && !header.descr) {
        header.descr = descr();
      } else if (key == "fortran_order" && !header.fortran_order) {
        header.fortran_order = boolean();
      } else if (key == "shape" && !header.shape) {
        header.shape = shape();
      } else {
        fail(fmt::format("has the key '{}' where descr, fortran_order and shape belong, each once",
                         key));
      }
      if (accept('}')) break;
      expect(',');
    }
    skip_space();
    if (!rest_.empty()) fail("has text after its dictionary");
    if (!header.descr || !header.fortran_order || !header.shape)
      fail("lacks one of descr, fortran_order and shape");
    return header;
  }

 private:
  [[noreturn]] void fail(const std::string& what) const {
    throw base::InputError("the .npy header " + what + "; write the file with numpy.save", shown_);
  }
  void skip_space() {
    const std::size_t end = rest_.find_first_not_of(" \t\r\n");
    rest_.remove_prefix(end == std::string_view::npos ? rest_.size() : end);
  }
  bool accept(char c) {
    skip_space();
    if (rest_.empty() || rest_.front() != c) return false;
    rest_.remove_prefix(1);
    return true;
  }
  void expect(char c) {
    if (!accept(c)) fail(fmt::format("lacks a '{}'", c));
  }
  bool accept_word(std::string_view word) {
    skip_space();
    if (!rest_.starts_with(word)) return false;
    rest_.remove_prefix(word.size());
    return true;
  }
  std::string string() {
    skip_space();
    const char quote = rest_.empty() ? '\0' : rest_.front();
    const std::size_t end = quote == '\'' || quote == '"' ? rest_.find(quote, 1) : rest_.npos;
    if (end == rest_.npos) fail("lacks a quoted name");
    std::string text(rest_.substr(1, end - 1));
    rest_.remove_prefix(end + 1);
    return text;
  }
  std::string descr() {
    skip_space();
    if (rest_.starts_with('[')) fail("describes records with fields, not plain numbers");
    return string();
  }
  bool boolean() {
    if (accept_word("True")) return true;
    if (accept_word("False")) return false;
    fail("has a fortran_order that is neither True nor False");
  }
  std::vector<std::size_t> shape() {
    std::vector<std::size_t> sizes;
    expect('(');
    while (!accept(')')) {
      skip_space();
      std::size_t size = 0;
      const char* end = rest_.data() + rest_.size();
      const auto [stop, error] = std::from_chars(rest_.data(), end, size);
      if (error != std::errc{} || sizes.size() == kMostDimensions)
        fail("has a shape that is no short list of sizes");
      rest_.remove_prefix(static_cast<std::size_t>(stop - rest_.data()));
      sizes.push_back(size);
      if (accept(')')) break;
      expect(',');
    }
    return sizes;
  }

  std::string_view rest_;
  const std::string& shown_;
};

std::string expected(NpyItems items) {
  switch (items) {
    case NpyItems::Real:
      return "'<f4' or '<f8'; save array.astype('<f8')";
    case NpyItems::Double:
      return "'<f8'; save array.astype('<f8')";
    case NpyItems::Integer:
      break;
  }
  return "an integer type such as '<u2' or '<i4'; save array.astype('<i4')";
}

void set_type(NpyArray& array, const std::string& descr, NpyItems items) {
  const auto refuse = [&](std::string_view what) {
    throw base::InputError(
        fmt::format("holds items of type '{}'{}; expected {}", descr, what, expected(items)),
        array.file->shown());
  };
  if (descr.find('O') != std::string::npos) refuse(", Python objects");
  if (descr.starts_with('>')) refuse(", big-endian");
  if (descr.size() != 3) refuse("");
  array.kind = descr[1];
  array.item_size = static_cast<std::size_t>(descr[2] - '0');
  const bool one_byte = descr[2] == '1';
  const bool little = descr[0] == '<' || (descr[0] == '|' && one_byte);
  const bool real = array.kind == 'f' && (descr[2] == '4' || descr[2] == '8');
  const bool integer = (array.kind == 'i' || array.kind == 'u') &&
                       std::string_view("1248").find(descr[2]) != std::string_view::npos;
  const bool wanted = items == NpyItems::Integer ? integer
                      : items == NpyItems::Real  ? real
                                                 : real && descr[2] == '8';
  if (!little || !wanted) refuse("");
}

// Number of items, checked against the bytes that follow the header.
std::size_t counted_items(const NpyArray& array) {
  const std::uintmax_t bytes = array.file->size() - array.data;
  const bool empty = std::find(array.shape.begin(), array.shape.end(), 0) != array.shape.end();
  std::size_t items = empty ? 0 : 1;
  bool fits = true;
  for (const std::size_t size : array.shape) {
    if (empty || !fits) break;
    fits = size <= bytes / array.item_size / items;
    if (fits) items *= size;
  }
  if (!fits || items * array.item_size != bytes)
    throw base::InputError(
        fmt::format("has shape {} with items of {} bytes, but {} bytes follow the header; the file "
                    "was cut short or written in two parts",
                    shape_text(array.shape), array.item_size, bytes),
        array.file->shown());
  return items;
}

template <typename Item>
double decoded(const std::byte* bytes) {
  Item item{};
  std::memcpy(&item, bytes, sizeof(Item));
  return static_cast<double>(item);
}

using Decoder = double (*)(const std::byte*);

Decoder decoder(const NpyArray& array) {
  static_assert(std::endian::native == std::endian::little);
  switch (array.item_size) {
    case 1:
      return array.kind == 'u' ? decoded<std::uint8_t> : decoded<std::int8_t>;
    case 2:
      return array.kind == 'u' ? decoded<std::uint16_t> : decoded<std::int16_t>;
    case 4:
      return array.kind == 'f'   ? decoded<float>
             : array.kind == 'u' ? decoded<std::uint32_t>
                                 : decoded<std::int32_t>;
    default:
      return array.kind == 'f'   ? decoded<double>
             : array.kind == 'u' ? decoded<std::uint64_t>
                                 : decoded<std::int64_t>;
  }
}

}  // namespace

bool is_npy(const std::filesystem::path& path, const std::string& shown) {
  const base::FileReader file(path, shown);
  std::array<std::byte, kMagic.size()> start{};
  if (file.size() < start.size()) return false;
  file.read(0, start);
  return std::memcmp(start.data(), kMagic.data(), kMagic.size()) == 0;
}

NpyArray open_npy(const std::filesystem::path& path, const std::string& shown, NpyItems items) {
  NpyArray array;
  array.file = std::make_shared<const base::FileReader>(path, shown);
  std::array<std::byte, 12> start{};
  const auto present =
      static_cast<std::size_t>(std::min<std::uintmax_t>(array.file->size(), start.size()));
  array.file->read(0, std::span(start).first(present));
  if (present < start.size() || std::memcmp(start.data(), kMagic.data(), kMagic.size()) != 0)
    throw base::InputError("is no .npy file; write it with numpy.save", shown);
  const auto byte = [&](std::size_t i) { return std::to_integer<std::size_t>(start[i]); };
  const std::size_t version = byte(6);
  if ((version != 1 && version != 2) || byte(7) != 0)
    throw base::InputError(
        fmt::format("is a .npy file of format {}.{}; formats 1.0 and 2.0 are read", version,
                    byte(7)),
        shown);
  std::size_t length = byte(8) | byte(9) << 8;
  if (version == 2) length |= byte(10) << 16 | byte(11) << 24;
  array.data = (version == 1 ? 10 : 12) + length;
  if (length > kLongestHeader || array.data > array.file->size())
    throw base::InputError(
        fmt::format("claims a .npy header of {} bytes in a file of {}; headers end within the file "
                    "and have at most {}",
                    length, array.file->size(), kLongestHeader),
        shown);
  std::string text(length, '\0');
  array.file->read(array.data - length, std::as_writable_bytes(std::span(text)));
  Header header = HeaderParser(text, shown).dictionary();
  set_type(array, *header.descr, items);
  array.shape = std::move(*header.shape);
  if (*header.fortran_order && array.shape.size() > 1)
    throw base::InputError(
        "is in Fortran order; C order is expected: save numpy.ascontiguousarray(array)", shown);
  array.items = counted_items(array);
  return array;
}

void read_items(const NpyArray& array, std::size_t first, std::span<double> out) {
  const Decoder decode = decoder(array);
  std::vector<std::byte> bytes(std::min(out.size(), kBlock) * array.item_size);
  for (std::size_t done = 0; done < out.size(); done += kBlock) {
    const std::size_t count = std::min(kBlock, out.size() - done);
    array.file->read(array.data + (first + done) * array.item_size,
                     std::span(bytes).first(count * array.item_size));
    for (std::size_t i = 0; i < count; ++i) {
      out[done + i] = decode(bytes.data() + i * array.item_size);
    }
  }
}

std::string shape_text(std::span<const std::size_t> shape) {
  std::string text = "(";
  for (std::size_t i = 0; i < shape.size(); ++i) {
    text += fmt::format("{}{}", i == 0 ? "" : ", ", shape[i]);
  }
  return text + (shape.size() == 1 ? ",)" : ")");
}

model::GivenFrames open_given(const std::filesystem::path& path, const std::string& shown) {
  const NpyArray array = open_npy(path, shown, NpyItems::Real);
  const std::vector<std::size_t>& shape = array.shape;
  const bool one = shape.size() == 2;
  if ((!one && shape.size() != 3) || shape.back() != 3 || array.items == 0)
    throw base::InputError(
        fmt::format("has shape {}; expected positions as (frames, vertices, 3) or (vertices, 3), "
                    "at least one of each",
                    shape_text(shape)),
        shown);
  model::GivenFrames given;
  given.file = shown;
  given.frames = one ? 1 : shape[0];
  given.vertices = shape[shape.size() - 2];
  given.read = [array, vertices = given.vertices](std::size_t frame, model::Points& out) {
    std::vector<double> values(vertices * 3);
    read_items(array, frame * values.size(), values);
    out.resize(vertices);
    for (std::size_t i = 0; i < vertices; ++i) {
      out[i] = {values[3 * i], values[3 * i + 1], values[3 * i + 2]};
    }
  };
  return given;
}

Format npy_format() {
  return {.name = "npy",
          .extensions = ".npy",
          .holds = "skinned positions of an engine, joint matrices, influences",
          .limits =
              "formats 1.0 and 2.0, little-endian, C order; positions <f4 or <f8, matrices "
              "<f8, joint indices any integer type",
          .source = "NumPy Enhancement Proposal 1"};
}

}  // namespace input
