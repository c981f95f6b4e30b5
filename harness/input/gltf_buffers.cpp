#include "harness/input/gltf_buffers.h"

#include <fmt/format.h>

#include <array>
#include <cctype>
#include <cstdint>
#include <utility>

namespace input::gltf {

namespace {

constexpr std::string_view kMagic = "glTF";
constexpr std::string_view kScheme = "data:";
constexpr std::uint32_t kJsonChunk = 0x4E4F534A;
constexpr std::uint32_t kBinChunk = 0x004E4942;
constexpr std::size_t kHeader = 12;
constexpr std::size_t kChunkHeader = 8;

std::uint32_t u32_at(std::string_view bytes, std::size_t at) {
  std::uint32_t value = 0;
  for (std::size_t i = 4; i-- > 0;)
    value = (value << 8) | static_cast<unsigned char>(bytes[at + i]);
  return value;
}

struct Chunk {
  std::uint32_t type = 0;
  std::size_t begin = 0, size = 0;
};

std::vector<Chunk> find_chunks(std::string_view bytes, const std::string& shown) {
  const auto fail = [&](std::string message) {
    throw base::InputError("damaged .glb: " + std::move(message), shown);
  };
  if (bytes.size() < kHeader + kChunkHeader)
    fail(fmt::format("{} bytes are too few for a header and a chunk", bytes.size()));
  if (const std::uint32_t version = u32_at(bytes, 4); version != 2)
    fail(fmt::format("container version {}, and this build reads version 2", version));
  if (const std::uint32_t length = u32_at(bytes, 8); length != bytes.size())
    fail(fmt::format("the header says {} bytes, the file has {}", length, bytes.size()));
  std::vector<Chunk> chunks;
  for (std::size_t at = kHeader; at < bytes.size();) {
    if (bytes.size() - at < kChunkHeader)
      fail(fmt::format("{} bytes after the last chunk", bytes.size() - at));
    const std::size_t size = u32_at(bytes, at);
    const Chunk chunk{u32_at(bytes, at + 4), at + kChunkHeader, size};
    if (size > bytes.size() - chunk.begin)
      fail(fmt::format("chunk {} at byte {} says {} bytes, and {} are left", chunks.size(), at,
                       size, bytes.size() - chunk.begin));
    if (size % 4 != 0)
      fail(fmt::format("chunk {} is {} bytes long, which is no multiple of 4: padding is missing",
                       chunks.size(), size));
    if (chunks.empty() != (chunk.type == kJsonChunk))
      fail(chunks.empty() ? "the first chunk is not JSON" : "a second JSON chunk");
    if (chunk.type == kBinChunk && chunks.size() != 1)
      fail(fmt::format("the BIN chunk is chunk {} and must be chunk 1", chunks.size()));
    chunks.push_back(chunk);
    at = chunk.begin + size;
  }
  return chunks;
}

constexpr std::array<std::int8_t, 256> kBase64 = [] {
  std::array<std::int8_t, 256> table{};
  table.fill(-1);
  const std::string_view digits =
      "ABCDEFGHIJKLMNOPQRSTUVWXYZabcdefghijklmnopqrstuvwxyz0123456789+/";
  for (std::size_t i = 0; i < digits.size(); ++i)
    table[static_cast<unsigned char>(digits[i])] = static_cast<std::int8_t>(i);
  return table;
}();

std::string decode_base64(std::string_view text, const Object& buffer) {
  if (text.size() % 4 != 0)
    buffer.fail("uri", fmt::format("base64 of {} characters is not padded to a multiple of 4 "
                                   "with '='",
                                   text.size()));
  std::size_t padding = 0;
  while (padding < 2 && padding < text.size() && text[text.size() - 1 - padding] == '=') ++padding;
  std::string out;
  out.reserve(text.size() / 4 * 3);
  std::uint32_t bits = 0;
  for (std::size_t i = 0; i < text.size(); ++i) {
    const bool pad = i >= text.size() - padding;
    const int digit = pad ? 0 : kBase64[static_cast<unsigned char>(text[i])];
    if (digit < 0)
      buffer.fail("uri", fmt::format("character {} of the base64 text is none of base64", i));
    bits = (bits << 6) | static_cast<std::uint32_t>(digit);
    if (i % 4 != 3) continue;
    for (int shift = 16; shift >= 0; shift -= 8)
      out += static_cast<char>(static_cast<unsigned char>((bits >> shift) & 0xFF));
    bits = 0;
  }
  for (; padding > 0; --padding) {
    if (out.back() != '\0') buffer.fail("uri", "the base64 text ends in bits that must be zero");
    out.pop_back();
  }
  return out;
}

int hex_digit(char c) {
  if (c >= '0' && c <= '9') return c - '0';
  if (c >= 'a' && c <= 'f') return c - 'a' + 10;
  if (c >= 'A' && c <= 'F') return c - 'A' + 10;
  return -1;
}

}  // namespace

Container open_container(std::string bytes, const std::string& shown) {
  if (!bytes.starts_with(kMagic)) {
    if (shown.ends_with(".glb"))
      throw base::InputError("is no .glb: it does not begin with 'glTF'", shown);
    return {.json = std::move(bytes), .binary = false, .chunk = std::nullopt};
  }
  const std::vector<Chunk> chunks = find_chunks(bytes, shown);
  Container out{
      .json = bytes.substr(chunks[0].begin, chunks[0].size), .binary = true, .chunk = std::nullopt};
  if (chunks.size() > 1 && chunks[1].type == kBinChunk) {
    // Cut in place: the chunk may be nearly all of a large file.
    bytes.resize(chunks[1].begin + chunks[1].size);
    bytes.erase(0, chunks[1].begin);
    out.chunk = std::move(bytes);
  }
  return out;
}

bool is_data_uri(std::string_view uri) {
  if (uri.size() < kScheme.size()) return false;
  for (std::size_t i = 0; i < kScheme.size(); ++i)
    if (std::tolower(static_cast<unsigned char>(uri[i])) != kScheme[i]) return false;
  return true;
}

std::string decode_data_uri(std::string_view uri, const Object& buffer) {
  const std::size_t comma = uri.find(',');
  if (comma == std::string_view::npos || !uri.substr(0, comma).ends_with(";base64"))
    buffer.fail("uri", "a data URI must read data:TYPE;base64,TEXT");
  return decode_base64(uri.substr(comma + 1), buffer);
}

std::string decode_percent(std::string_view uri, const Object& buffer) {
  std::string out;
  for (std::size_t i = 0; i < uri.size(); ++i) {
    if (uri[i] != '%') {
      out += uri[i];
      continue;
    }
    const int high = i + 2 < uri.size() ? hex_digit(uri[i + 1]) : -1;
    const int low = i + 2 < uri.size() ? hex_digit(uri[i + 2]) : -1;
    if (high < 0 || low < 0)
      buffer.fail("uri", fmt::format("'%' at character {} is not followed by two hexadecimal "
                                     "digits",
                                     i));
    out += static_cast<char>(static_cast<unsigned char>(high * 16 + low));
    i += 2;
  }
  return out;
}

}  // namespace input::gltf
