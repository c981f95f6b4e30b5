#include "harness/golden/container.h"

#include "harness/base/error.h"
#include "harness/base/sha256.h"

#include <fmt/format.h>
#include <zstd.h>

#include <algorithm>
#include <bit>
#include <memory>
#include <new>
#include <stdexcept>

namespace golden {

namespace {

// Above 9 the byte planes of prediction errors hardly shrink, and the time doubles.
constexpr int kLevel = 9;
// A Zstandard block unpacks to at most 128 KiB and is at least 4 bytes long (RFC 8878, 3.1.1.2).
constexpr std::uint64_t kLargestRatio = 32768;

template <typename Unsigned>
void store(Unsigned value, std::byte* to) {
  for (std::size_t i = 0; i < sizeof value; ++i) to[i] = static_cast<std::byte>(value >> (8 * i));
}

template <typename Unsigned>
Unsigned load(std::span<const std::byte> from) {
  Unsigned value = 0;
  for (std::size_t i = 0; i < sizeof value; ++i)
    value |= static_cast<Unsigned>(std::to_integer<Unsigned>(from[i]) << (8 * i));
  return value;
}

std::uint64_t zigzag(std::uint64_t difference) {
  return (difference << 1) ^ (std::uint64_t{0} - (difference >> 63));
}

std::uint64_t unzigzag(std::uint64_t word) {
  return (word >> 1) ^ (std::uint64_t{0} - (word & 1));
}

}  // namespace

Checksum checksum_of(std::span<const std::byte> bytes) {
  base::Sha256 sha;
  sha.add(bytes);
  const std::string hex = sha.hex();
  const auto digit = [&](std::size_t i) {
    const char c = hex[i];
    return static_cast<unsigned>(c <= '9' ? c - '0' : c - 'a' + 10);
  };
  Checksum sum{};
  for (std::size_t i = 0; i < sum.size(); ++i)
    sum[i] = static_cast<std::byte>(digit(2 * i) << 4 | digit(2 * i + 1));
  return sum;
}

std::uint32_t load_u32(std::span<const std::byte> bytes) {
  return load<std::uint32_t>(bytes);
}

std::uint64_t load_u64(std::span<const std::byte> bytes) {
  return load<std::uint64_t>(bytes);
}

Bytes file_prefix() {
  Bytes bytes(kPrefixBytes);
  for (std::size_t i = 0; i < kMagic.size(); ++i) bytes[i] = static_cast<std::byte>(kMagic[i]);
  store(kVersion, bytes.data() + kMagic.size());
  return bytes;
}

Bytes header_bytes(const Block& block) {
  Bytes bytes(kHeaderBytes);
  for (std::size_t i = 0; i < std::min(block.channel.size(), kChannelBytes); ++i)
    bytes[i] = static_cast<std::byte>(block.channel[i]);
  store(static_cast<std::uint32_t>(block.encoding), &bytes[16]);
  store(block.components, &bytes[20]);
  store(block.elements, &bytes[24]);
  store(block.first_frame, &bytes[32]);
  store(block.frames, &bytes[40]);
  store(std::bit_cast<std::uint64_t>(block.grain), &bytes[48]);
  store(block.decoded, &bytes[56]);
  store(block.stored, &bytes[64]);
  std::copy(block.checksum.begin(), block.checksum.end(), bytes.begin() + 72);
  const Checksum sum = checksum_of(std::span(bytes).first(80));
  std::copy(sum.begin(), sum.end(), bytes.begin() + 80);
  return bytes;
}

Block parse_header(std::span<const std::byte, kHeaderBytes> bytes, std::uint64_t at,
                   const std::string& shown) {
  const Checksum sum = checksum_of(bytes.first(80));
  if (!std::equal(sum.begin(), sum.end(), bytes.begin() + 80))
    throw base::InputError(
        fmt::format("the block header at byte {} is damaged (its checksum does not match); "
                    "restore the file from where it is kept",
                    at),
        shown);
  Block block;
  for (std::size_t i = 0; i < kChannelBytes && bytes[i] != std::byte{0}; ++i)
    block.channel += static_cast<char>(bytes[i]);
  block.encoding = static_cast<Encoding>(load_u32(bytes.subspan(16)));
  block.components = load_u32(bytes.subspan(20));
  block.elements = load_u64(bytes.subspan(24));
  block.first_frame = load_u64(bytes.subspan(32));
  block.frames = load_u64(bytes.subspan(40));
  block.grain = std::bit_cast<double>(load_u64(bytes.subspan(48)));
  block.decoded = load_u64(bytes.subspan(56));
  block.stored = load_u64(bytes.subspan(64));
  std::copy_n(bytes.begin() + 72, block.checksum.size(), block.checksum.begin());
  return block;
}

std::string length_fault(const Block& block) {
  if (block.decoded > kLargestDecoded)
    return fmt::format("claims to unpack to {} bytes; {} are allowed", block.decoded,
                       kLargestDecoded);
  if (block.decoded / kLargestRatio > block.stored)
    return fmt::format("claims to unpack {} bytes to {}, which no compression does", block.stored,
                       block.decoded);
  if (block.stored > ZSTD_compressBound(static_cast<std::size_t>(block.decoded)))
    return fmt::format("has {} bytes for {} unpacked ones", block.stored, block.decoded);
  return {};
}

struct Packer::State {
  std::unique_ptr<ZSTD_CCtx, std::size_t (*)(ZSTD_CCtx*)> context{ZSTD_createCCtx(), ZSTD_freeCCtx};
  Bytes planes, room;
};

Packer::Packer() : state_(std::make_unique<State>()) {
  if (!state_->context) throw std::bad_alloc();
}

Packer::~Packer() = default;

Bytes Packer::payload(std::span<const std::uint64_t> words) {
  Bytes& planes = state_->planes;
  Bytes& room = state_->room;
  planes.resize(words.size() * 8);
  for (std::size_t plane = 0; plane < 8; ++plane) {
    std::byte* to = planes.data() + plane * words.size();
    for (std::size_t i = 0; i < words.size(); ++i)
      to[i] = static_cast<std::byte>(words[i] >> (8 * plane));
  }
  room.resize(ZSTD_compressBound(planes.size()));
  const std::size_t size = ZSTD_compressCCtx(state_->context.get(), room.data(), room.size(),
                                             planes.data(), planes.size(), kLevel);
  if (ZSTD_isError(size) != 0) throw std::runtime_error(ZSTD_getErrorName(size));
  return {room.begin(), room.begin() + static_cast<std::ptrdiff_t>(size)};
}

std::string unpack(std::span<const std::byte> payload, std::span<std::uint64_t> words) {
  Bytes planes(words.size() * 8);
  if (ZSTD_getFrameContentSize(payload.data(), payload.size()) != planes.size())
    return fmt::format("does not unpack to {} bytes", planes.size());
  const std::size_t size =
      ZSTD_decompress(planes.data(), planes.size(), payload.data(), payload.size());
  if (ZSTD_isError(size) != 0)
    return fmt::format("cannot be unpacked: {}", ZSTD_getErrorName(size));
  if (size != planes.size())
    return fmt::format("unpacks to {} bytes instead of {}", size, planes.size());
  std::fill(words.begin(), words.end(), std::uint64_t{0});
  for (std::size_t plane = 0; plane < 8; ++plane) {
    const std::byte* from = planes.data() + plane * words.size();
    for (std::size_t i = 0; i < words.size(); ++i)
      words[i] |= std::to_integer<std::uint64_t>(from[i]) << (8 * plane);
  }
  return {};
}

void to_differences(std::span<std::uint64_t> words) {
  std::uint64_t before = 0;
  for (std::uint64_t& word : words) {
    const std::uint64_t value = word;
    word = zigzag(value - before);
    before = value;
  }
}

void from_differences(std::span<std::uint64_t> words) {
  std::uint64_t before = 0;
  for (std::uint64_t& word : words) word = before += unzigzag(word);
}

namespace {

// The three coordinates of the first frame, each predicted by the vertex before.
template <typename Recode>
void each_coordinate(std::span<std::uint64_t> first_frame, Recode recode) {
  const std::size_t vertices = first_frame.size() / 3;
  for (std::size_t axis = 0; axis < 3; ++axis)
    recode(first_frame.subspan(axis * vertices, vertices));
}

}  // namespace

void to_steps(std::span<std::uint64_t> words, std::size_t frame_words) {
  if (words.empty()) return;
  // From the last word to the first: a prediction needs the values that stand before it.
  for (std::size_t i = words.size(); i-- > 2 * frame_words;)
    words[i] = zigzag(words[i] - (2 * words[i - frame_words] - words[i - 2 * frame_words]));
  for (std::size_t i = std::min(words.size(), 2 * frame_words); i-- > frame_words;)
    words[i] = zigzag(words[i] - words[i - frame_words]);
  each_coordinate(words.first(frame_words), to_differences);
}

void from_steps(std::span<std::uint64_t> words, std::size_t frame_words) {
  if (words.empty()) return;
  each_coordinate(words.first(frame_words), from_differences);
  for (std::size_t i = frame_words; i < std::min(words.size(), 2 * frame_words); ++i)
    words[i] = words[i - frame_words] + unzigzag(words[i]);
  for (std::size_t i = 2 * frame_words; i < words.size(); ++i)
    words[i] = 2 * words[i - frame_words] - words[i - 2 * frame_words] + unzigzag(words[i]);
}

}  // namespace golden
