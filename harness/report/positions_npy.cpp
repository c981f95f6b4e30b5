#include "harness/base/file.h"
#include "harness/report/little_endian.h"
#include "harness/report/positions.h"

#include <fmt/format.h>

#include <cassert>

namespace report {
namespace {

constexpr std::size_t kBlock = 64;   // the array begins at a multiple of this
constexpr std::size_t kBefore = 10;  // magic, version, length

}  // namespace

// Source of the layout: NumPy Enhancement Proposal 1 ("A Simple File Format for NumPy
// Arrays"), 1.0.
void write_npy(const std::filesystem::path& path, const PosedFrames& frames) {
  std::string header =
      fmt::format("{{'descr': '<f8', 'fortran_order': False, 'shape': ({}, {}, 3), }}",
                  frames.times.size(), frames.vertices);
  header.append(kBlock - 1 - (kBefore + header.size()) % kBlock, ' ');
  header += '\n';

  std::string bytes("\x93NUMPY\x01\x00", 8);
  append(bytes, static_cast<std::uint16_t>(header.size()));
  base::FileWriter file(path);
  file.write(bytes + header);
  metrics::Points points;
  for (std::size_t frame = 0; frame < frames.times.size(); ++frame) {
    frames.read(frame, points);
    assert(points.size() == frames.vertices);
    bytes.clear();
    for (const metrics::Point& point : points)
      for (const double coordinate : {point.x(), point.y(), point.z()}) append(bytes, coordinate);
    file.write(bytes);
  }
  file.commit();
}

}  // namespace report
