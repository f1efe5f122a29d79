// Faces of a UGRID 1.0 mesh (CF 1.13 section 5.9, appendix K): topology variable, nodes, face-node connectivity.
#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <cstdlib>
#include <set>

#include "cell_list.h"

namespace windrow::cf {

namespace {

constexpr std::int64_t kNoNode = -1;

/// The topology variable that the data variable's `mesh` names; null when it names none.
const nc::Var* topology_of(const Context& context) {
  const std::string name = context.variable.text("mesh");
  if (name.empty()) return nullptr;
  const nc::Var* topology = context.header().find(name);
  if (topology == nullptr) context.fail(fmt::format("its mesh '{}' is not in the file", name));
  const nc::Att* dimension = topology->find("topology_dimension");
  if (dimension != nullptr && !dimension->numbers.empty() && dimension->numbers[0] != 2)
    context.fail(fmt::format("mesh '{}' has the topology dimension {:g}; a mesh of faces (2) is needed", name,
                             dimension->numbers[0]));
  const std::string location = lower(context.variable.text("location"));
  if (location != "face")
    context.fail(location.empty() ? fmt::format("on mesh '{}' without an attribute location; 'face' is needed", name)
                                  : fmt::format("at the {}s of mesh '{}'; only data at faces have an area and can be "
                                                "read",
                                                location, name));
  return topology;
}

/// One variable of those an attribute of the topology names.
const nc::Var& named(const Context& context, const nc::Var& topology, const char* attribute, const std::string& name) {
  if (name.empty()) context.fail(fmt::format("mesh '{}' has no attribute {}", topology.name, attribute));
  const nc::Var* var = context.header().find(name);
  if (var == nullptr)
    context.fail(fmt::format("'{}', which {} of mesh '{}' names, is not in the file", name, attribute, topology.name));
  return *var;
}

/// Longitude and latitude that `attribute` names, by their units or standard names; nothing when it names none.
std::optional<LatLonPair> coordinates(const Context& context, const nc::Var& topology, const char* attribute) {
  LatLonPair pair;
  for (const std::string& name : words(topology.text(attribute))) {
    const nc::Var& var = named(context, topology, attribute, name);
    if (role_of(var) == Role::latitude && pair.latitude == nullptr) pair.latitude = &var;
    if (role_of(var) == Role::longitude && pair.longitude == nullptr) pair.longitude = &var;
  }
  if (pair.latitude == nullptr || pair.longitude == nullptr) return std::nullopt;
  if (pair.latitude->dims.size() != 1 || pair.latitude->dims != pair.longitude->dims)
    context.fail(fmt::format("{} '{}' and '{}' of mesh '{}' do not share one dimension", attribute,
                             pair.longitude->name, pair.latitude->name, topology.name));
  pair.dims = pair.latitude->dims;
  return pair;
}

/// The dimension of faces: `face_dimension`, else the connectivity's that the data have, else its first.
int face_dim(const Context& context, const nc::Var& topology, const nc::Var& connectivity) {
  const std::string name = topology.text("face_dimension");
  for (const int id : connectivity.dims) {
    if (!name.empty() && context.header().dim(id).name == name) return id;
    if (name.empty() && std::ranges::find(context.variable.dims, id) != context.variable.dims.end()) return id;
  }
  if (!name.empty())
    context.fail(fmt::format("face_dimension '{}' of mesh '{}' is no dimension of '{}' {}", name, topology.name,
                             connectivity.name, context.header().shape_text(connectivity)));
  return connectivity.dims[0];
}

std::int64_t start_index(const Context& context, const nc::Var& connectivity) {
  const nc::Att* att = connectivity.find("start_index");
  if (att == nullptr) return 0;
  const double start = !att->numbers.empty() ? att->numbers[0] : std::strtod(att->text.c_str(), nullptr);
  if (start != 0 && start != 1)
    context.fail(fmt::format("start_index of '{}' is {:g}; 0 or 1 was expected", connectivity.name, start));
  return std::int64_t(start);
}

/// Numbers that stand for no node beside negative ones: _FillValue and missing_value.
std::set<double> fills_of(const nc::Var& connectivity) {
  std::set<double> fills;
  for (const char* name : {"_FillValue", "missing_value"})
    if (const nc::Att* att = connectivity.find(name)) fills.insert(att->numbers.begin(), att->numbers.end());
  if (connectivity.type == NC_INT) fills.insert(NC_FILL_INT);
  if (connectivity.type == NC_INT64) fills.insert(double(NC_FILL_INT64));
  return fills;
}

/// Connectivity as faces x most, numbered from 0, kNoNode where there is none.
void read_nodes(const Context& context, const nc::Var& connectivity, int faces_id, mesh::FaceNodes& faces) {
  const Header& header = context.header();
  const bool transposed = connectivity.dims[1] == faces_id;
  const std::size_t count = header.dim(faces_id).length;
  faces.most = header.dim(connectivity.dims[transposed ? 0 : 1]).length;
  if (faces.most < 3 || count == 0)
    context.fail(fmt::format("'{}' has the shape {} x {}; faces of at least 3 nodes were expected", connectivity.name,
                             count, faces.most));
  std::vector<double> numbers;  // connectivity of floats is met; whole numbers are all that counts
  if (connectivity.type == NC_FLOAT || connectivity.type == NC_DOUBLE) {
    numbers = context.inputs.over(connectivity, connectivity.dims);
  } else {
    for (const std::int64_t number : context.inputs.integers(connectivity)) numbers.push_back(double(number));
  }
  const std::set<double> fills = fills_of(connectivity);
  const std::int64_t start = start_index(context, connectivity), nodes = std::int64_t(faces.lon_deg.size());
  faces.nodes.assign(count * faces.most, kNoNode);
  for (std::size_t face = 0; face < count; ++face) {
    std::size_t own = 0;
    for (std::size_t k = 0; k < faces.most; ++k) {
      const double raw = numbers[transposed ? k * count + face : face * faces.most + k];
      const bool none = !(raw >= 0) || fills.contains(raw) || raw > double(nodes);
      if (none) continue;
      const std::int64_t node = std::int64_t(raw) - start;
      if (double(node + start) != raw || node < 0 || node >= nodes)
        context.fail(
            fmt::format("face {} of '{}' (counted from 0) names node {:g}, but nodes are numbered {} to {} "
                        "(start_index {})",
                        face, connectivity.name, raw, start, nodes - 1 + start, start));
      if (own != k)
        context.fail(
            fmt::format("face {} of '{}' (counted from 0) has a missing node before others", face, connectivity.name));
      faces.nodes[face * faces.most + own++] = node;
    }
    if (own < 3)
      context.fail(fmt::format("face {} of '{}' (counted from 0) has {} nodes; at least 3 were expected", face,
                               connectivity.name, own));
  }
}

}  // namespace

std::optional<FileGrid> find_ugrid(const Context& context) {
  const nc::Var* topology = topology_of(context);
  if (topology == nullptr) return std::nullopt;
  const Header& header = context.header();
  const nc::Var& connectivity =
      named(context, *topology, "face_node_connectivity", topology->text("face_node_connectivity"));
  if (connectivity.dims.size() != 2)
    context.fail(fmt::format("'{}' has the shape {}; faces x nodes was expected", connectivity.name,
                             header.shape_text(connectivity)));
  const auto nodes = coordinates(context, *topology, "node_coordinates");
  if (!nodes)
    context.fail(fmt::format(
        "node_coordinates of mesh '{}' name no longitude and latitude (degrees_east, degrees_north)", topology->name));
  const int faces_id = face_dim(context, *topology, connectivity);
  if (std::ranges::find(context.variable.dims, faces_id) == context.variable.dims.end())
    context.fail(fmt::format("it has no dimension '{}', which is that of the faces of mesh '{}'",
                             header.dim(faces_id).name, topology->name));
  FileGrid result;
  mesh::FaceNodes& faces = result.grid.faces;
  faces.lon_deg = read_degrees(context, *nodes->longitude, nodes->dims);
  faces.lat_deg = read_degrees(context, *nodes->latitude, nodes->dims);
  read_nodes(context, connectivity, faces_id, faces);
  for (const std::int64_t node : faces.nodes)
    if (node != kNoNode && (std::isnan(faces.lon_deg[node]) || std::isnan(faces.lat_deg[node])))
      context.fail(fmt::format("node {} of mesh '{}' (counted from 0) has no coordinates", node, topology->name));
  // Nodes of no face may lack coordinates; they take a place so that every number in the record is one.
  for (std::vector<double>* list : {&faces.lon_deg, &faces.lat_deg})
    for (double& value : *list) value = std::isnan(value) ? 0 : value;
  if (const auto centres = coordinates(context, *topology, "face_coordinates");
      centres && centres->dims == std::vector<int>{faces_id}) {
    faces.centre_lon_deg = read_degrees(context, *centres->longitude, centres->dims);
    faces.centre_lat_deg = read_degrees(context, *centres->latitude, centres->dims);
    const auto missing = [](double value) { return std::isnan(value); };
    if (std::ranges::any_of(faces.centre_lon_deg, missing) || std::ranges::any_of(faces.centre_lat_deg, missing)) {
      faces.centre_lon_deg.clear();
      faces.centre_lat_deg.clear();
    }
  }
  result.grid.kind = GridKind::faces;
  if (sides_of(context, false) == mesh::Sides::parallels)
    context.remarks.push_back("the job's sides = \"parallels\" is not used: sides of UGRID faces are great circles");
  result.grid.mapping = mapping_records(context.mapping);
  result.grid.how = fmt::format("UGRID, {} faces of up to {} nodes, {} nodes, sides along great circles",
                                faces.nodes.size() / faces.most, faces.most, faces.lon_deg.size());
  result.grid.why =
      fmt::format("mesh '{}' with face_node_connectivity '{}', location face", topology->name, connectivity.name);
  result.dims = {faces_id};
  result.places = Places::all(header.dim(faces_id).length);
  return result;
}

}  // namespace windrow::cf
