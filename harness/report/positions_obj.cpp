#include "harness/base/file.h"
#include "harness/report/positions.h"

#include <fmt/format.h>

#include <charconv>
#include <cmath>

namespace report {
namespace {

constexpr std::size_t kChunk = std::size_t{1} << 20;  // bytes of text held back

void append_exact(std::string& text, double number) {
  char buffer[32];
  text.append(buffer, std::to_chars(buffer, buffer + sizeof buffer, number).ptr);
}

}  // namespace

void write_obj(const std::filesystem::path& path, const metrics::Points& points,
               std::span<const metrics::Face> faces) {
  base::FileWriter file(path);
  std::string text = "# skinfold " SKINFOLD_VERSION "\n";
  const auto flush = [&](std::size_t held) {
    if (text.size() < held) return;
    file.write(text);
    text.clear();
  };
  for (std::size_t i = 0; i < points.size(); ++i) {
    text += 'v';
    for (const double coordinate : {points[i].x(), points[i].y(), points[i].z()}) {
      if (!std::isfinite(coordinate))
        throw base::OutputError(fmt::format(
            "vertex {} has a coordinate that is no finite number, which .obj cannot hold; export "
            "to .npy instead",
            i));
      text += ' ';
      append_exact(text, coordinate);
    }
    text += '\n';
    flush(kChunk);
  }
  for (const metrics::Face& face : faces) {
    // 64 bits: the largest index plus one does not fit an Index
    text += fmt::format("f {} {} {}\n", std::uint64_t{face[0]} + 1, std::uint64_t{face[1]} + 1,
                        std::uint64_t{face[2]} + 1);
    flush(kChunk);
  }
  flush(0);
  file.commit();
}

}  // namespace report
