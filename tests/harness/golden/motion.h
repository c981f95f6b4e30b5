#pragma once

#include "harness/golden/golden.h"
#include "tests/support/shapes.h"

#include <filesystem>
#include <limits>
#include <vector>

namespace tests {

inline constexpr double kNaN = std::numeric_limits<double>::quiet_NaN();
inline constexpr double kInfinity = std::numeric_limits<double>::infinity();

using Motion = std::vector<Points>;

/// A shape whose vertices go their own ways: no frame can be had from another by luck.
inline Motion wandering(const Points& rest, std::size_t frames, double reach) {
  Random random(7);
  Motion motion;
  Points at = rest;
  for (std::size_t f = 0; f < frames; ++f) {
    for (auto& point : at) point += random.point(-reach, reach);
    motion.push_back(at);
  }
  return motion;
}

inline double time_of(std::size_t frame) {
  return static_cast<double>(frame) / 24;
}

inline golden::FramesWriter::Written write(const std::filesystem::path& folder, const Shape& shape,
                                           double grain, const Motion& motion) {
  golden::FramesWriter writer(folder, shape.points, shape.faces, grain);
  for (std::size_t f = 0; f < motion.size(); ++f) writer.add(time_of(f), motion[f]);
  return writer.commit();
}

}  // namespace tests
