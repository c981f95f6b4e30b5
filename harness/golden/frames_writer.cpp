#include "harness/base/error.h"
#include "harness/base/file.h"
#include "harness/base/sha256.h"
#include "harness/golden/container.h"
#include "harness/golden/golden.h"
#include "harness/golden/names.h"

#include <fmt/format.h>

#include <algorithm>
#include <bit>
#include <cmath>
#include <limits>
#include <stdexcept>
#include <utility>

namespace golden {

namespace {

// Blocks of large meshes hold fewer frames, so that a block stays near this size.
constexpr std::size_t kBlockBytes = std::size_t{32} << 20;

std::size_t frames_in_block(std::size_t frame_words) {
  return std::clamp<std::size_t>(kBlockBytes / std::max<std::size_t>(1, frame_words * 8), 1,
                                 kBlockFrames);
}

std::uint64_t bits_of(double value) {
  // Which NaN it was depends on the processor.
  if (!std::isfinite(value)) value = std::numeric_limits<double>::quiet_NaN();
  return std::bit_cast<std::uint64_t>(value);
}

std::uint64_t in_grains(double value, double grain) {
  const double k = std::floor(value / grain + 0.5);
  // False for NaN, too.
  if (!(std::abs(k) <= kFarthest)) return kNoNumber;
  return static_cast<std::uint64_t>(static_cast<std::int64_t>(k));
}

Words words_of(const metrics::Points& points) {
  Words words;
  words.reserve(points.size() * 3);
  for (const metrics::Point& point : points)
    for (const int axis : {0, 1, 2}) words.push_back(bits_of(point[axis]));
  return words;
}

}  // namespace

std::string frame_sha256(const metrics::Points& positions) {
  base::Sha256 sha;
  for (const metrics::Point& point : positions)
    for (const int axis : {0, 1, 2}) sha.add(point[axis]);
  return sha.hex();
}

struct FramesWriter::State {
  std::filesystem::path folder;
  double grain;
  std::size_t vertices;
  base::FileWriter file;
  base::Sha256 sha;
  Packer packer;
  Words pending;  // k or bits of the frames of the block that is being filled
  std::size_t pending_frames = 0;
  std::size_t block_frames;
  std::size_t blocks = 0;
  std::vector<double> times;
  Written written;
  bool committed = false;

  State(std::filesystem::path where, double step, std::size_t count)
      : folder(std::move(where)),
        grain(step),
        vertices(count),
        file(folder / "frames.bin"),
        block_frames(frames_in_block(count * 3)) {}

  void put(std::span<const std::byte> bytes) {
    file.write(bytes);
    sha.add(bytes);
  }

  // Fills in the lengths and the checksum and appends the block.
  void put_block(Block block, std::span<const std::uint64_t> words) {
    block.decoded = words.size() * 8;
    if (block.decoded > kLargestDecoded)
      throw base::OutputError(fmt::format(
          "{}: {} bytes of '{}' in one block; a frames file holds at most {}",
          base::visible(folder.string()), block.decoded, block.channel, kLargestDecoded));
    const Bytes payload = packer.payload(words);
    block.stored = payload.size();
    block.checksum = checksum_of(payload);
    put(header_bytes(block));
    put(payload);
    ++blocks;
  }

  void put_positions() {
    if (pending_frames == 0) return;
    if (grain > 0) to_steps(pending, vertices * 3);
    Block block{.channel = "position",
                .encoding = grain > 0 ? Encoding::Steps : Encoding::Doubles,
                .components = 3,
                .elements = vertices,
                .first_frame = times.size() - pending_frames,
                .frames = pending_frames,
                .grain = grain};
    put_block(std::move(block), pending);
    pending.clear();
    pending_frames = 0;
  }

  void put_end() {
    Words words;
    for (const double time : times) words.push_back(bits_of(time));
    Block time{.channel = "frame_time", .components = 1, .elements = 1, .frames = times.size()};
    put_block(std::move(time), words);
    Block end{.channel = "end", .elements = blocks, .frames = times.size()};
    end.checksum = checksum_of({});
    put(header_bytes(end));
  }
};

FramesWriter::FramesWriter(std::filesystem::path folder, const metrics::Points& rest,
                           const std::vector<metrics::Face>& faces, double grain)
    : state_(std::make_unique<State>(std::move(folder), grain, rest.size())) {
  if (!(grain >= 0) || !std::isfinite(grain)) throw std::logic_error("grain of a frames file");
  state_->put(file_prefix());
  Block block{.channel = "rest", .components = 3, .elements = rest.size()};
  state_->put_block(std::move(block), words_of(rest));
  Words indices;
  indices.reserve(faces.size() * 3);
  for (const metrics::Face& face : faces) indices.insert(indices.end(), face.begin(), face.end());
  to_differences(indices);
  block = {.channel = "faces", .encoding = Encoding::Differences, .components = 3};
  block.elements = faces.size();
  state_->put_block(std::move(block), indices);
}

FramesWriter::~FramesWriter() = default;

void FramesWriter::add(double time, const metrics::Points& positions) {
  State& state = *state_;
  if (positions.size() != state.vertices || state.committed)
    throw std::logic_error("frame that does not fit its frames file");
  state.times.push_back(time);
  state.written.frame_sha256.push_back(frame_sha256(positions));
  for (const int axis : {0, 1, 2}) {
    for (const metrics::Point& point : positions) {
      const double value = point[axis];
      const std::uint64_t word = state.grain > 0 ? in_grains(value, state.grain) : bits_of(value);
      if (state.grain > 0 ? word == kNoNumber : !std::isfinite(value)) ++state.written.non_finite;
      if (std::isfinite(value))
        state.written.largest_coordinate =
            std::max(state.written.largest_coordinate, std::abs(value));
      state.pending.push_back(word);
    }
  }
  if (++state.pending_frames == state.block_frames) state.put_positions();
}

FramesWriter::Written FramesWriter::commit() {
  State& state = *state_;
  if (state.committed) throw std::logic_error("frames file committed twice");
  state.put_positions();
  state.put_end();
  state.committed = true;
  state.written.frames = state.times.size();
  state.written.sha256 = state.sha.hex();
  state.written.file = frames_file_name(state.written.sha256);
  state.file.commit(state.folder / state.written.file);
  return std::move(state.written);
}

}  // namespace golden
