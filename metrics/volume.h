#pragma once

#include "metrics/surface.h"

#include <span>
#include <string>
#include <vector>

namespace metrics {

/// Why a shell has no part in `volume`.
enum class Omission {
  None,
  NonManifold,  ///< an edge with more than two faces, or faces turned against each other
  Unclosable,   ///< border edges that form no simple loops
  WideOpening,  ///< caps at rest larger than a quarter of the faces
  Flat,         ///< |volume at rest| at most 1e-6 of (area at rest)^(3/2): no inside to speak of
};

/// A shell at rest.
struct ShellVolume {
  double area = 0;      ///< of its faces, squared file units
  double cap_area = 0;  ///< of the fans over its loops
  double volume = 0;    ///< enclosed with the caps; 0 if NonManifold or Unclosable
  Omission omission = Omission::None;
};

/// One per shell of the surface, in its order.
std::vector<ShellVolume> shell_volumes(const Surface& surface);

/// Whether each shell takes part in `volume`.
std::vector<bool> measured_shells(const Surface& surface);

/// Volume at rest of the shells that take part; NaN if there are none or their volumes cancel.
double rest_volume(std::span<const ShellVolume> shells);

/// Signed volume enclosed by the shells that take part, posed: outward faces count positive, an
/// inward shell inside another is subtracted. Each loop is capped by a fan to the mean of its
/// welded vertices, so the cap moves with the pose. 0 if no shell takes part.
/// Source: Lien & Kajiya 1984, IEEE CG&A; Zhang & Chen 2001, ICIP (both from memory); caps: common
/// practice, no source.
double enclosed_volume(const Surface& surface, std::span<const Point> points);

/// The same with the surface's shell_volumes at hand.
double enclosed_volume(const Surface& surface, std::span<const ShellVolume> shells,
                       std::span<const Point> points);

/// A sentence that names the shells left out and why; empty if there are none.
std::string volume_note(const Surface& surface);

}  // namespace metrics
