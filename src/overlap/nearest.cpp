// The nearest cell centre, by searching the ball that the containing cell's centre leaves open.
#include <algorithm>
#include <cmath>
#include <limits>

#include "sampling.h"
#include "windrow/mesh/index.h"
#include "windrow/overlap/methods.h"

namespace windrow::overlap {
namespace {

using sphere::Vec3;

class Nearest final : public Sampler {
 public:
  explicit Nearest(const mesh::Mesh& source) : centre_(sphere_centres(source)), index_(source) {}

  void weigh(const Place& place, std::size_t containing, std::vector<Weight>& out) const override {
    // A centre nearer than the containing cell's lies in a cell that meets the ball about the place.
    const double radius = norm(centre_[containing] - place.direction);
    mesh::Box ball;
    ball.add(place.direction, radius);
    std::vector<std::uint32_t> candidates;
    index_.find(ball, candidates);
    std::size_t best = containing;
    double least = radius;
    // Distances within rounding are equal, and the lower number of equals counts.
    const double same = 8 * std::numeric_limits<double>::epsilon();
    for (const std::uint32_t k : candidates) {
      const double distance = norm(centre_[k] - place.direction);
      if (distance < least - same || (distance <= least + same && k < best)) {
        best = k;
        least = std::min(least, distance);
      }
    }
    out.push_back({static_cast<std::uint32_t>(best), 1});
  }

 private:
  std::vector<Vec3> centre_;
  mesh::Index index_;
};

}  // namespace

linear_map::LinearMap nearest(const mesh::Mesh& source, const mesh::Mesh& target) {
  return sampled(Nearest(source), source, target, "nearest cell centre");
}

}  // namespace windrow::overlap
