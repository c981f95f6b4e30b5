#include "harness/base/error.h"
#include "harness/base/file.h"
#include "harness/golden/container.h"
#include "harness/golden/golden.h"

#include <fmt/format.h>

#include <algorithm>
#include <bit>
#include <cmath>
#include <deque>
#include <limits>
#include <mutex>
#include <stdexcept>
#include <utility>

namespace golden {

namespace {

// Blocks kept unpacked for the next frame: threads that read on in step need the one they are in
// and the next.
constexpr std::size_t kKeptBlocks = 2;

constexpr double kNaN = std::numeric_limits<double>::quiet_NaN();

double coordinate(std::uint64_t word, double grain) {
  const double value = grain == 0 ? std::bit_cast<double>(word)
                       : word == kNoNumber
                           ? kNaN
                           : static_cast<double>(static_cast<std::int64_t>(word)) * grain;
  return std::isfinite(value) ? value : kNaN;
}

}  // namespace

struct FramesReader::State {
  struct Placed {
    Block block;
    std::uint64_t at = 0;  // offset of the header
  };
  using Frames = std::shared_ptr<const metrics::Points>;  // of a block, one behind the other

  base::FileReader file;
  metrics::Points rest;
  std::vector<metrics::Face> faces;
  std::vector<double> times;
  double grain = 0;
  std::vector<Placed> positions;
  std::mutex mutex;                                 // guards `kept`
  std::deque<std::pair<std::size_t, Frames>> kept;  // newest first

  State(const std::filesystem::path& path, std::string shown) : file(path, std::move(shown)) {}

  [[noreturn]] void fail(std::string message) const {
    throw base::InputError(std::move(message), file.shown());
  }

  [[noreturn]] void fail(const Placed& placed, std::string_view what) const {
    const Block& block = placed.block;
    std::string frames;
    if (block.frames > 0)
      frames = fmt::format(", {} frames from {}", block.frames, block.first_frame);
    fail(fmt::format("the block '{}' at byte {}{} {}; restore the file from where it is kept",
                     block.channel, placed.at, frames, what));
  }

  void check_prefix() const {
    Bytes bytes(kPrefixBytes);
    file.read(0, bytes);
    const Bytes expected = file_prefix();
    if (!std::equal(bytes.begin(), bytes.begin() + kMagic.size(), expected.begin()))
      fail(
          "is no frames file, or was changed on its way (as text, or by a version control that "
          "keeps large files elsewhere)");
    const std::uint32_t version = load_u32(std::span(bytes).subspan(kMagic.size()));
    if (version != kVersion)
      fail(
          fmt::format("is a frames file of version {}; this Skinfold reads version {}. Use a "
                      "newer one",
                      version, kVersion));
  }

  // Every block of a known channel; the header chain and the end are checked.
  std::vector<Placed> blocks() const {
    std::vector<Placed> found;
    std::uint64_t at = kPrefixBytes;
    for (std::uint64_t count = 0;; ++count) {
      std::array<std::byte, kHeaderBytes> bytes{};
      file.read(at, bytes);
      Placed placed{parse_header(bytes, at, file.shown()), at};
      const Block& block = placed.block;
      at += kHeaderBytes;
      if (block.stored > file.size() - at)
        fail(placed,
             fmt::format("is {} bytes long, but only {} follow", block.stored, file.size() - at));
      at += block.stored;
      if (block.channel == "end") {
        if (block.elements != count || block.stored != 0) fail(placed, "contradicts the file");
        if (at != file.size()) fail(placed, "is not the end of the file");
        found.push_back(std::move(placed));
        return found;
      }
      if (block.channel == "rest" || block.channel == "faces" || block.channel == "frame_time" ||
          block.channel == "position")
        found.push_back(std::move(placed));
    }
  }

  // The lengths of a block against each other and the limits, before anything is allocated.
  void check_shape(const Placed& placed, Encoding encoding, std::uint32_t components) const {
    const Block& block = placed.block;
    if (block.encoding != encoding)
      fail(placed, fmt::format("is encoded in a way ({}) that this Skinfold does not read here",
                               static_cast<std::uint32_t>(block.encoding)));
    if (const std::string fault = length_fault(block); !fault.empty()) fail(placed, fault);
    // No product below overflows: each factor is bounded by the limit.
    const bool of_frames = block.channel == "position" || block.channel == "frame_time";
    const std::uint64_t repeats = of_frames ? block.frames : 1;
    const std::uint64_t words = kLargestDecoded / 8;
    if (block.components != components || block.elements > words || repeats > words ||
        block.elements * repeats > words ||
        block.decoded != block.elements * repeats * components * 8 ||
        (!of_frames && block.frames != 0))
      fail(placed, "has counts that contradict its length");
  }

  Words words_of(const Placed& placed) const {
    const Block& block = placed.block;
    Bytes payload(static_cast<std::size_t>(block.stored));
    file.read(placed.at + kHeaderBytes, payload);
    if (checksum_of(payload) != block.checksum)
      fail(placed, "is damaged (its checksum does not match)");
    Words words(static_cast<std::size_t>(block.decoded / 8));
    if (const std::string fault = unpack(payload, words); !fault.empty()) fail(placed, fault);
    return words;
  }

  void read_rest(const Placed& placed) {
    check_shape(placed, Encoding::Doubles, 3);
    const Words words = words_of(placed);
    rest.resize(words.size() / 3);
    for (std::size_t i = 0; i < words.size(); ++i) {
      const double value = std::bit_cast<double>(words[i]);
      if (!std::isfinite(value)) fail(placed, "holds a coordinate that is no number");
      rest[i / 3][static_cast<Eigen::Index>(i % 3)] = value;
    }
  }

  void read_faces(const Placed& placed) {
    check_shape(placed, Encoding::Differences, 3);
    Words words = words_of(placed);
    from_differences(words);
    faces.resize(words.size() / 3);
    for (std::size_t i = 0; i < words.size(); ++i) {
      if (words[i] >= rest.size())
        fail(placed, fmt::format("names vertex {} of {}", words[i], rest.size()));
      faces[i / 3][i % 3] = static_cast<metrics::Index>(words[i]);
    }
  }

  void read_times(const Placed& placed) {
    check_shape(placed, Encoding::Doubles, 1);
    if (placed.block.first_frame != 0 || placed.block.elements != 1)
      fail(placed, "has counts that contradict its length");
    for (const std::uint64_t word : words_of(placed)) {
      times.push_back(std::bit_cast<double>(word));
      if (!std::isfinite(times.back())) fail(placed, "holds a time that is no number");
    }
  }

  void check_positions() {
    std::uint64_t next = 0;
    if (!positions.empty()) grain = positions.front().block.grain;
    if (!(grain >= 0) || !std::isfinite(grain)) fail(positions.front(), "has an impossible grain");
    for (const Placed& placed : positions) {
      const Block& block = placed.block;
      if (block.grain != grain || block.elements != rest.size() || block.first_frame != next ||
          block.frames == 0 || block.frames > kBlockFrames)
        fail(placed, "does not fit the blocks before it");
      check_shape(placed, grain > 0 ? Encoding::Steps : Encoding::Doubles, 3);
      next += block.frames;
    }
    if (next != times.size())
      fail(fmt::format("has positions of {} frames and times of {}", next, times.size()));
  }

  const Placed& only(const std::vector<Placed>& all, std::string_view channel) const {
    const Placed* one = nullptr;
    for (const Placed& placed : all) {
      if (placed.block.channel != channel) continue;
      if (one != nullptr) fail(placed, "is a second one of this name");
      one = &placed;
    }
    if (one == nullptr) fail(fmt::format("has no block '{}'", channel));
    return *one;
  }

  void open() {
    check_prefix();
    const std::vector<Placed> all = blocks();
    for (const Placed& placed : all)
      if (placed.block.channel == "position") positions.push_back(placed);
    read_rest(only(all, "rest"));
    read_faces(only(all, "faces"));
    read_times(only(all, "frame_time"));
    check_positions();
    if (const Placed& end = all.back(); end.block.frames != times.size())
      fail(end, fmt::format("contradicts the {} times", times.size()));
  }

  Frames decoded(const Placed& placed) const {
    Words words = words_of(placed);
    const std::size_t vertices = rest.size();
    if (grain > 0) from_steps(words, vertices * 3);
    constexpr auto most = static_cast<std::uint64_t>(kFarthest);
    auto points = std::make_shared<metrics::Points>(words.size() / 3);
    for (std::size_t i = 0; i < words.size(); ++i) {
      const std::size_t row = i / vertices;  // frame * 3 + axis
      // Below -most the sum wraps around to a large number.
      if (grain > 0 && words[i] != kNoNumber && words[i] + most > 2 * most)
        fail(placed, "holds a coordinate out of range");
      (*points)[row / 3 * vertices + i % vertices][static_cast<Eigen::Index>(row % 3)] =
          coordinate(words[i], grain);
    }
    return points;
  }

  // Frames of block `index`, unpacked now or before.
  Frames frames_of(std::size_t index) {
    {
      const std::scoped_lock lock(mutex);
      for (const auto& [known, frames] : kept)
        if (known == index) return frames;
    }
    Frames frames = decoded(positions[index]);
    const std::scoped_lock lock(mutex);
    kept.emplace_front(index, frames);
    if (kept.size() > kKeptBlocks) kept.pop_back();
    return frames;
  }
};

FramesReader::FramesReader(const std::filesystem::path& path, std::string shown)
    : state_(std::make_unique<State>(path, std::move(shown))) {
  state_->open();
}

FramesReader::~FramesReader() = default;
FramesReader::FramesReader(FramesReader&&) noexcept = default;

const metrics::Points& FramesReader::rest() const {
  return state_->rest;
}
const std::vector<metrics::Face>& FramesReader::faces() const {
  return state_->faces;
}
const std::vector<double>& FramesReader::times() const {
  return state_->times;
}
double FramesReader::grain() const {
  return state_->grain;
}
std::size_t FramesReader::frames() const {
  return state_->times.size();
}

void FramesReader::read(std::size_t frame, metrics::Points& out) const {
  if (frame >= frames()) throw std::logic_error("frame that a frames file does not have");
  const auto& blocks = state_->positions;
  const auto after = std::upper_bound(
      blocks.begin(), blocks.end(), frame,
      [](std::size_t f, const State::Placed& placed) { return f < placed.block.first_frame; });
  const auto index = static_cast<std::size_t>(after - blocks.begin()) - 1;
  const State::Frames points = state_->frames_of(index);
  const std::size_t vertices = state_->rest.size();
  const auto first = points->begin() + static_cast<std::ptrdiff_t>(
                                           (frame - blocks[index].block.first_frame) * vertices);
  out.assign(first, first + static_cast<std::ptrdiff_t>(vertices));
}

}  // namespace golden
