// Times how fast pairings are found, one thread: mesh cells a second for a projected mesh over a regular grid and for
// other kinds, how time grows with the number of cells, and memory a pairing. Prints one JSON object a line.
// Meshes are invented.
#include <fmt/format.h>
#include <omp.h>

#include <cmath>
#include <cstring>
#include <ctime>
#include <fstream>
#include <string>

#include "windrow/geo/crs.h"
#include "windrow/mesh/mesh.h"
#include "windrow/overlap/overlap.h"

namespace {

using namespace windrow;

// Processor time of this process, which has one thread: other work on the machine does not count.
double seconds() { return static_cast<double>(std::clock()) / CLOCKS_PER_SEC; }

// Bytes of a line of /proc/self/status, such as VmHWM.
double status_bytes(const char* key) {
  std::ifstream in("/proc/self/status");
  for (std::string line; std::getline(in, line);) {
    if (line.starts_with(key)) return 1024 * std::stod(line.substr(line.find(':') + 1));
  }
  return 0;
}

void reset_peak() { std::ofstream("/proc/self/clear_refs") << "5"; }

std::vector<double> edges(double from, double to, std::size_t n) {
  std::vector<double> out;
  for (std::size_t k = 0; k <= n; ++k)
    out.push_back(from + (to - from) * static_cast<double>(k) / static_cast<double>(n));
  return out;
}

mesh::MeshPtr regular(double step) {
  return mesh::make_latlon({edges(0, 360, static_cast<std::size_t>(std::lround(360 / step))),
                            edges(-90, 90, static_cast<std::size_t>(std::lround(180 / step)))},
                           {}, "regular");
}

mesh::MeshPtr rotated(double step) {
  return mesh::make_rotated({edges(-30, 30, static_cast<std::size_t>(std::lround(60 / step))),
                             edges(-30, 30, static_cast<std::size_t>(std::lround(60 / step)))},
                            {-162, 39.25, 0}, {}, "rotated");
}

// 2500 km by 2500 km about 48 N 10 E in an equal-area projection.
mesh::MeshPtr projected(std::size_t n) {
  const geo::Crs crs = geo::make_crs("+proj=laea +lat_0=48 +lon_0=10 +R=6371000", "projected");
  return mesh::make_projected(edges(-1.25e6, 1.25e6, n), edges(-1.25e6, 1.25e6, n), crs.to_geographic,
                              crs.from_geographic, {}, "laea", "projected");
}

mesh::MeshPtr healpix(int level) {
  std::vector<mesh::HealpixCell> cells(std::size_t{12} << (2 * level));
  for (std::size_t k = 0; k < cells.size(); ++k) cells[k] = {level, k};
  return mesh::make_healpix(cells, 0, {}, "healpix");
}

// The regular grid's cells cut in two along a diagonal, as faces.
mesh::MeshPtr triangles(std::size_t nx, std::size_t ny) {
  mesh::FaceNodes faces;
  faces.most = 3;
  for (std::size_t j = 0; j <= ny; ++j) {
    for (std::size_t i = 0; i < nx; ++i) {
      faces.lon_deg.push_back(360.0 * static_cast<double>(i) / static_cast<double>(nx));
      faces.lat_deg.push_back(-80 + 160.0 * static_cast<double>(j) / static_cast<double>(ny));
    }
  }
  const auto node = [&](std::size_t j, std::size_t i) { return static_cast<std::int64_t>(j * nx + i % nx); };
  for (std::size_t j = 0; j < ny; ++j) {
    for (std::size_t i = 0; i < nx; ++i) {
      faces.nodes.insert(faces.nodes.end(), {node(j, i), node(j, i + 1), node(j + 1, i + 1)});
      faces.nodes.insert(faces.nodes.end(), {node(j, i), node(j + 1, i + 1), node(j + 1, i)});
    }
  }
  Notices notices;
  return mesh::make_faces(faces, {}, "triangles", notices);
}

double time_pair(const std::string& name, const mesh::Mesh& source, const mesh::Mesh& target, double mesh_seconds) {
  const double before = status_bytes("VmRSS");
  reset_peak();
  const double start = seconds();
  const auto result = overlap::conservative(source, target, linear_map::Quantity::mean);
  const double took = seconds() - start;
  const double cells = static_cast<double>(std::max(source.size(), target.size()));
  const double pairings = static_cast<double>(result.map.pairings());
  fmt::print(
      "{{\"name\": \"{}\", \"mesh_cells\": {}, \"source_cells\": {}, \"pairings\": {}, \"seconds\": {:.4f}, "
      "\"cells_per_second\": {:.0f}, \"bytes_per_pairing\": {:.1f}, \"mesh_seconds\": {:.3f}}}\n",
      name, target.size(), source.size(), result.map.pairings(), took, cells / took,
      (status_bytes("VmHWM") - before) / pairings, mesh_seconds);
  std::fflush(stdout);
  return took;
}

template <typename Make>
mesh::MeshPtr timed(double& took, const Make& make) {
  const double start = seconds();
  auto out = make();
  took = seconds() - start;
  return out;
}

}  // namespace

int main(int argc, char** argv) {
  omp_set_num_threads(1);
  const bool quick = argc > 1 && std::strcmp(argv[1], "--quick") == 0;
  const std::size_t n = quick ? 500 : 1000;
  double took = 0;
  const auto grid = regular(1.25);
  double small = 0, large = 0;
  {
    const auto mesh = timed(took, [] { return projected(500); });
    small = time_pair("projected over regular", *grid, *mesh, took);
  }
  if (!quick) {
    const auto mesh = timed(took, [] { return projected(2000); });
    large = time_pair("projected over regular", *grid, *mesh, took);
    fmt::print("{{\"name\": \"growth from 0.25 M to 4 M cells\", \"ratio\": {:.2f}}}\n", large / small);
  }
  const auto mesh = timed(took, [&] { return projected(n); });
  time_pair("projected over rotated", *rotated(0.5), *mesh, took);
  time_pair("projected over HEALPix", *healpix(6), *mesh, took);
  time_pair("projected over triangles", *triangles(288, 128), *mesh, took);
  time_pair("regular over projected", *mesh, *regular(0.25), took);
  const auto other = timed(took, [&] { return healpix(quick ? 7 : 8); });
  time_pair("HEALPix over regular", *regular(1), *other, took);
  time_pair("HEALPix over triangles of like size", *triangles(quick ? 720 : 1080, quick ? 320 : 480), *other, took);
  time_pair("triangles over HEALPix", *healpix(5), *triangles(quick ? 720 : 1080, quick ? 320 : 480), took);
  return 0;
}
