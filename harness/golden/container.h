#pragma once

#include <array>
#include <cstddef>
#include <cstdint>
#include <memory>
#include <span>
#include <string>
#include <string_view>
#include <vector>

/// Frames file, version 1. Integers are little-endian and unsigned, doubles IEEE 754 binary64.
///
///     file    magic "SKFR\r\n\x1A\n" (8 bytes), version 1 (4 bytes), blocks, one block "end"
///     block   header (88 bytes), then `stored` bytes of payload
///     header  at  0  16 bytes  channel: ASCII, filled up with zeros
///                16   4        encoding
///                20   4        components of an element
///                24   8        elements (of one frame, where the block belongs to frames)
///                32   8        first frame
///                40   8        frames; 0: the block belongs to no frame
///                48   8        grain, a double
///                56   8        decoded: bytes of the payload unpacked
///                64   8        stored: bytes of the payload as it stands here
///                72   8        checksum of the payload
///                80   8        checksum of bytes 0 to 79
///
/// A checksum is the first 8 bytes of a SHA-256. There is no index: a reader walks from header to
/// header. Channels that it does not know it skips. "end" has no payload; its `elements` are the
/// blocks before it, its `frames` all frames of the file; nothing follows it.
///
/// A payload is a sequence of 64-bit words: the lowest bytes of all words, then the next, up to the
/// highest; this compressed as one Zstandard frame (RFC 8878) that says how long it is. Words go
/// by element, then component, and hold:
///
///     encoding 0  doubles       the bits of the double
///     encoding 1  differences   zigzag(v[i] - v[i - 1]), v[-1] = 0
///     encoding 2  steps         for grain > 0: coordinates k * grain; the words go by frame, then
///                               x, y, z, then vertex: zigzag(k - predicted), with predicted =
///                                 first frame of the block: k of the vertex before (first: 0)
///                                 second: k of the frame before
///                                 later:  2 * k of the frame before - k of the one before that
///                               k = -2^63 stands for a coordinate that is no number; others are
///                               within +-2^51
///
/// All of it modulo 2^64; zigzag(d) = 2 d for d >= 0, -2 d - 1 for d < 0.
///
///     channel     encoding  components  elements  frames
///     rest        0         3           vertices  0
///     faces       1         3           faces     0
///     frame_time  0         1           1         all; seconds
///     position    2, or 0   3           vertices  1 to 16, blocks in order of frames; encoding 0,
///                 if grain                        words as in encoding 2, NaN for no number
///                 is 0
namespace golden {

inline constexpr std::string_view kMagic = "SKFR\r\n\x1A\n";
inline constexpr std::uint32_t kVersion = 1;
inline constexpr std::size_t kPrefixBytes = 12;  ///< magic and version
inline constexpr std::size_t kHeaderBytes = 88;
inline constexpr std::size_t kChannelBytes = 16;

/// Most bytes that a payload may unpack to: 22 million vertices in one frame.
inline constexpr std::uint64_t kLargestDecoded = std::uint64_t{512} << 20;
inline constexpr std::size_t kBlockFrames = 16;  ///< most frames in a block of positions
inline constexpr double kFarthest = 0x1p51;      ///< largest coordinate, in grains
inline constexpr std::uint64_t kNoNumber = std::uint64_t{1} << 63;

enum class Encoding : std::uint32_t { Doubles = 0, Differences = 1, Steps = 2 };

using Bytes = std::vector<std::byte>;
using Words = std::vector<std::uint64_t>;
using Checksum = std::array<std::byte, 8>;

/// Header of a block; `encoding` may be one that this version does not know.
struct Block {
  std::string channel;
  Encoding encoding = Encoding::Doubles;
  std::uint32_t components = 0;
  std::uint64_t elements = 0, first_frame = 0, frames = 0;
  double grain = 0;
  std::uint64_t decoded = 0, stored = 0;
  Checksum checksum{};
};

Checksum checksum_of(std::span<const std::byte> bytes);

Bytes file_prefix();
Bytes header_bytes(const Block& block);
/// Throws InputError naming `shown`: the header's checksum does not match. `at`: its offset.
Block parse_header(std::span<const std::byte, kHeaderBytes> bytes, std::uint64_t at,
                   const std::string& shown);

std::uint32_t load_u32(std::span<const std::byte> bytes);  ///< precondition: at least 4 bytes
std::uint64_t load_u64(std::span<const std::byte> bytes);  ///< precondition: at least 8 bytes

/// Makes payloads; keeps its memory from one to the next.
class Packer {
 public:
  Packer();
  ~Packer();
  Bytes payload(std::span<const std::uint64_t> words);

 private:
  struct State;
  std::unique_ptr<State> state_;
};

/// Fills `words` from a payload. Returns what is wrong with it, empty when nothing is.
std::string unpack(std::span<const std::byte> payload, std::span<std::uint64_t> words);
/// Why `block` cannot be what it claims, by its lengths alone; empty when it can.
std::string length_fault(const Block& block);

/// Replaces words by the differences between neighbours, and back.
void to_differences(std::span<std::uint64_t> words);
void from_differences(std::span<std::uint64_t> words);
/// Encoding 2: `words` hold k of whole frames of `frame_words` words each.
void to_steps(std::span<std::uint64_t> words, std::size_t frame_words);
void from_steps(std::span<std::uint64_t> words, std::size_t frame_words);

}  // namespace golden
