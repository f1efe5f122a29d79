// Vector layers: parts, holes and ids as written, and what is refused.
#include <doctest/doctest.h>
#include <gdal.h>
#include <ogr_api.h>
#include <ogrsf_frmts.h>
#include <unistd.h>

#include <cmath>
#include <filesystem>
#include <fstream>
#include <numbers>

#include "windrow/base/error.h"
#include "windrow/geo/polygons.h"

using namespace windrow;

namespace {

struct Folder {
  std::filesystem::path path;
  Folder() : path(std::filesystem::temp_directory_path() / ("windrow_polygons_" + std::to_string(::getpid()))) {
    std::filesystem::create_directories(path);
  }
  ~Folder() { std::filesystem::remove_all(path); }
  std::string write(const std::string& name, const std::string& bytes) const {
    std::filesystem::remove(path / name);  // some file systems sync a file that is written over
    std::ofstream(path / name, std::ios::binary) << bytes;
    return (path / name).string();
  }
};

std::string feature(const std::string& geometry, const std::string& properties = "") {
  return R"({"type":"Feature","properties":{)" + properties + R"(},"geometry":)" + geometry + "}";
}
std::string polygon(const std::string& rings) { return R"({"type":"Polygon","coordinates":[)" + rings + "]}"; }
std::string collection(const std::string& features) {
  return R"({"type":"FeatureCollection","features":[)" + features + "]}";
}
const std::string kSquare = polygon("[[0,0],[2,0],[2,2],[0,2],[0,0]]");

std::string refusal(const std::string& path, Failure kind, const std::string& layer = "", const std::string& id = "") {
  try {
    geo::read_polygons(path, layer, id, "mesh.polygons");
  } catch (const Error& e) {
    CHECK(e.kind() == kind);
    const std::string what = e.what();
    CHECK(what.find('\n') == std::string::npos);
    REQUIRE(what.starts_with("mesh.polygons: "));
    return what.substr(15);
  }
  return "accepted";
}

struct LayerToMake {
  std::string name;
  std::vector<std::string> wkt, codes;
  OGRwkbGeometryType type = wkbUnknown;
};

/// A file of some layers with a text column `code` and a fractional one `area`, in ETRS89-LAEA (EPSG:3035).
std::string make(const Folder& folder, const std::string& driver, const std::string& name,
                 const std::vector<LayerToMake>& layers) {
  RegisterOGRGeoPackage();
  RegisterOGRShape();
  RegisterOGRFlatGeobuf();
  const std::string path = (folder.path / name).string();
  GDALDatasetH d = GDALCreate(GDALGetDriverByName(driver.c_str()), path.c_str(), 0, 0, 0, GDT_Unknown, nullptr);
  REQUIRE(d != nullptr);
  const OGRSpatialReferenceH crs = OSRNewSpatialReference(nullptr);
  OSRImportFromEPSG(crs, 3035);
  OSRSetAxisMappingStrategy(crs, OAMS_TRADITIONAL_GIS_ORDER);
  for (const LayerToMake& made : layers) {
    const OGRLayerH layer = GDALDatasetCreateLayer(d, made.name.c_str(), crs, made.type, nullptr);
    REQUIRE(layer != nullptr);
    for (const auto& [column, type] : {std::pair{"code", OFTString}, std::pair{"area", OFTReal}}) {
      const OGRFieldDefnH field = OGR_Fld_Create(column, type);
      OGR_L_CreateField(layer, field, 0);
      OGR_Fld_Destroy(field);
    }
    for (std::size_t i = 0; i < made.wkt.size(); ++i) {
      const OGRFeatureH f = OGR_F_Create(OGR_L_GetLayerDefn(layer));
      OGR_F_SetFieldString(f, 0, made.codes[i].c_str());
      OGRGeometryH geometry = nullptr;
      std::string text = made.wkt[i];
      char* rest = text.data();
      REQUIRE(OGR_G_CreateFromWkt(&rest, nullptr, &geometry) == OGRERR_NONE);
      OGR_F_SetGeometryDirectly(f, geometry);
      CHECK(OGR_L_CreateFeature(layer, f) == OGRERR_NONE);
      OGR_F_Destroy(f);
    }
  }
  OSRDestroySpatialReference(crs);
  GDALClose(d);
  return path;
}

const LayerToMake kBasins{"basins",
                          {"MULTIPOLYGON(((0 0,4 0,4 4,0 4,0 0),(1 1,1 2,2 2,2 1,1 1)),((6 0,7 0,7 1,6 1,6 0)))",
                           "MULTIPOLYGON(((10 0,12 0,12 2,10 2,10 0)))"},
                          {"K1", "K2"},
                          wkbMultiPolygon};

double signed_area(const mesh::PolygonCell::Ring& ring) {
  double sum = 0;
  for (std::size_t i = 0; i < ring.size(); ++i) {
    const auto &a = ring[i], &b = ring[(i + 1) % ring.size()];
    sum += a[0] * b[1] - b[0] * a[1];
  }
  return sum / 2;
}

}  // namespace

TEST_CASE("parts and holes of a feature are read in every format alike") {
  const Folder folder;
  for (const auto& [driver, name] :
       {std::pair{"GPKG", "b.gpkg"}, std::pair{"ESRI Shapefile", "basins.shp"}, std::pair{"FlatGeobuf", "b.fgb"}}) {
    const auto& told = driver;  // a lambda cannot capture a binding
    CAPTURE(told);
    const std::string path = make(folder, driver, name, {kBasins});
    CHECK(geo::looks_like_vector(path));
    const geo::PolygonLayer layer = geo::read_polygons(path, "", "code", "t");
    CHECK(layer.layer == "basins");
    CHECK(geo::make_crs(layer.crs_wkt, "t").grid_mapping.name == "lambert_azimuthal_equal_area");
    REQUIRE(layer.cells.size() == 2);
    // FlatGeobuf keeps features in the order of its index.
    const std::size_t first = layer.ids[0] == "K1" ? 0 : 1;
    CHECK(layer.ids[1 - first] == "K2");
    const auto& parts = layer.cells[first].parts;
    REQUIRE(parts.size() == 2);
    REQUIRE(parts[0].size() == 2);
    CHECK(parts[1].size() == 1);
    CHECK(parts[0][0].size() == 4);  // closed implicitly
    CHECK(std::abs(signed_area(parts[0][0])) == 16);
    CHECK(std::abs(signed_area(parts[0][1])) == 1);
    CHECK(geo::read_polygons(path, "basins", "", "t").ids == std::vector<std::string>{"1", "2"});
  }
}

TEST_CASE("ids are texts or whole numbers, in the file's order, and heights are dropped") {
  const Folder folder;
  const std::string path =
      folder.write("b.geojson", collection(feature(polygon("[[0,0,5],[1,0,5],[1,1,5],[0,0,5]]"), R"("n":30,"c":"z")") +
                                           "," + feature(kSquare, R"("n":4,"c":" a ")")));
  CHECK(geo::looks_like_vector(path));
  const geo::PolygonLayer layer = geo::read_polygons(path, "", "n", "t");
  CHECK(layer.ids == std::vector<std::string>{"30", "4"});
  CHECK(layer.cells[0].parts[0][0] == mesh::PolygonCell::Ring{{0, 0}, {1, 0}, {1, 1}});
  CHECK(geo::read_polygons(path, "", "c", "t").ids == std::vector<std::string>{"z", "a"});
  CHECK_FALSE(geo::make_crs(layer.crs_wkt, "t").projected);  // RFC 7946 section 4: longitude and latitude on WGS 84
}

TEST_CASE("a ring over the date line and one about a pole are left as they are written") {
  const Folder folder;
  const std::string path = folder.write(
      "d.geojson",
      collection(feature(polygon("[[170,10],[-170,10],[-170,20],[172,20],[175,15],[170,10]],"
                                 "[[-178,12],[-178,14],[-176,13],[-178,12]]")) +
                 "," + feature(polygon("[[0,80],[90,80],[180,80],[-90,80],[0,80]]")) + "," +
                 // Two halves of one island, cut at the date line, meet there and are valid.
                 feature(R"({"type":"MultiPolygon","coordinates":[[[[179,0],[180,0],[180,1],[179,1],[179,0]]],)"
                         R"([[[-180,0],[-179,0],[-179,1],[-180,1],[-180,0]]]]})")));
  const geo::PolygonLayer layer = geo::read_polygons(path, "", "", "t");
  REQUIRE(layer.cells.size() == 3);
  CHECK(layer.cells[0].parts[0][0][1] == std::array<double, 2>{-170, 10});
  CHECK(layer.cells[0].parts[0][1][0] == std::array<double, 2>{-178, 12});
  CHECK(layer.cells[1].parts[0][0].size() == 4);
  CHECK(layer.cells[2].parts.size() == 2);
}

TEST_CASE("circular arcs become chords close to the circle") {
  const Folder folder;
  const std::string path = make(
      folder, "GPKG", "c.gpkg",
      {{"rounds", {"CURVEPOLYGON(CIRCULARSTRING(1000 0,0 1000,-1000 0,0 -1000,1000 0))"}, {"r"}, wkbCurvePolygon}});
  const geo::PolygonLayer layer = geo::read_polygons(path, "", "code", "t");
  const double area = std::abs(signed_area(layer.cells[0].parts[0][0])), circle = std::numbers::pi * 1e6;
  CHECK(area < circle);
  CHECK(area > circle * (1 - 4e-6));  // chords of angle s lose s^2 / 6 of the area
}

TEST_CASE("a layer or column that is not there is missing, with the near miss") {
  const Folder folder;
  LayerToMake second = kBasins;
  second.name = "lakes";
  const std::string path = make(folder, "GPKG", "two.gpkg", {kBasins, second});
  CHECK(refusal(path, Failure::data) == "'" + path + "' has 2 layers; expected one to be named: basins or lakes");
  CHECK(refusal(path, Failure::missing, "basin") == "'" + path + "' has no layer 'basin'; did you mean 'basins'?");
  CHECK(refusal(path, Failure::missing, "rivers") == "'" + path + "' has no layer 'rivers'; expected basins or lakes");
  CHECK(refusal(path, Failure::missing, "lakes", "cod") ==
        "'" + path + "': layer 'lakes' has no column 'cod'; did you mean 'code'?");
  CHECK(refusal(path, Failure::missing, "lakes", "name") ==
        "'" + path + "': layer 'lakes' has no column 'name'; expected code or area");
  CHECK(refusal(path, Failure::data, "lakes", "area") ==
        "'" + path +
            "': column 'area' of layer 'lakes' holds neither text nor whole numbers; expected a column that "
            "tells features apart");
  CHECK(geo::read_polygons(path, "lakes", "code", "t").layer == "lakes");
}

TEST_CASE("a path that is the place of a message is not said twice") {
  const Folder folder;
  const std::string path = folder.write("w.geojson", collection(feature("null")));
  CHECK_THROWS_WITH(geo::read_polygons(path, "", "", path),
                    (path + ": feature 1 of layer 'w' has no geometry; expected a polygon").c_str());
  CHECK_THROWS_WITH(geo::read_polygons(path, "v", "", path), (path + ": has no layer 'v'; did you mean 'w'?").c_str());
}

TEST_CASE("features that cannot be cells are refused by their number") {
  const Folder folder;
  const auto said = [&](const std::string& features, const std::string& id = "") {
    const std::string path = folder.write("w.geojson", collection(features));
    const std::string text = refusal(path, Failure::data, "", id);
    const std::string head = "'" + path + "': feature ";
    return text.starts_with(head) ? text.substr(head.size()) : text;
  };
  const std::string one = feature(kSquare, R"("c":"a")");
  CHECK(said(one + "," + feature(R"({"type":"LineString","coordinates":[[0,0],[1,1]]})")) ==
        "2 of layer 'w' is a line string; expected a polygon or multipolygon");
  CHECK(said(one + "," + feature("null")) == "2 of layer 'w' has no geometry; expected a polygon");
  CHECK(said(one + "," + feature(kSquare, R"("c":"a")"), "c") ==
        "2 of layer 'w' has the id 'a' of feature 1; expected ids of their own, or another column");
  CHECK(said(one + "," + feature(kSquare, R"("c":" ")"), "c") ==
        "2 of layer 'w' has no id; expected one in every feature, or another column");
  CHECK(said(one + "," + feature(kSquare, R"("c":null)"), "c") ==
        "2 of layer 'w' has no id; expected one in every feature, or another column");
  // A bow tie crosses itself at (1, 1); the words are those of GEOS.
  CHECK(said(one + "," + feature(polygon("[[0,0],[2,2],[2,0],[0,2],[0,0]]"))) ==
        "2 of layer 'w' is not valid (Self-intersection at or near point 1 1); mend the polygon");
  CHECK(said(feature(polygon("[[0,0],[2,0],[2,2],[0,2],[0,0]],[[5,5],[6,5],[6,6],[5,5]]")))
            .find("is not valid (Hole lies outside shell") != std::string::npos);
  // Over the date line the bow tie is one all the same.
  CHECK(said(feature(polygon("[[179,0],[-179,2],[-179,0],[179,2],[179,0]]")))
            .find("is not valid (Self-intersection at or near point 180 1)") != std::string::npos);
}

TEST_CASE("files that are no local vector file are refused, whatever else they may be") {
  const Folder folder;
  CHECK(refusal("/vsicurl/http://localhost/b.gpkg", Failure::missing) ==
        "there is no file '/vsicurl/http://localhost/b.gpkg'");
  CHECK(refusal(R"({"type":"Point","coordinates":[0,0]})", Failure::missing).starts_with("there is no file"));
  for (const auto& [name, bytes] : std::vector<std::pair<std::string, std::string>>{
           {"t.txt", "hello"},
           {"x.nc", "CDF\x01"},
           {"v.vrt", "<OGRVRTDataSource></OGRVRTDataSource>"},
           {"k.kml", "<kml xmlns=\"http://www.opengis.net/kml/2.2\"></kml>"},
           {"e.geojson", "{}"}}) {
    const auto& told = name;  // a lambda cannot capture a binding
    CAPTURE(told);
    const std::string path = folder.write(name, bytes);
    CHECK_FALSE(geo::looks_like_vector(path));
    CHECK(refusal(path, Failure::data)
              .starts_with("'" + path +
                           "' is no vector file that can be read; expected GeoPackage, Shapefile, GeoJSON "
                           "or FlatGeobuf"));
  }
  const std::string empty = folder.write("empty.geojson", collection(""));
  CHECK(refusal(empty, Failure::data).find("is empty") != std::string::npos);
}

TEST_CASE("a vector file damaged or cut at any byte is read or refused, never more") {
  const Folder folder;
  const auto attempt = [&](const std::string& name, const std::string& content) {
    const std::string p = folder.write(name, content);
    try {
      const geo::PolygonLayer layer = geo::read_polygons(p, "", "", "t");
      CHECK(layer.cells.size() == layer.ids.size());
    } catch (const Error& e) {
      CHECK((e.kind() == Failure::data || e.kind() == Failure::io));
      CHECK(std::string(e.what()).find('\n') == std::string::npos);
    }
  };
  const auto all_of = [](const std::string& path) {
    std::ifstream in(path, std::ios::binary);
    return std::string((std::istreambuf_iterator<char>(in)), {});
  };
  const std::string text = collection(feature(kSquare, R"("c":"a")"));
  const std::string bytes = all_of(make(folder, "FlatGeobuf", "whole.fgb", {kBasins}));
  const std::string shapes = all_of(make(folder, "ESRI Shapefile", "whole.shp", {kBasins}));
  std::filesystem::copy_file(folder.path / "whole.shx", folder.path / "cut.shx");
  for (const auto& [name, whole] : std::vector<std::pair<std::string, std::string>>{
           {"cut.geojson", text}, {"cut.fgb", bytes}, {"cut.shp", shapes}}) {
    const auto& told = name;  // a lambda cannot capture a binding
    CAPTURE(told);
    REQUIRE(whole.size() > 100);
    for (std::size_t i = 0; i < whole.size(); ++i) {
      std::string damaged = whole;
      damaged[i] = static_cast<char>(damaged[i] ^ 0x7F);
      attempt(name, damaged);
      attempt(name, whole.substr(0, i));
    }
  }
}
