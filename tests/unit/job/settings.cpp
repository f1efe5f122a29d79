// The list of settings, what they change, and the job file to start from.
#include <doctest/doctest.h>

#include <algorithm>
#include <sstream>

#include "job/sections.h"
#include "job_texts.h"
#include "windrow/job/spec.h"

using namespace windrow::job;

namespace {

using List = std::vector<std::pair<std::string, std::string>>;

std::string value(const List& list, const std::string& key) {
  for (const auto& [name, text] : list)
    if (name == key) return text;
  return "absent";
}

JobSpec every_key(const std::vector<std::string>& overrides = {}) {
  return parse_job("/proj/job.toml", job_texts::kEveryKey, overrides);
}

// The template with its left-out settings put in.
std::string filled_template(const std::string& kind) {
  std::istringstream in(template_text(kind));
  std::string line, out;
  while (std::getline(in, line)) {
    const bool left_out = line.size() > 1 && line[0] == '#' && line[1] != ' ';
    out += (left_out ? line.substr(1) : line) + "\n";
  }
  return out;
}

}  // namespace

TEST_CASE("settings tell defaults as well, in job-file order") {
  const List list = settings(parse_job("/proj/job.toml", job_texts::kShortest, {}), false);
  CHECK(list.front() == std::pair<std::string, std::string>{"job.title", "none"});
  CHECK(value(list, "run.0.files") == "tas_*.nc");
  CHECK(value(list, "field.0.units") == "source");
  CHECK(value(list, "field.0.min_cover") == "0.5");
  CHECK(value(list, "field.0.adjust.method") == "none");
  CHECK(value(list, "mesh.lon") == "-10 to 30 by 0.25");
  CHECK(value(list, "output.directory") == "out");
  CHECK(value(list, "output.level") == "1");
  CHECK(value(list, "reach.method") == "absent");
  const auto section = [](const std::string& key) { return key.substr(0, key.find('.')); };
  std::vector<std::string> order;
  for (const auto& [key, text] : list)
    if (order.empty() || order.back() != section(key)) order.push_back(section(key));
  CHECK(order == std::vector<std::string>{"job", "run", "field", "mesh", "output"});
}

TEST_CASE("a setting that changes nothing of a product does not change its result settings") {
  const List before = settings(every_key(), true);
  for (const char* override :
       {"job.threads=7", "job.memory=1 GiB", "job.settle=1 h", "job.workspace=other", "output.directory=other",
        "output.level=9", "output.tile=auto", "output.compression=none", "output.name={field}_{run}.nc"}) {
    CAPTURE(override);
    std::vector<std::string> overrides{override};
    if (std::string(override) == "output.compression=none") overrides.emplace_back("output.level=0");
    CHECK(settings(every_key(overrides), true) == before);
    CHECK(settings(every_key(overrides), false) != settings(every_key(), false));
  }
}

TEST_CASE("every setting that changes a product's values or attributes changes its result settings") {
  const List before = settings(every_key(), true);
  for (const char* override : {"job.title=other",
                               "job.version=3",
                               "run.0.name=other",
                               "run.0.forcing=other",
                               "run.0.files=other.nc",
                               "run.0.land_fraction=other.nc",
                               "run.0.grid.crs=EPSG:3034",
                               "run.0.grid.units=m",
                               "run.0.grid.coordinates=other.nc",
                               "run.0.grid.sides=great-circles",
                               "run.0.grid={ pole = [-162, 39.25] }",
                               "field.0.method=conservative-2",
                               "field.0.method=bilinear",
                               "field.0.variable=tos",
                               "field.0.name=tos",
                               "field.0.units=K",
                               "field.0.quantity=total",
                               "field.0.min_cover=0.75",
                               "field.0.min_land=0.5",
                               "field.0.fill=none",
                               "field.0.range=[-80, 60]",
                               "field.0.adjust.method=mean-shift",
                               "field.0.adjust.observed=tmin",
                               "field.0.adjust.period=[\"1981-01-02\", \"2010-12-31\"]",
                               "field.0.adjust.season=month",
                               "field.0.adjust.season=year",
                               "field.0.adjust.day_step=3",
                               "field.0.adjust.quantiles=60",
                               "field.1.adjust.max_ratio=5",
                               "field.0.adjust.carry=target",
                               "field.0.adjust.period_mismatch=refuse",
                               "field.0.terrain.lapse=-6 K/km",
                               "field.0.terrain.model_height=other.nc",
                               "mesh.name=other",
                               "mesh.crs=EPSG:3035",
                               "mesh.x.step=10000",
                               "mesh.y.from=-190000",
                               "mesh.height=other.tif",
                               "mesh.mask=other.gpkg",
                               "mesh.earth=sphere",
                               "stations.sites=other.csv",
                               "stations.daily=other.csv",
                               "stations.normals=other.csv",
                               "stations.columns.station=other",
                               "stations.units.tmin_degC=K",
                               "stations.normals_period=[1980, 2010]",
                               "stations.min_years=5",
                               "stations.day.ends=06:00",
                               "reach.method=inverse-distance",
                               "reach.radius=200 km",
                               "reach.beyond=raw",
                               "output.digits=5",
                               "output.attributes.contact=other"}) {
    CAPTURE(override);
    std::vector<std::string> overrides{override};
    if (std::string(override) == "field.0.quantity=total") overrides.emplace_back("field.0.adjust.method=none");
    CHECK(settings(every_key(overrides), true) != before);
  }
}

TEST_CASE("every key of a kind of mesh is among its settings, defaults included") {
  const auto list = [](const std::string& mesh, const std::string& field = "", const std::string& output = "") {
    return settings(parse_job("/proj/job.toml", job_texts::job_on(mesh, field, output), {}), true);
  };
  const std::string raster = "kind = \"raster\"\ntemplate = \"grid.tif\"\n";
  CHECK(value(list(raster), "mesh.kind") == "raster");
  CHECK(value(list(raster), "mesh.template") == "grid.tif");
  CHECK(value(list(raster), "mesh.mask") == "none");
  const std::string file = "kind = \"file\"\nfrom = \"other.nc\"\n";
  CHECK(value(list(file), "mesh.from") == "other.nc");
  CHECK(value(list(file), "mesh.variable") == "the only one");
  CHECK(value(list(file + "variable = \"v\"\n"), "mesh.variable") == "v");
  const std::string catchments = "kind = \"catchments\"\npolygons = \"b.gpkg\"\n";
  CHECK(value(list(catchments), "mesh.polygons") == "b.gpkg");
  CHECK(value(list(catchments), "mesh.layer") == "the only one");
  CHECK(value(list(catchments), "mesh.id") == "numbers from 1");
  CHECK(value(list(catchments + "layer = \"l\"\nid = \"code\"\n"), "mesh.id") == "code");
  CHECK(value(list(catchments, "", "tile = [365, 512]\n"), "output.tile") == "absent");
  const std::string faces = "kind = \"faces\"\nfrom = \"ugrid.nc\"\ntopology = \"Mesh2\"\n";
  CHECK(value(list(faces), "mesh.kind") == "faces");
  CHECK(value(list(faces), "mesh.topology") == "Mesh2");
  const std::string towns = "kind = \"towns\"\nsites = \"towns.csv\"\n";
  CHECK(value(list(towns), "mesh.sites") == "towns.csv");
  CHECK(value(list(towns), "mesh.mask") == "absent");
  CHECK(value(list(towns), "field.0.method") == "conservative-1 (the value of the cell that holds the town)");
  CHECK(value(list(towns, "method = \"nearest\"\n"), "field.0.method") == "nearest");
  CHECK(value(list(faces), "field.0.method") == "conservative-1");
  CHECK(value(list(faces), "field.0.pair") == "none");
  CHECK(value(list(faces), "run.0.grid") == "as the files say");
}

TEST_CASE("a table beside the product and a tile of cells change how a product is kept, not its values") {
  const std::string catchments = "kind = \"catchments\"\npolygons = \"b.gpkg\"\n";
  const JobSpec plain = parse_job("/proj/job.toml", job_texts::job_on(catchments), {});
  const JobSpec other =
      parse_job("/proj/job.toml", job_texts::job_on(catchments, "", "also = \"csv\"\ntile = [9, 7]\n"), {});
  CHECK(product_settings(plain, 0, 0, Effect::result) == product_settings(other, 0, 0, Effect::result));
  CHECK(value(product_settings(other, 0, 0, Effect::encoding), "output.also") == "csv");
  CHECK(value(product_settings(other, 0, 0, Effect::encoding), "output.tile") == "9, 7");
  CHECK(value(product_settings(plain, 0, 0, Effect::encoding), "output.also") == "none");
}

TEST_CASE("the settings of a vector's component name its partner, which it is turned together with") {
  const auto job = [](const std::string& partner) {
    std::string text = job_texts::kShortest;
    text.replace(
        text.find("variable = \"tas\""), 16,
        "variable = \"uas\"\npair = \"eastward\"\n[[field]]\nname = \"vas\"\npair = \"northward\"\nvariable = \"" +
            partner + "\"");
    return parse_job("/proj/job.toml", text, {});
  };
  const List east = product_settings(job("vas"), 0, 0, Effect::result);
  CHECK(value(east, "field.pair") == "eastward");
  CHECK(value(east, "field.axes") == "east-north");
  CHECK(value(east, "partner.variable") == "vas");
  CHECK(value(product_settings(job("vas"), 1, 0, Effect::result), "partner.variable") == "uas");
  CHECK(product_settings(job("va"), 0, 0, Effect::result) != east);
}

TEST_CASE("the settings of one product do not change when another run or field is added") {
  const JobSpec job = every_key();
  const std::string more =
      job_texts::kEveryKey + "[[run]]\nname = \"plover\"\nfiles = [\"p.nc\"]\n" + "[[field]]\nvariable = \"uas\"\n";
  const JobSpec larger = parse_job("/proj/job.toml", more, {});
  for (std::size_t field = 0; field < 2; ++field)
    for (std::size_t run = 0; run < 2; ++run)
      CHECK(product_settings(job, field, run, Effect::result) == product_settings(larger, field, run, Effect::result));
}

TEST_CASE("the settings of one product hold its anchor run, and stations only where it is adjusted") {
  const JobSpec job = every_key({"field.1.adjust.method=none"});
  const List adjusted = product_settings(job, 0, 1, Effect::result),
             plain = product_settings(job, 1, 1, Effect::result);
  CHECK(value(adjusted, "anchor.name") == "heron-all");
  CHECK(value(adjusted, "stations.sites") == "in/sites.csv");
  CHECK(value(product_settings(job, 0, 0, Effect::result), "anchor.name") == "absent");
  CHECK(value(plain, "anchor.name") == "absent");
  CHECK(value(plain, "stations.sites") == "absent");
  CHECK(value(plain, "output.level") == "absent");
  CHECK(value(product_settings(job, 1, 1, Effect::encoding), "output.level") == "3");
  CHECK(value(product_settings(job, 1, 1, Effect::encoding), "job.threads") == "absent");
}

TEST_CASE("moving the whole folder of a job changes no setting") {
  const JobSpec moved = parse_job("/elsewhere/job.toml", job_texts::kEveryKey, {});
  CHECK(settings(moved, false) == settings(every_key(), false));
}

TEST_CASE("the job files to start from are right ones, and stay right with all their settings put in") {
  const std::vector<std::pair<std::string, MeshKind>> kinds{
      {"grid", MeshKind::latlon}, {"catchments", MeshKind::catchments}, {"towns", MeshKind::towns}};
  for (const auto& [kind, mesh] : kinds) {
    const auto& told = kind;  // a lambda cannot capture a binding
    CAPTURE(told);
    const JobSpec job = parse_job("/proj/job.toml", template_text(kind), {});
    CHECK(job.fields[0].variable == "tas");
    CHECK(job.mesh.kind == mesh);
    const JobSpec filled = parse_job("/proj/job.toml", filled_template(kind), {});
    CHECK(filled.stations.given);
    CHECK(filled.fields[0].terrain.has_value());
    CHECK(filled.runs[0].grid.crs == "EPSG:3035");
    CHECK(filled.output.csv == (kind != "grid"));
  }
}

TEST_CASE("the job file to start from shows a setting's default") {
  // Put in one by one, the settings that have a default change nothing.
  const std::string text = template_text("grid");
  const List before = settings(parse_job("/proj/job.toml", text, {}), true);
  int shown = 0;
  for (const char* line : {"#workspace",
                           "#threads",
                           "#settle",
                           "#version",
                           "#family",
                           "#anchor",
                           "#name     = \"run\"",
                           "#name     = \"tas\"",
                           "#method   = \"conservative-1\"",
                           "#quantity",
                           "#min_cover",
                           "#fill",
                           "#min_land",
                           "#name     = \"mesh\"",
                           "#kind",
                           "#earth",
                           "#directory",
                           "#name      = \"{field}",
                           "#calendar",
                           "#compression",
                           "#level",
                           "#digits",
                           "#tile"}) {
    CAPTURE(line);
    std::string with = text;
    const std::size_t at = with.find(std::string("\n") + line);
    REQUIRE(at != std::string::npos);
    with.erase(at + 1, 1);
    CHECK(settings(parse_job("/proj/job.toml", with, {}), false) ==
          settings(parse_job("/proj/job.toml", text, {}), false));
    ++shown;
  }
  CHECK(shown == 23);
}

TEST_CASE("the job files to start from name every key of this version") {
  const std::string text = template_text("grid") + template_text("catchments") + template_text("towns");
  for (const Keys* keys : {&kJobKeys, &kRunKeys, &kGridKeys, &kFieldKeys, &kMeshKeys, &kStationKeys, &kReachKeys,
                           &kEnsembleKeys, &kWarmingKeys, &kOutputKeys})
    for (const std::string& key : keys->known) {
      CAPTURE(key);
      CHECK((text.find(key + " ") != std::string::npos || text.find("." + key + "]") != std::string::npos));
    }
}

TEST_CASE("a kind of job that cannot be started from is refused") {
  CHECK_THROWS_WITH(template_text("town"), "new: unknown kind of job 'town'; did you mean 'towns'?");
  CHECK_THROWS_WITH(template_text("faces"), "new: unknown kind of job 'faces'; expected grid, catchments or towns");
}
