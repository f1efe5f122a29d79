// Polygons of vector layers through GDAL. Only four local drivers are registered, so no file can open another, reach
// the network or be read as NetCDF or HDF5. Geometry on the sphere is the mesh's business; validity here is that of the
// plane.
#include "windrow/geo/polygons.h"

#include <cpl_string.h>
#include <fmt/format.h>
#include <gdal.h>
#include <ogr_api.h>
#include <ogrsf_frmts.h>

#include <algorithm>
#include <map>
#include <mutex>
#include <set>

#include "gdal_handles.h"
#include "rings.h"
#include "windrow/base/error.h"
#include "windrow/text/words.h"

namespace windrow::geo {
namespace {

constexpr const char* kDrivers[] = {"GPKG", "ESRI Shapefile", "GeoJSON", "FlatGeobuf", nullptr};

void register_drivers() {
  static std::once_flag once;
  std::call_once(once, [] {
    RegisterOGRGeoPackage();
    RegisterOGRShape();
    RegisterOGRGeoJSON();
    RegisterOGRFlatGeobuf();
    OSRSetPROJEnableNetwork(0);
  });
}

/// Text of a file made fit for one line of a message.
std::string shown(const std::string& text) {
  std::string out = text.substr(0, 80);
  std::replace_if(
      out.begin(), out.end(), [](unsigned char c) { return c < 0x20 || c == 0x7F; }, '?');
  return out + (text.size() > 80 ? "..." : "");
}

std::vector<std::string> all_shown(const std::vector<std::string>& names) {
  std::vector<std::string> out;
  for (const std::string& name : names) out.push_back(shown(name));
  return out;
}

/// Where and in what the reading is, for messages.
struct Source {
  const std::string& path;
  const std::string& place;
  std::string layer;

  [[noreturn]] void fail(Failure kind, const std::string& message) const { throw Error(kind, place, message); }
  [[noreturn]] void fail(std::size_t feature, const std::string& message) const {
    fail(Failure::data,
         fmt::format("{}feature {} of layer '{}' {}", subject(path, place, ": "), feature, shown(layer), message));
  }
};

std::string expected_name(const std::string& name, const std::vector<std::string>& known) {
  const std::string nearest = text::nearest_word(name, known);
  return nearest.empty() ? "expected " + text::alternatives(all_shown(known))
                         : "did you mean '" + shown(nearest) + "'?";
}

DatasetHandle open_dataset(const Source& source) {
  if (!is_local_file(source.path)) source.fail(Failure::missing, fmt::format("there is no file '{}'", source.path));
  DatasetHandle dataset(GDALOpenEx(source.path.c_str(), GDAL_OF_VECTOR | GDAL_OF_READONLY, kDrivers, nullptr, nullptr));
  if (!dataset)
    source.fail(Failure::data, fmt::format("{}is no vector file that can be read; expected GeoPackage, Shapefile, "
                                           "GeoJSON or FlatGeobuf{}",
                                           subject(source.path, source.place), reason()));
  return dataset;
}

/// The layer of that name; without a name the only one that has geometries.
OGRLayerH chosen_layer(GDALDatasetH dataset, const std::string& wanted, const Source& source) {
  std::vector<OGRLayerH> layers;
  std::vector<std::string> names;
  for (int i = 0; i < GDALDatasetGetLayerCount(dataset); ++i) {
    const OGRLayerH layer = GDALDatasetGetLayer(dataset, i);
    if (layer == nullptr || OGR_L_GetGeomType(layer) == wkbNone) continue;
    layers.push_back(layer);
    names.emplace_back(OGR_L_GetName(layer));
  }
  if (layers.empty())
    source.fail(Failure::data, fmt::format("{}has no layer with geometries", subject(source.path, source.place)));
  if (wanted.empty()) {
    if (layers.size() > 1)
      source.fail(Failure::data,
                  fmt::format("{}has {} layers; expected one to be named: {}", subject(source.path, source.place),
                              layers.size(), text::alternatives(all_shown(names))));
    return layers.front();
  }
  for (std::size_t i = 0; i < layers.size(); ++i)
    if (names[i] == wanted) return layers[i];
  source.fail(Failure::missing, fmt::format("{}has no layer '{}'; {}", subject(source.path, source.place),
                                            shown(wanted), expected_name(wanted, names)));
}

/// Index of the id column; -1 when none is wanted.
int id_column(OGRLayerH layer, const std::string& id, const Source& source) {
  if (id.empty()) return -1;
  const OGRFeatureDefnH definition = OGR_L_GetLayerDefn(layer);
  std::vector<std::string> names;
  for (int i = 0; i < OGR_FD_GetFieldCount(definition); ++i) {
    const OGRFieldDefnH field = OGR_FD_GetFieldDefn(definition, i);
    names.emplace_back(OGR_Fld_GetNameRef(field));
    if (names.back() != id) continue;
    const OGRFieldType type = OGR_Fld_GetType(field);
    if (type != OFTString && type != OFTInteger && type != OFTInteger64)
      source.fail(Failure::data, fmt::format("{}column '{}' of layer '{}' holds neither text nor whole numbers; "
                                             "expected a column that tells features apart",
                                             subject(source.path, source.place, ": "), shown(id), shown(source.layer)));
    return i;
  }
  source.fail(Failure::missing, fmt::format("{}layer '{}' has no column '{}'; {}",
                                            subject(source.path, source.place, ": "), shown(source.layer), shown(id),
                                            names.empty() ? "it has none at all" : expected_name(id, names)));
}

std::string id_of(OGRFeatureH feature, int column, std::size_t number, const Source& source) {
  if (column < 0) return std::to_string(number);
  const bool given = OGR_F_IsFieldSetAndNotNull(feature, column) != 0;
  std::string id = given ? text::trimmed(OGR_F_GetFieldAsString(feature, column)) : "";
  if (id.empty()) source.fail(number, "has no id; expected one in every feature, or another column");
  if (!CPLIsUTF8(id.c_str(), static_cast<int>(id.size()))) source.fail(number, "has an id that is no UTF-8 text");
  return id;
}

mesh::PolygonCell::Ring ring_of(OGRGeometryH ring) {
  mesh::PolygonCell::Ring out;
  const int count = OGR_G_GetPointCount(ring);
  out.reserve(static_cast<std::size_t>(std::max(count, 0)));
  for (int i = 0; i < count; ++i) out.push_back({OGR_G_GetX(ring, i), OGR_G_GetY(ring, i)});
  if (out.size() > 1 && out.front() == out.back()) out.pop_back();  // closed implicitly
  return out;
}

/// Rings that simplifying left with one or two different points bound no area; GEOS would refuse the whole polygon.
bool bounds_area(const mesh::PolygonCell::Ring& ring) {
  return std::set<std::array<double, 2>>(ring.begin(), ring.end()).size() > 2;
}

/// Returns how many rings were dropped; without its outer ring a part goes with its holes.
std::size_t add_part(OGRGeometryH polygon, mesh::PolygonCell& cell) {
  std::vector<mesh::PolygonCell::Ring> part;
  const int rings = OGR_G_GetGeometryCount(polygon);
  for (int i = 0; i < rings; ++i) {
    mesh::PolygonCell::Ring ring = ring_of(OGR_G_GetGeometryRef(polygon, i));
    if (bounds_area(ring)) {
      part.push_back(std::move(ring));
    } else if (i == 0) {
      return static_cast<std::size_t>(rings);
    }
  }
  const std::size_t kept = part.size();
  if (kept > 0) cell.parts.push_back(std::move(part));
  return static_cast<std::size_t>(rings) - kept;
}

struct DestroyGeometry {
  void operator()(void* g) const { OGR_G_DestroyGeometry(g); }
};
using Geometry = std::unique_ptr<void, DestroyGeometry>;

/// The feature's polygons in the plane; circular arcs become chords of a quarter of a degree of their circle (areas off
/// by 3e-6 of the circle's).
mesh::PolygonCell cell_of(OGRFeatureH feature, std::size_t number, const Source& source, std::size_t& dropped) {
  constexpr double kArcStep_deg = 0.25;
  const OGRGeometryH given = OGR_F_GetGeometryRef(feature);
  if (given == nullptr || OGR_G_IsEmpty(given)) source.fail(number, "has no geometry; expected a polygon");
  Geometry curved;
  OGRGeometryH geometry = given;
  if (OGR_G_HasCurveGeometry(given, 0)) {
    curved.reset(OGR_G_GetLinearGeometry(given, kArcStep_deg, nullptr));
    geometry = curved.get();
  }
  mesh::PolygonCell cell;
  const OGRwkbGeometryType type = wkbFlatten(OGR_G_GetGeometryType(geometry));
  if (type == wkbPolygon) {
    dropped += add_part(geometry, cell);
  } else if (type == wkbMultiPolygon) {
    for (int i = 0; i < OGR_G_GetGeometryCount(geometry); ++i) {
      dropped += add_part(OGR_G_GetGeometryRef(geometry, i), cell);
    }
  } else {
    source.fail(number, fmt::format("is a {}; expected a polygon or multipolygon",
                                    text::lower(OGRGeometryTypeToName(OGR_G_GetGeometryType(given)))));
  }
  if (cell.parts.empty()) source.fail(number, "bounds no area; expected rings of at least three different points");
  return cell;
}

/// What GEOS says against the cell, or nothing. Its points are laid out so that a ring over the date line is whole.
void check_valid(const mesh::PolygonCell& cell, bool geographic, std::size_t number, const Source& source) {
  if (!all_finite(cell)) source.fail(number, "has a coordinate that is no number");
  const std::optional<mesh::PolygonCell> flat = geographic ? unrolled(cell) : cell;
  if (!flat) return;  // rings about a pole have no flat picture: the mesh checks them on the sphere
  const Geometry shape(OGR_G_CreateGeometry(wkbMultiPolygon));
  for (const auto& part : flat->parts) {
    const OGRGeometryH polygon = OGR_G_CreateGeometry(wkbPolygon);
    for (const auto& ring : part) {
      const OGRGeometryH line = OGR_G_CreateGeometry(wkbLinearRing);
      for (const auto& [x, y] : ring) OGR_G_AddPoint_2D(line, x, y);
      OGR_G_CloseRings(line);
      OGR_G_AddGeometryDirectly(polygon, line);
    }
    OGR_G_AddGeometryDirectly(shape.get(), polygon);
  }
  CPLErrorReset();
  if (!OGR_G_IsValid(shape.get())) source.fail(number, fmt::format("is not valid{}; mend the polygon", reason()));
}

}  // namespace

PolygonLayer read_polygons(const std::string& path, const std::string& layer, const std::string& id,
                           const std::string& place) {
  register_drivers();
  const Quiet quiet;
  Source source{path, place, layer};
  const DatasetHandle dataset = open_dataset(source);
  const OGRLayerH from = chosen_layer(dataset.get(), layer, source);
  source.layer = OGR_L_GetName(from);
  const int column = id_column(from, id, source);

  PolygonLayer out;
  out.layer = source.layer;
  const OGRSpatialReferenceH crs = OGR_L_GetSpatialRef(from);
  out.crs_wkt = horizontal_wkt(crs);
  const bool geographic = crs != nullptr && OSRIsGeographic(crs);
  std::map<std::string, std::size_t> seen;
  OGR_L_ResetReading(from);
  CPLErrorReset();
  struct DestroyFeature {
    void operator()(void* f) const { OGR_F_Destroy(f); }
  };
  while (const std::unique_ptr<void, DestroyFeature> feature{OGR_L_GetNextFeature(from)}) {
    const std::size_t number = out.cells.size() + 1;
    out.ids.push_back(id_of(feature.get(), column, number, source));
    const auto [known, added] = seen.emplace(out.ids.back(), number);
    if (!added)
      source.fail(number, fmt::format("has the id '{}' of feature {}; expected ids of their own, or another column",
                                      shown(known->first), known->second));
    out.cells.push_back(cell_of(feature.get(), number, source, out.dropped_rings));
    check_valid(out.cells.back(), geographic, number, source);
    CPLErrorReset();
  }
  if (CPLGetLastErrorType() >= CE_Failure)
    source.fail(Failure::io, fmt::format("{}cannot be read to its end{}", subject(path, place), reason()));
  if (out.cells.empty())
    source.fail(Failure::data, fmt::format("{}layer '{}' is empty", subject(path, place, ": "), shown(out.layer)));
  return out;
}

bool looks_like_vector(const std::string& path) {
  if (!is_local_file(path)) return false;
  register_drivers();
  const Quiet quiet;
  return GDALIdentifyDriverEx(path.c_str(), GDAL_OF_VECTOR, kDrivers, nullptr) != nullptr;
}

}  // namespace windrow::geo
