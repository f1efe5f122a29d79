#include "describe_mesh.h"

#include <algorithm>
#include <cmath>

#include "windrow/sphere/area.h"

namespace windrow::engine {
namespace {

using cf::NamedValue;
using cf::SmallVariable;
using cf::Type;
using Attributes = std::vector<NamedValue>;

Attributes latitude() { return {{"standard_name", "latitude"}, {"long_name", "latitude"}, {"units", "degrees_north"}}; }
Attributes longitude() {
  return {{"standard_name", "longitude"}, {"long_name", "longitude"}, {"units", "degrees_east"}};
}
Attributes with(Attributes list, const std::string& name, cf::AttributeValue value) {
  list.push_back({name, std::move(value)});
  return list;
}

/// Geographic degrees of a point of the unit sphere.
std::pair<double, double> degrees_of(const sphere::Vec3& p) {
  return {Angle::radians(std::atan2(p.y, p.x)).degrees(),
          Angle::radians(std::atan2(p.z, std::hypot(p.x, p.y))).degrees()};
}

class MeshDescriber {
 public:
  explicit MeshDescriber(const Target& target) : target_(target) {}
  MeshDescription describe();

 private:
  void add(const std::string& name, Type type, std::vector<std::string> dimensions, std::vector<double> values,
           Attributes attributes, bool deflate = false) {
    out_.variables.push_back({name, type, std::move(dimensions), std::move(attributes), std::move(values), deflate});
  }
  void dimension(const std::string& name, std::size_t length) { out_.dimensions.push_back({name, length, false}); }
  void horizontal(const std::string& y, const std::string& x) {
    out_.horizontal = {y, x};
    dimension(y, target_.ny);
    dimension(x, target_.nx);
  }
  void horizontal(const std::string& one) {
    out_.horizontal = {one};
    dimension(one, target_.mesh->size());
  }
  void axis(const std::string& name, const std::vector<double>& edges, Attributes attributes);
  void centres(const Attributes& lat, const Attributes& lon);
  void texts(const std::string& name, const std::vector<std::string>& values, Attributes attributes);
  void projected();
  void rotated();
  void corners();
  void healpix();
  void faces();
  void catchments();
  void towns();
  void grid_mapping();
  void mask();

  const Target& target_;
  MeshDescription out_;
};

void MeshDescriber::axis(const std::string& name, const std::vector<double>& edges, Attributes attributes) {
  std::vector<double> middle, bounds;
  for (std::size_t i = 0; i + 1 < edges.size(); ++i) {
    middle.push_back((edges[i] + edges[i + 1]) / 2);
    bounds.insert(bounds.end(), {edges[i], edges[i + 1]});
  }
  attributes.push_back({"bounds", name + "_bnds"});
  add(name, Type::float64, {name}, std::move(middle), std::move(attributes));
  add(name + "_bnds", Type::float64, {name, "bnds"}, std::move(bounds), {});
}

/// Positions of all cell centres as auxiliary coordinates.
void MeshDescriber::centres(const Attributes& lat, const Attributes& lon) {
  std::vector<double> phi, lambda;
  for (std::size_t k = 0; k < target_.mesh->size(); ++k) {
    const GeoPoint centre = target_.mesh->centre(k);
    phi.push_back(centre.latitude.degrees());
    lambda.push_back(centre.longitude.degrees());
  }
  add("lat", Type::float64, out_.horizontal, std::move(phi), lat, true);
  add("lon", Type::float64, out_.horizontal, std::move(lambda), lon, true);
  out_.data_attributes.push_back({"coordinates", "lat lon"});
}

void MeshDescriber::texts(const std::string& name, const std::vector<std::string>& values, Attributes attributes) {
  std::size_t longest = 1;
  for (const auto& text : values) longest = std::max(longest, text.size());
  std::vector<double> codes(values.size() * longest, 0.0);
  for (std::size_t k = 0; k < values.size(); ++k) {
    for (std::size_t c = 0; c < values[k].size(); ++c) {
      codes[k * longest + c] = static_cast<double>(static_cast<signed char>(values[k][c]));
    }
  }
  dimension(name + "_length", longest);
  add(name, Type::text, {out_.horizontal.front(), name + "_length"}, std::move(codes), std::move(attributes));
}

void MeshDescriber::projected() {
  horizontal("y", "x");
  const std::string units = target_.crs.units.empty() ? "m" : target_.crs.units;
  const auto named = [&](const std::string& letter, const char* upper) {
    return Attributes{{"standard_name", "projection_" + letter + "_coordinate"},
                      {"long_name", letter + " of projection"},
                      {"units", units},
                      {"axis", upper}};
  };
  axis("y", target_.y_edges, named("y", "Y"));
  axis("x", target_.x_edges, named("x", "X"));
  // Geodetic positions of the cell centres, straight from the projection.
  std::vector<double> lambda, phi;
  for (std::size_t y = 0; y < target_.ny; ++y) {
    for (std::size_t x = 0; x < target_.nx; ++x) {
      lambda.push_back((target_.x_edges[x] + target_.x_edges[x + 1]) / 2);
      phi.push_back((target_.y_edges[y] + target_.y_edges[y + 1]) / 2);
    }
  }
  target_.crs.to_geographic(lambda, phi);
  add("lat", Type::float64, {"y", "x"}, std::move(phi), latitude(), true);
  add("lon", Type::float64, {"y", "x"}, std::move(lambda), longitude(), true);
  out_.data_attributes.push_back({"coordinates", "lat lon"});
}

void MeshDescriber::rotated() {
  horizontal("rlat", "rlon");
  axis("rlat", target_.y_edges,
       {{"standard_name", "grid_latitude"},
        {"long_name", "latitude in the rotated frame"},
        {"units", "degrees"},
        {"axis", "Y"}});
  axis("rlon", target_.x_edges,
       {{"standard_name", "grid_longitude"},
        {"long_name", "longitude in the rotated frame"},
        {"units", "degrees"},
        {"axis", "X"}});
  centres(latitude(), longitude());
}

/// Corners of curvilinear and listed cells: as given where they were, otherwise those of the cells' outlines.
void MeshDescriber::corners() {
  const bool two = target_.layout == MeshLayout::curvilinear;
  if (two) {
    horizontal("y", "x");
  } else {
    horizontal("cell");
  }
  centres(with(latitude(), "bounds", "lat_bnds"), with(longitude(), "bounds", "lon_bnds"));
  std::vector<std::vector<std::pair<double, double>>> corner(target_.mesh->size());
  std::size_t most = 3;
  for (std::size_t k = 0; k < corner.size(); ++k) {
    const sphere::Polygon polygon = target_.mesh->cell(k);
    for (const auto& arc : polygon.pieces.front().loops.front()) corner[k].push_back(degrees_of(arc.from));
    most = std::max(most, corner[k].size());
  }
  constexpr double kNone = 9.969209968386869e36;  // the library's default fill of doubles
  std::vector<double> phi(corner.size() * most, kNone), lambda(corner.size() * most, kNone);
  for (std::size_t k = 0; k < corner.size(); ++k) {
    for (std::size_t c = 0; c < corner[k].size(); ++c) {
      lambda[k * most + c] = corner[k][c].first;
      phi[k * most + c] = corner[k][c].second;
    }
  }
  dimension("corner", most);
  std::vector<std::string> dimensions = out_.horizontal;
  dimensions.emplace_back("corner");
  add("lat_bnds", Type::float64, dimensions, std::move(phi), {{"_FillValue", kNone}}, true);
  add("lon_bnds", Type::float64, dimensions, std::move(lambda), {{"_FillValue", kNone}}, true);
}

void MeshDescriber::healpix() {
  horizontal("cell");
  centres(latitude(), longitude());
  // nuniq = nested + 4^(1 + level) names cells of any level (CF 1.13 appendix F).
  std::vector<double> numbers;
  for (const auto& cell : target_.grid.healpix) {
    numbers.push_back(static_cast<double>(cell.nested) + std::ldexp(1.0, 2 * (1 + cell.level)));
  }
  const bool wide = *std::max_element(numbers.begin(), numbers.end()) > 2147483647.0;
  add("healpix_index", wide ? Type::float64 : Type::int32, {"cell"}, std::move(numbers),
      {{"standard_name", "healpix_index"}, {"long_name", "unique number of the cell, nested scheme"}, {"units", "1"}});
}

void MeshDescriber::faces() {
  horizontal("face");
  const mesh::FaceNodes& faces = target_.grid.faces;
  dimension("node", faces.lon_deg.size());
  dimension("face_corner", faces.most);
  add("mesh", Type::int32, {}, {0},
      {{"cf_role", "mesh_topology"},
       {"long_name", "topology of the cells"},
       {"topology_dimension", std::int32_t{2}},
       {"node_coordinates", "node_lon node_lat"},
       {"face_node_connectivity", "face_nodes"},
       {"face_coordinates", "lon lat"},
       {"face_dimension", "face"}});
  add("node_lon", Type::float64, {"node"}, faces.lon_deg, longitude());
  add("node_lat", Type::float64, {"node"}, faces.lat_deg, latitude());
  std::vector<double> nodes(faces.nodes.begin(), faces.nodes.end());
  add("face_nodes", Type::int32, {"face", "face_corner"}, std::move(nodes),
      {{"cf_role", "face_node_connectivity"},
       {"long_name", "nodes of every face"},
       {"start_index", std::int32_t{0}},
       {"_FillValue", std::int32_t{-1}}});
  centres(latitude(), longitude());
  out_.data_attributes.push_back({"mesh", "mesh"});
  out_.data_attributes.push_back({"location", "face"});
  out_.conventions = "CF-1.13 UGRID-1.0";
}

/// Twice the signed area in the plane: positive for anticlockwise rings.
double turn_of(const mesh::PolygonCell::Ring& ring) {
  double sum = 0;
  for (std::size_t k = 0; k < ring.size(); ++k) {
    const auto& a = ring[k];
    const auto& b = ring[(k + 1) % ring.size()];
    sum += (a[0] - ring[0][0]) * (b[1] - ring[0][1]) - (b[0] - ring[0][0]) * (a[1] - ring[0][1]);
  }
  return sum;
}

void MeshDescriber::catchments() {
  horizontal("catchment");
  std::vector<double> lon, lat, nodes_of_cell, nodes_of_part, interior;
  for (const auto& cell : target_.polygons) {
    const std::size_t before = lon.size();
    for (const auto& part : cell.parts) {
      for (std::size_t r = 0; r < part.size(); ++r) {
        mesh::PolygonCell::Ring ring = part[r];
        if (ring.size() > 1 && ring.front() == ring.back()) ring.pop_back();
        // Outer rings run anticlockwise, holes clockwise (CF 7.5).
        if ((turn_of(ring) > 0) != (r == 0)) std::reverse(ring.begin(), ring.end());
        for (const auto& point : ring) {
          lon.push_back(point[0]);
          lat.push_back(point[1]);
        }
        nodes_of_part.push_back(static_cast<double>(ring.size()));
        interior.push_back(r == 0 ? 0 : 1);
      }
    }
    nodes_of_cell.push_back(static_cast<double>(lon.size() - before));
  }
  dimension("node", lon.size());
  dimension("part", interior.size());
  add("outline", Type::int32, {}, {0},
      {{"geometry_type", "polygon"},
       {"node_count", "node_count"},
       {"node_coordinates", "node_lon node_lat"},
       {"part_node_count", "part_node_count"},
       {"interior_ring", "interior_ring"},
       {"grid_mapping", "crs"},
       {"coordinates", "lat lon"}});
  add("node_count", Type::int32, {"catchment"}, std::move(nodes_of_cell),
      {{"long_name", "outline points of each catchment"}});
  add("part_node_count", Type::int32, {"part"}, std::move(nodes_of_part), {{"long_name", "points of each ring"}});
  add("interior_ring", Type::int32, {"part"}, std::move(interior),
      {{"long_name", "1 for a hole, 0 for an outer ring"}});
  add("node_lon", Type::float64, {"node"}, std::move(lon), with(longitude(), "axis", "X"));
  add("node_lat", Type::float64, {"node"}, std::move(lat), with(latitude(), "axis", "Y"));
  texts("id", target_.ids, {{"long_name", "id of the catchment"}});
  centres(with(latitude(), "nodes", "node_lat"), with(longitude(), "nodes", "node_lon"));
  out_.data_attributes.back() = {"coordinates", "lat lon id"};
  out_.data_attributes.push_back({"geometry", "outline"});
}

void MeshDescriber::towns() {
  horizontal("town");
  texts("id", target_.ids, {{"long_name", "id of the town"}, {"cf_role", "timeseries_id"}});
  std::string coordinates = "lat lon id";
  if (std::any_of(target_.names.begin(), target_.names.end(), [](const std::string& n) { return !n.empty(); })) {
    texts("town_name", target_.names, {{"long_name", "name of the town"}});
    coordinates += " town_name";
  }
  centres(latitude(), longitude());
  constexpr double kNone = 9.969209968386869e36;
  std::vector<double> elevation = target_.elevation;
  if (std::any_of(elevation.begin(), elevation.end(), [](double z) { return !std::isnan(z); })) {
    for (double& z : elevation) z = std::isnan(z) ? kNone : z;
    add("elevation", Type::float64, {"town"}, std::move(elevation),
        {{"_FillValue", kNone},
         {"standard_name", "surface_altitude"},
         {"long_name", "elevation of the town"},
         {"units", "m"}});
    coordinates += " elevation";
  }
  out_.data_attributes.back() = {"coordinates", coordinates};
  out_.global.push_back({"featureType", "timeSeries"});
}

void MeshDescriber::grid_mapping() {
  Attributes attributes;
  if (target_.layout == MeshLayout::rotated) {
    const auto& pole = target_.grid.rotation;
    attributes = {{"grid_mapping_name", "rotated_latitude_longitude"},
                  {"grid_north_pole_longitude", pole.pole_lon_deg},
                  {"grid_north_pole_latitude", pole.pole_lat_deg},
                  {"north_pole_grid_longitude", pole.north_pole_grid_lon_deg},
                  {"earth_radius", target_.earth.radius_m}};
    add("crs", Type::int32, {}, {0}, std::move(attributes));
    return;
  }
  const auto& mapping = target_.crs.grid_mapping;
  if (target_.layout == MeshLayout::healpix) {
    attributes = {{"grid_mapping_name", "healpix"}, {"indexing_scheme", "nuniq"}};
  } else if (!mapping.name.empty()) {
    attributes.push_back({"grid_mapping_name", mapping.name});
  }
  for (const auto& [name, value] : mapping.attributes) {
    std::visit([&, &key = name](const auto& given) { attributes.push_back({key, given}); }, value);
  }
  if (target_.layout != MeshLayout::healpix) attributes.push_back({"crs_wkt", target_.crs.wkt});
  add("crs", Type::int32, {}, {0}, std::move(attributes));
}

void MeshDescriber::mask() {
  if (target_.outside.empty()) return;
  std::vector<double> within;
  for (const bool out : target_.outside) within.push_back(out ? 0 : 1);
  add("mask", Type::int8, out_.horizontal, std::move(within),
      {{"long_name", "is at least half of the cell within the job's mask"},
       {"flag_values", std::vector<std::int8_t>{0, 1}},
       {"flag_meanings", "outside within"}},
      true);
}

MeshDescription MeshDescriber::describe() {
  dimension("bnds", 2);
  switch (target_.layout) {
    case MeshLayout::latlon:
      horizontal("lat", "lon");
      axis("lat", target_.y_edges, with(latitude(), "axis", "Y"));
      axis("lon", target_.x_edges, with(longitude(), "axis", "X"));
      break;
    case MeshLayout::projected:
      projected();
      break;
    case MeshLayout::rotated:
      rotated();
      break;
    case MeshLayout::curvilinear:
    case MeshLayout::listed:
      corners();
      break;
    case MeshLayout::healpix:
      healpix();
      break;
    case MeshLayout::faces:
      faces();
      break;
    case MeshLayout::catchments:
      catchments();
      break;
    case MeshLayout::towns:
      towns();
      break;
  }
  grid_mapping();
  out_.data_attributes.insert(out_.data_attributes.begin(), {"grid_mapping", "crs"});
  if (target_.mesh->has_area()) {
    std::vector<double> area(target_.mesh->size());
    const double scale = target_.earth.radius_m * target_.earth.radius_m;
    for (std::size_t i = 0; i < area.size(); ++i) area[i] = target_.mesh->area(i) * scale;
    add("cell_area", Type::float64, out_.horizontal, std::move(area),
        {{"standard_name", "cell_area"}, {"long_name", "area of the mesh cell"}, {"units", "m2"}}, true);
    out_.data_attributes.push_back({"cell_measures", "area: cell_area"});
  }
  mask();
  return std::move(out_);
}

}  // namespace

MeshDescription describe_mesh(const Target& target) { return MeshDescriber(target).describe(); }

}  // namespace windrow::engine
