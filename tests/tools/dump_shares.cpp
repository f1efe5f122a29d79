// Test tool: prints the shares windrow finds between two meshes, for comparison with independent references.
// Usage: windrow_dump_shares SOURCE TARGET, each one of
//   latlon WEST SOUTH DLON DLAT NY NX | gaussian N WEST | azimuthal LAMBDA0 PHI1 NY NX SIZE_M EAST_M NORTH_M
// on a sphere. Output: "row,column,share" lines.
#include <cstdio>
#include <exception>
#include <stdexcept>
#include <string>
#include <vector>

#include "../unit/mesh/azimuthal.h"
#include "windrow/overlap/overlap.h"

namespace {

using namespace windrow;

class Words {
 public:
  Words(int count, char** words) : words_(words + 1, words + count) {}
  std::string next() {
    if (at_ == words_.size()) throw std::runtime_error("too few arguments");
    return words_[at_++];
  }
  double number() { return std::stod(next()); }
  std::size_t count() { return std::stoul(next()); }

 private:
  std::vector<std::string> words_;
  std::size_t at_ = 0;
};

mesh::MeshPtr read_mesh(Words& words) {
  const std::string kind = words.next();
  if (kind == "latlon") {
    const double west = words.number(), south = words.number(), dlon = words.number(), dlat = words.number();
    const std::size_t ny = words.count(), nx = words.count();
    return test::regular(west, south, dlon, dlat, ny, nx);
  }
  if (kind == "gaussian") {
    const std::size_t n = words.count();
    const double west = words.number();
    return mesh::make_latlon(
        {test::even_edges(west, 180.0 / static_cast<double>(n), 2 * n), mesh::gaussian_edges_deg(n)},
        mesh::Earth::sphere(test::kRadius_m), "gaussian");
  }
  if (kind == "azimuthal") {
    const double lambda0 = words.number(), phi1 = words.number();
    const std::size_t ny = words.count(), nx = words.count();
    const double size = words.number(), east = words.number(), north = words.number();
    return test::azimuthal_mesh({lambda0, phi1}, ny, nx, size, east, north);
  }
  throw std::runtime_error("unknown kind of mesh: " + kind);
}

}  // namespace

int main(int argc, char** argv) {
  try {
    Words words(argc, argv);
    const mesh::MeshPtr source = read_mesh(words);
    const mesh::MeshPtr target = read_mesh(words);
    const auto result = overlap::conservative(*source, *target, linear_map::Quantity::mean);
    const linear_map::LinearMap& map = result.map;
    std::puts("row,column,share");
    for (std::size_t row = 0; row < map.rows(); ++row) {
      for (std::uint64_t p = map.row_start[row]; p < map.row_start[row + 1]; ++p) {
        std::printf("%zu,%u,%.17g\n", row, map.column[p], map.share[p]);
      }
    }
    return 0;
  } catch (const std::exception& e) {
    std::fprintf(stderr, "windrow_dump_shares: %s\n", e.what());
    return 1;
  }
}
