#include "metrics/weld.h"

#include "metrics/disjoint_sets.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <cstdint>
#include <numeric>
#include <utility>

namespace metrics {
namespace {

// Below this the cells of the grid are finer than the rounding of a coordinate against D.
constexpr double kSmallestWeld = 1e-12;
// Edge of a cell as a fraction of the welding distance: two points of one cell are always nearer
// than it (0.51 * sqrt 3 < 1), two points three cells apart never (2 * 0.51 > 1).
constexpr double kCell = 0.51;
constexpr std::int64_t kReach = 2;
constexpr std::ptrdiff_t kFewPoints = 8;

using Key = std::array<std::int64_t, 3>;
using Order = std::vector<Index>;
using Place = Order::iterator;

struct Cell {
  Key key;
  Place first, last;
};

bool before(const Point& a, const Point& b) {
  return std::lexicographical_compare(a.data(), a.data() + 3, b.data(), b.data() + 3);
}

// Links equal points and lists the lowest point of every place.
Order link_equal(std::span<const Point> points, DisjointSets& sets) {
  Order order(points.size());
  std::iota(order.begin(), order.end(), Index{0});
  std::sort(order.begin(), order.end(), [&](Index a, Index b) {
    return before(points[a], points[b]) || (!before(points[b], points[a]) && a < b);
  });
  Order lowest;
  for (const Index i : order) {
    if (!lowest.empty() && points[lowest.back()] == points[i]) {
      sets.unite(lowest.back(), i);
    } else {
      lowest.push_back(i);
    }
  }
  return lowest;
}

// The grid's points, in units of D from the lower corner, so that nothing over- or underflows.
struct Crowd {
  Points points;
  double distance = 0;

  bool near(Index a, Index b) const {
    return (points[a] - points[b]).squaredNorm() < distance * distance;
  }

  struct Box {
    Point low, high;
  };
  Box box(Place first, Place last) const {
    Box result{points[*first], points[*first]};
    for (; first != last; ++first) {
      result.low = result.low.cwiseMin(points[*first]);
      result.high = result.high.cwiseMax(points[*first]);
    }
    return result;
  }

  // Whether a point of one range is near one of the other. Splits the longer range until boxes are
  // too far apart or few points are left, so two crowded cells do not cost every pair of points.
  bool any_near(Place a, Place a_end, Place b, Place b_end) const {
    if (a_end - a <= kFewPoints && b_end - b <= kFewPoints) {
      return std::any_of(a, a_end, [&](Index i) {
        return std::any_of(b, b_end, [&](Index j) { return near(i, j); });
      });
    }
    if (a_end - a < b_end - b) {
      std::swap(a, b);
      std::swap(a_end, b_end);
    }
    const Box box_a = box(a, a_end);
    const Box box_b = box(b, b_end);
    const Point gap = (box_a.low - box_b.high).cwiseMax(box_b.low - box_a.high).cwiseMax(0.0);
    if (gap.squaredNorm() >= distance * distance) {
      return false;
    }
    Eigen::Index axis = 0;
    (box_a.high - box_a.low).maxCoeff(&axis);
    const Place middle = a + (a_end - a) / 2;
    std::nth_element(a, middle, a_end,
                     [&](Index i, Index j) { return points[i][axis] < points[j][axis]; });
    return any_near(a, middle, b, b_end) || any_near(middle, a_end, b, b_end);
  }
};

std::vector<Cell> sorted_cells(const Crowd& crowd, Order& order) {
  std::vector<Key> keys(crowd.points.size());
  for (const Index i : order) {
    for (std::size_t axis = 0; axis < 3; ++axis) {
      const double at = crowd.points[i][static_cast<Eigen::Index>(axis)];
      keys[i][axis] = static_cast<std::int64_t>(std::floor(at / (kCell * crowd.distance)));
    }
  }
  std::sort(order.begin(), order.end(),
            [&](Index a, Index b) { return keys[a] < keys[b] || (keys[a] == keys[b] && a < b); });
  std::vector<Cell> cells;
  for (Place i = order.begin(); i != order.end(); ++i) {
    if (cells.empty() || cells.back().key != keys[*i]) {
      cells.push_back({keys[*i], i, i});
    }
    cells.back().last = i + 1;
  }
  return cells;
}

// Links every cell with those up to two columns dx, dy and two layers away. For one column offset
// the run of layers wanted only moves forward from cell to cell, so no search is needed.
void link_columns(const Crowd& crowd, const std::vector<Cell>& cells, std::int64_t dx,
                  std::int64_t dy, DisjointSets& sets) {
  std::size_t start = 0;
  for (const Cell& cell : cells) {
    const Key low{cell.key[0] + dx, cell.key[1] + dy, cell.key[2] - kReach};
    const Key high{low[0], low[1], cell.key[2] + kReach};
    while (start < cells.size() && cells[start].key < low) {
      ++start;
    }
    for (std::size_t i = start; i < cells.size() && cells[i].key <= high; ++i) {
      if (cell.key < cells[i].key && !sets.same(*cell.first, *cells[i].first) &&
          crowd.any_near(cell.first, cell.last, cells[i].first, cells[i].last)) {
        sets.unite(*cell.first, *cells[i].first);
      }
    }
  }
}

void link_near(std::span<const Point> points, double diagonal, double weld, Order order,
               DisjointSets& sets) {
  Point low = points[0];
  for (const Point& p : points) {
    low = low.cwiseMin(p);
  }
  Crowd crowd;
  crowd.distance = weld;
  crowd.points.reserve(points.size());
  for (const Point& p : points) {
    crowd.points.emplace_back((p - low) / diagonal);
  }
  const std::vector<Cell> cells = sorted_cells(crowd, order);
  for (const Cell& cell : cells) {
    std::for_each(cell.first, cell.last, [&](Index i) { sets.unite(*cell.first, i); });
  }
  for (std::int64_t dx = 0; dx <= kReach; ++dx) {
    for (std::int64_t dy = dx == 0 ? 0 : -kReach; dy <= kReach; ++dy) {
      link_columns(crowd, cells, dx, dy, sets);
    }
  }
}

}  // namespace

std::vector<Index> weld_points(std::span<const Point> points, double diagonal, double weld) {
  DisjointSets sets(points.size());
  Order lowest = link_equal(points, sets);
  if (weld >= kSmallestWeld && diagonal > 0 && std::isfinite(diagonal)) {
    link_near(points, diagonal, weld, std::move(lowest), sets);
  }
  return sets.roots();
}

}  // namespace metrics
