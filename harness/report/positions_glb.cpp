#include "harness/base/file.h"
#include "harness/report/little_endian.h"
#include "harness/report/positions.h"

#include <fmt/format.h>
#include <nlohmann/json.hpp>

#include <algorithm>
#include <array>
#include <cassert>
#include <cmath>
#include <limits>

namespace report {
namespace {

using metrics::Face;
using metrics::Points;
using Json = nlohmann::ordered_json;
using Triple = std::array<float, 3>;

// Constants of glTF 2.0.
constexpr std::uint32_t kMagic = 0x46546C67, kJsonChunk = 0x4E4F534A, kBinChunk = 0x004E4942;
constexpr int kFloat = 5126, kUnsignedInt = 5125, kVertexBuffer = 34962, kIndexBuffer = 34963;
constexpr int kPointsMode = 0, kTrianglesMode = 4;
constexpr std::size_t kVertexBytes = 12;
constexpr std::uint64_t kLargest = std::numeric_limits<std::uint32_t>::max();

struct Bounds {
  Triple low, high;

  Bounds() {
    low.fill(std::numeric_limits<float>::infinity());
    high.fill(-std::numeric_limits<float>::infinity());
  }
  void add(const Triple& point) {
    for (std::size_t k = 0; k < 3; ++k) {
      low[k] = std::min(low[k], point[k]);
      high[k] = std::max(high[k], point[k]);
    }
  }
};

// Calls visit(triple) for every vertex in single precision: of the mesh, which is frame 0, and of a
// target, which is the difference of its frame from the mesh as rounded.
class Displacements {
 public:
  explicit Displacements(const PosedFrames& frames) : frames_(frames) {}

  template <class Visit>
  void mesh(Visit visit) {
    read(0);
    first_.clear();
    for (const metrics::Point& point : points_) {
      first_.push_back(rounded(point, 0));
      visit(first_.back());
    }
  }

  template <class Visit>
  void target(std::size_t frame, Visit visit) {
    if (frame > 0) read(frame);
    for (std::size_t i = 0; i < points_.size(); ++i) {
      if (frame == 0) {
        visit(Triple{});
        continue;
      }
      const metrics::Point origin = Eigen::Vector3f(first_[i].data()).cast<double>();
      visit(rounded(points_[i] - origin, frame));
    }
  }

 private:
  void read(std::size_t frame) {
    frames_.read(frame, points_);
    assert(points_.size() == frames_.vertices);
  }

  static Triple rounded(const metrics::Point& point, std::size_t frame) {
    Triple out{};
    for (std::size_t k = 0; k < 3; ++k) {
      const double value = point[static_cast<Eigen::Index>(k)];
      if (!(std::abs(value) <= static_cast<double>(std::numeric_limits<float>::max())))
        throw base::OutputError(fmt::format(
            "frame {} has a coordinate that is no finite number in single precision, which .glb "
            "cannot hold; export to .npy instead",
            frame));
      out[k] = static_cast<float>(value) + 0.0f;  // -0 as 0
    }
    return out;
  }

  const PosedFrames& frames_;
  Points points_;
  std::vector<Triple> first_;
};

// Key times in single precision, strictly ascending from 0 or later; one more than frames, so that
// the last frame lasts.
std::vector<float> key_times(const std::vector<double>& times) {
  const double shift = std::max(0.0, -times.front());
  const double last = times.back();
  std::vector<double> all = times;
  all.push_back(last + (last - times[times.size() - 2]));
  std::vector<float> keys;
  for (const double time : all) {
    float key = static_cast<float>(time + shift);
    if (!keys.empty() && !(key > keys.back()))
      key = std::nextafter(keys.back(), std::numeric_limits<float>::infinity());
    keys.push_back(key);
  }
  return keys;
}

// The parts of the binary chunk, in their order.
struct Layout {
  std::uint64_t vertex_bytes = 0;
  std::uint64_t targets = 0;
  std::uint64_t index_bytes = 0, target_bytes = 0, time_bytes = 0, weight_bytes = 0;

  std::uint64_t total() const {
    return vertex_bytes + index_bytes + target_bytes + time_bytes + weight_bytes;
  }
};

Layout layout_of(const PosedFrames& frames, std::size_t faces) {
  const std::uint64_t count = frames.times.size();
  // Bounds first, so that no product overflows.
  const bool small = frames.vertices < kLargest && faces < kLargest && count < kLargest / 16;
  Layout layout;
  if (small) {
    layout.vertex_bytes = kVertexBytes * frames.vertices;
    layout.targets = count > 1 ? count : 0;
    layout.index_bytes = 12 * std::uint64_t{faces};
    if (layout.targets > 0) {
      layout.time_bytes = 4 * (count + 1);
      layout.weight_bytes = 4 * (count + 1) * count;
    }
    if (layout.vertex_bytes <= kLargest) layout.target_bytes = layout.vertex_bytes * layout.targets;
  }
  const std::uint64_t spare = (std::uint64_t{1} << 20) + 400 * count;  // header and JSON
  if (!small || layout.vertex_bytes > kLargest || layout.total() + spare > kLargest)
    throw base::OutputError(
        fmt::format("{} frames of {} vertices do not fit the 4 GiB of a .glb file; export fewer "
                    "frames, or to .npy",
                    frames.times.size(), frames.vertices));
  return layout;
}

// Collects buffer views and accessors while the parts of the buffer are counted through.
struct Tables {
  Json views = Json::array(), accessors = Json::array();
  std::uint64_t offset = 0;

  std::size_t view(std::uint64_t bytes, std::optional<int> target, bool strided) {
    Json view{{"buffer", 0}, {"byteOffset", offset}, {"byteLength", bytes}};
    if (strided) view["byteStride"] = kVertexBytes;
    if (target) view["target"] = *target;
    views.push_back(std::move(view));
    offset += bytes;
    return views.size() - 1;
  }

  std::size_t accessor(std::size_t view, std::uint64_t start, int component, std::uint64_t count,
                       const char* type) {
    accessors.push_back({{"bufferView", view},
                         {"byteOffset", start},
                         {"componentType", component},
                         {"count", count},
                         {"type", type}});
    return accessors.size() - 1;
  }

  std::size_t positions(std::size_t view, std::uint64_t start, std::uint64_t count,
                        const Bounds& bounds) {
    const std::size_t made = accessor(view, start, kFloat, count, "VEC3");
    accessors.back()["min"] = bounds.low;
    accessors.back()["max"] = bounds.high;
    return made;
  }
};

Json animation(Tables& tables, const Layout& layout, const std::vector<float>& keys) {
  const std::size_t times = tables.view(layout.time_bytes, {}, false);
  const std::size_t input = tables.accessor(times, 0, kFloat, keys.size(), "SCALAR");
  tables.accessors.back()["min"] = {keys.front()};
  tables.accessors.back()["max"] = {keys.back()};
  const std::size_t weights = tables.view(layout.weight_bytes, {}, false);
  const std::size_t output =
      tables.accessor(weights, 0, kFloat, keys.size() * layout.targets, "SCALAR");
  Json sampler{{"input", input}, {"interpolation", "STEP"}, {"output", output}};
  Json channel{{"sampler", 0}, {"target", {{"node", 0}, {"path", "weights"}}}};
  return Json::array(
      {{{"samplers", Json::array({sampler})}, {"channels", Json::array({channel})}}});
}

std::string document(const Layout& layout, const PosedFrames& frames, std::size_t faces,
                     const std::vector<Bounds>& bounds, const std::vector<float>& keys) {
  Tables tables;
  const std::size_t base_view = tables.view(layout.vertex_bytes, kVertexBuffer, false);
  Json primitive;
  primitive["attributes"]["POSITION"] =
      tables.positions(base_view, 0, frames.vertices, bounds.front());
  if (faces > 0) {
    const std::size_t view = tables.view(layout.index_bytes, kIndexBuffer, false);
    primitive["indices"] =
        tables.accessor(view, 0, kUnsignedInt, 3 * std::uint64_t{faces}, "SCALAR");
  }
  primitive["mode"] = faces > 0 ? kTrianglesMode : kPointsMode;

  Json mesh, animations;
  if (layout.targets > 0) {
    const std::size_t view = tables.view(layout.target_bytes, kVertexBuffer, true);
    primitive["targets"] = Json::array();
    for (std::uint64_t i = 0; i < layout.targets; ++i)
      primitive["targets"].push_back(
          {{"POSITION",
            tables.positions(view, i * layout.vertex_bytes, frames.vertices, bounds[i + 1])}});
    mesh["weights"] = std::vector<float>(layout.targets, 0.0f);
    animations = animation(tables, layout, keys);
  }
  mesh["primitives"] = Json::array({std::move(primitive)});

  Json root{{"asset", {{"version", "2.0"}, {"generator", "skinfold " SKINFOLD_VERSION}}},
            {"scene", 0},
            {"scenes", Json::array({{{"nodes", {0}}}})},
            {"nodes", Json::array({{{"mesh", 0}}})}};
  root["meshes"] = Json::array({std::move(mesh)});
  if (!animations.is_null()) root["animations"] = std::move(animations);
  root["accessors"] = std::move(tables.accessors);
  root["bufferViews"] = std::move(tables.views);
  root["buffers"] = Json::array({{{"byteLength", layout.total()}}});
  std::string text = root.dump();
  text.append((4 - text.size() % 4) % 4, ' ');
  return text;
}

// Writes the numbers of the binary chunk, a megabyte at a time.
class Chunks {
 public:
  explicit Chunks(base::FileWriter& file) : file_(file) {}

  template <class Number>
  void add(Number number) {
    append(bytes_, number);
    if (bytes_.size() >= kHeld) flush();
  }
  void flush() {
    file_.write(bytes_);
    bytes_.clear();
  }

 private:
  static constexpr std::size_t kHeld = std::size_t{1} << 20;
  base::FileWriter& file_;
  std::string bytes_;
};

std::vector<Bounds> bounds_of(Displacements& positions, const Layout& layout) {
  std::vector<Bounds> bounds(1 + layout.targets);
  positions.mesh([&](const Triple& point) { bounds[0].add(point); });
  for (std::size_t i = 0; i < layout.targets; ++i)
    positions.target(i, [&](const Triple& point) { bounds[i + 1].add(point); });
  return bounds;
}

}  // namespace

void write_glb(const std::filesystem::path& path, const PosedFrames& frames,
               std::span<const Face> faces) {
  assert(!frames.times.empty());
  if (frames.vertices == 0) throw base::OutputError("a .glb file needs at least one vertex");
  const Layout layout = layout_of(frames, faces.size());
  const std::vector<float> keys =
      layout.targets > 0 ? key_times(frames.times) : std::vector<float>{};
  Displacements positions(frames);
  const std::vector<Bounds> bounds = bounds_of(positions, layout);
  const std::string json = document(layout, frames, faces.size(), bounds, keys);

  base::FileWriter file(path);
  Chunks out(file);
  const std::uint64_t total = 12 + 8 + json.size() + 8 + layout.total();
  assert(total <= kLargest);
  for (const std::uint32_t word : {kMagic, std::uint32_t{2}, static_cast<std::uint32_t>(total),
                                   static_cast<std::uint32_t>(json.size()), kJsonChunk})
    out.add(word);
  out.flush();
  file.write(json);
  out.add(static_cast<std::uint32_t>(layout.total()));
  out.add(kBinChunk);

  const auto write = [&](const Triple& triple) {
    for (const float coordinate : triple) out.add(coordinate);
  };
  positions.mesh(write);
  for (const Face& face : faces)
    for (const metrics::Index corner : face) out.add(corner);
  for (std::size_t i = 0; i < layout.targets; ++i) positions.target(i, write);
  for (const float key : keys) out.add(key);
  for (std::size_t key = 0; key < keys.size(); ++key)
    for (std::size_t i = 0; i < layout.targets; ++i)
      out.add(i == std::min(key, keys.size() - 2) ? 1.0f : 0.0f);
  out.flush();
  file.commit();
}

}  // namespace report
