// What is read from right job files: every key, every default, paths and overrides.
#include <doctest/doctest.h>

#include <cstdlib>
#include <filesystem>

#include "job_texts.h"
#include "windrow/job/spec.h"

using namespace windrow::job;
using windrow::calendar::Date;

TEST_CASE("the shortest whole job has every default") {
  const JobSpec job = parse_job("/proj/job.toml", job_texts::kShortest, {});
  CHECK(job.path == "/proj/job.toml");
  CHECK(job.text == job_texts::kShortest);
  CHECK(job.title.empty());
  CHECK(job.version == "1");
  CHECK(job.workspace == "/proj/work");
  CHECK_FALSE(job.memory_bytes.has_value());
  CHECK(job.threads == 0);
  CHECK(job.settle_s == 0);
  REQUIRE(job.runs.size() == 1);
  CHECK(job.runs[0].name == "run");
  CHECK(job.runs[0].family == "run");
  CHECK(job.runs[0].anchor);
  CHECK(job.runs[0].patterns == std::vector<std::string>{"/proj/tas_*.nc"});
  CHECK(job.runs[0].land_fraction.empty());
  REQUIRE(job.fields.size() == 1);
  const FieldSpec& field = job.fields[0];
  CHECK(field.variable == "tas");
  CHECK(field.name == "tas");
  CHECK(field.units.empty());
  CHECK_FALSE(field.total);
  CHECK(field.min_cover == 0.5);
  CHECK(field.min_land == 0);
  CHECK_FALSE(field.fill_nearest);
  CHECK_FALSE(field.range.has_value());
  CHECK(field.adjust.method == Adjustment::none);
  CHECK_FALSE(field.terrain.has_value());
  CHECK(job.mesh.name == "mesh");
  CHECK(job.mesh.kind == MeshKind::latlon);
  CHECK(job.mesh.x.edges().size() == 161);
  CHECK(job.mesh.y.edges().size() == 101);
  CHECK_FALSE(job.mesh.ellipsoid);
  CHECK_FALSE(job.stations.given);
  CHECK(job.output.directory == "/proj/out");
  CHECK(job.output.name == "{field}_{run}_{mesh}.nc");
  CHECK(job.output.deflate);
  CHECK(job.output.level == 1);
  CHECK(job.output.digits == 0);
  CHECK_FALSE(job.output.tile.has_value());
}

TEST_CASE("every key of [job], [[run]], [mesh] and [output] is read") {
  const JobSpec job = parse_job("/proj/job.toml", job_texts::kEveryKey, {});
  CHECK(job.title == "Daily climate of Kelder");
  CHECK(job.workspace == "/proj/scratch");
  CHECK(job.memory_bytes == 4LL << 30);
  CHECK(job.threads == 3);
  CHECK(job.settle_s == 600);
  CHECK(job.version == "2.1");
  REQUIRE(job.runs.size() == 2);
  CHECK(job.runs[0].anchor);
  CHECK_FALSE(job.runs[1].anchor);
  CHECK(job.runs[1].family == "heron");
  CHECK(job.runs[1].forcing == "natural only");
  CHECK(job.runs[0].patterns == std::vector<std::string>{"/proj/in/heron_all_*.nc", "/data/heron_extra.nc"});
  CHECK(job.runs[1].patterns == std::vector<std::string>{"/proj/in/heron_nat_*.nc"});
  CHECK(job.runs[0].land_fraction == "/proj/in/heron_sftlf.nc");
  CHECK(job.mesh.name == "kelder5");
  CHECK(job.mesh.kind == MeshKind::projected);
  CHECK(job.mesh.crs == "+proj=laea +lat_0=48 +lon_0=-28 +R=6371000");
  CHECK(job.mesh.x.from == -150000);
  CHECK(job.mesh.y.to == 200000);
  CHECK(job.mesh.height == "/proj/in/relief.tif");
  CHECK(job.mesh.mask == "/proj/in/land.gpkg");
  CHECK(job.runs[0].grid.crs == "EPSG:3035");
  CHECK(job.runs[0].grid.axis_units == "km");
  CHECK(job.runs[0].grid.coordinates == "/proj/in/heron_corners.nc");
  CHECK(job.runs[0].grid.sides == "parallels");
  CHECK_FALSE(job.runs[0].grid.pole.has_value());
  CHECK(job.runs[1].grid.crs.empty());
  CHECK(job.mesh.ellipsoid);
  CHECK(job.output.directory == "/proj/made");
  CHECK(job.output.level == 3);
  CHECK(job.output.digits == 4);
  CHECK(job.output.tile == std::array<int, 3>{365, 16, 32});
  CHECK(job.output.attributes == std::vector<std::pair<std::string, std::string>>{
                                     {"institution", "Kelder Weather Office (invented)"}, {"contact", "none"}});
}

TEST_CASE("every key of [[field]], [field.adjust] and [field.terrain] is read") {
  const JobSpec job = parse_job("/proj/job.toml", job_texts::kEveryKey, {});
  REQUIRE(job.fields.size() == 2);
  const FieldSpec& field = job.fields[0];
  CHECK(field.variable == "ts");
  CHECK(field.name == "tas");
  CHECK(field.units == "degC");
  CHECK(field.min_cover == 0.25);
  CHECK(field.min_land == 0.125);
  CHECK(field.fill_nearest);
  CHECK(field.range == std::pair{-90.0, 60.5});
  const AdjustSpec& adjust = field.adjust;
  CHECK(adjust.method == Adjustment::quantile_mapping);
  CHECK(adjust.form == Form::additive);
  CHECK(adjust.observed == std::vector<std::string>{"tmin", "tmax"});
  CHECK(adjust.period == std::pair{Date{1981, 1, 1}, Date{2010, 12, 31}});
  CHECK(adjust.season == SeasonKind::moving);
  CHECK(adjust.season_given);
  CHECK(adjust.window_days == 21);
  CHECK(adjust.day_step == 7);
  CHECK(adjust.quantiles == 50);
  CHECK(adjust.max_ratio == 8);
  CHECK(adjust.carry == Carry::correction);
  CHECK(adjust.accept_period_mismatch);
  REQUIRE(field.terrain.has_value());
  for (const double lapse : field.terrain->lapse_per_m) CHECK(lapse == doctest::Approx(-0.0065).epsilon(1e-14));
  CHECK(field.terrain->model_height == "/proj/in/heron_orog.nc");
  CHECK(job.fields[1].adjust.method == Adjustment::mean_ratio);
  CHECK(job.fields[1].adjust.form == Form::multiplicative);
  CHECK(job.fields[1].adjust.observed == std::vector<std::string>{"pr"});
  CHECK(job.fields[1].adjust.season == SeasonKind::month);
}

TEST_CASE("a station's dates move to the day that holds most of its hours, the nearer one on a tie") {
  const auto shift = [](const std::string& day) {
    const std::string text =
        "[[run]]\nfiles = [\"a.nc\"]\n[[field]]\nvariable = \"tas\"\n[mesh]\n"
        "lon = { from = 0, to = 1, step = 1 }\nlat = { from = 0, to = 1, step = 1 }\n"
        "[stations]\nsites = \"s.csv\"\ndaily = \"d.csv\"\nday = { " +
        day + " }\n";
    return parse_job("/proj/job.toml", text, {}).stations.day_shift;
  };
  CHECK(shift("") == 0);
  CHECK(shift("label = \"start\"") == 0);
  CHECK(shift("ends = \"09:00\"") == -1);  // 15 hours of the day before
  CHECK(shift("ends = \"09:00\", label = \"start\"") == 0);
  CHECK(shift("ends = \"18:00\"") == 0);
  CHECK(shift("ends = \"18:00\", label = \"start\"") == 1);  // from 18:00: 6 hours of the day itself
  CHECK(shift("ends = \"00:00\"") == -1);
  CHECK(shift("ends = \"00:00\", label = \"start\"") == 0);
  CHECK(shift("ends = \"12:00\"") == 0);  // a tie
  CHECK(shift("ends = \"12:00\", label = \"start\"") == 0);
  CHECK(shift("ends = \"12:30\", zone = \"UTC+1\"") == -1);  // ends at 11:30 UTC
  CHECK(shift("ends = \"11:30\", zone = \"UTC-1\"") == 0);
  CHECK(shift("ends = \"09:00\", zone = \"UTC-3:30\"") == 0);  // ends at 12:30 UTC
  CHECK(shift("ends = \"24:00\", zone = \"UTC+13\"") == -1);
}

TEST_CASE("NetCDF series hold their own sites; a factor column is read") {
  const auto stations = [](const std::string& keys) {
    return parse_job("/proj/job.toml",
                     "[[run]]\nfiles = [\"a.nc\"]\n[[field]]\nvariable = \"tas\"\n[mesh]\n"
                     "lon = { from = 0, to = 1, step = 1 }\nlat = { from = 0, to = 1, step = 1 }\n[stations]\n" +
                         keys,
                     {})
        .stations;
  };
  CHECK(stations("daily = [\"a.nc\", \"b.nc\"]\n").sites.empty());
  CHECK(stations("monthly = \"a.nc\"\n").undercatch.empty());
  CHECK(stations("sites = \"s.csv\"\ndaily = \"d.nc\"\nundercatch = \"catch\"\n").undercatch == "catch");
  CHECK_THROWS_AS(stations("daily = [\"a.nc\", \"b.csv\"]\n"), windrow::Error);
}

TEST_CASE("every key of [stations] and [reach] is read") {
  const JobSpec job = parse_job("/proj/job.toml", job_texts::kEveryKey, {});
  const StationSpec& stations = job.stations;
  CHECK(stations.given);
  CHECK(stations.sites == "/proj/in/sites.csv");
  CHECK(stations.daily == std::vector<std::string>{"/proj/in/daily.csv"});
  CHECK(stations.monthly.empty());
  CHECK(stations.normals == std::vector<std::string>{"/proj/in/normals_a.csv", "/proj/in/normals_b.csv"});
  CHECK(stations.columns ==
        std::map<std::string, std::string>{{"station", "id"}, {"longitude", "lon"}, {"elevation", "elev_m"}});
  CHECK(stations.units == std::map<std::string, std::string>{{"tmin_degC", "degC"}, {"precip_mm", "mm/month"}});
  CHECK(stations.normals_period == std::pair{1981, 2010});
  CHECK(stations.min_years == 12);
  CHECK(stations.day_note == "A station day ends at 09:00 UTC+1 and carries the date of its start");
  CHECK(stations.day_shift == 0);
  CHECK(stations.undercatch.empty());
  CHECK(job.reach.method == ReachMethod::nearest);
  CHECK(job.reach.radius_m == doctest::Approx(250e3).epsilon(1e-14));
  CHECK(job.reach.power == 3);
  CHECK(job.reach.beyond == Beyond::missing);
  CHECK(job.reach.neighbours == 16);
}

TEST_CASE("an adjustment's defaults: quantile delta mapping in additive form") {
  const std::string stations = "[stations]\nsites = \"s.csv\"\ndaily = \"d.csv\"\n";
  const auto adjust = [&](const std::string& keys) {
    const std::string text = job_texts::kShortest + stations + "[[run]]\nfiles = [\"b.nc\"]\nname = \"b\"\n";
    std::string with = text;
    with.insert(with.find("[mesh]"), "[field.adjust]\n" + keys);
    with.insert(with.find("files"), "name = \"a\"\n");
    return parse_job("job.toml", with, {}).fields[0].adjust;
  };
  const AdjustSpec plain = adjust("");
  CHECK(plain.method == Adjustment::quantile_delta_mapping);
  CHECK(plain.form == Form::additive);
  CHECK(plain.observed == std::vector<std::string>{"tas"});
  CHECK_FALSE(plain.season_given);
  CHECK(plain.season == SeasonKind::moving);
  CHECK(plain.window_days == 31);
  CHECK(plain.day_step == 5);
  CHECK_FALSE(plain.period.has_value());
  CHECK(adjust("form = \"multiplicative\"\n").method == Adjustment::quantile_delta_mapping);
  CHECK(adjust("method = \"gamma-mapping\"\n").form == Form::multiplicative);
  CHECK(adjust("method = \"variance-scaling\"\n").form == Form::additive);
  CHECK(plain.window_years == 30);
  CHECK(plain.window_step == 10);
  CHECK_FALSE(plain.wet_day.has_value());
  CHECK(adjust("form = \"multiplicative\"\nwet_day = \"0.2 mm/day\"\n").wet_day == std::pair{0.2, std::string("mm/day")});
  CHECK(adjust("window = \"20 years\"\nwindow_step = \"5 years\"\n").window_years == 20);
  CHECK(adjust("method = \"mean-ratio\"\n").form == Form::multiplicative);
  CHECK(adjust("season = \"year\"\n").season == SeasonKind::year);
  CHECK(adjust("season = \"3 days\"\n").day_step == 3);
}

TEST_CASE("a lapse is the same in every spelling") {
  const auto lapse = [](const std::string& written, const std::string& units) {
    std::string text = job_texts::kShortest + "height = \"relief.tif\"\n";
    text.insert(text.find("[mesh]"), units + "[field.terrain]\nmodel_height = \"orog.nc\"\nlapse = " + written + "\n");
    return parse_job("job.toml", text, {}).fields[0].terrain->lapse_per_m;
  };
  const std::string celsius = "units = \"degC\"\n", fahrenheit = "units = \"degF\"\n";
  const std::string twelve = "[-6.5, -6.5, -6.5, -6.5, -6.5, -6.5, -6.5, -6.5, -6.5, -6.5, -6.5, -6.5]";
  for (const std::string& units : {std::string(), celsius}) {
    for (const char* written : {"\"-6.5 K/km\"", "\"-0.0065 K/m\"", "\"-6.5 degC/km\"", "\"-0.65 K/hm\""}) {
      CAPTURE(written);
      CHECK(lapse(written, units)[5] == doctest::Approx(-0.0065).epsilon(1e-13));
    }
    CHECK(lapse(twelve, units)[11] == doctest::Approx(-0.0065).epsilon(1e-13));
  }
  CHECK(lapse("\"-6.5 K/km\"", fahrenheit)[0] == doctest::Approx(-0.0117).epsilon(1e-13));
}

TEST_CASE("~ and ${NAME} are expanded in paths and nowhere else") {
  ::setenv("HOME", "/home/kelder", 1);
  ::setenv("WINDROW_TEST_DATA", "/data/heron", 1);
  std::string text = job_texts::kShortest;
  text.replace(text.find("tas_*.nc"), 8, "${WINDROW_TEST_DATA}/tas_*.nc");
  text.insert(0, "[job]\ntitle = \"~ ${WINDROW_TEST_DATA}\"\nworkspace = \"~/scratch/\"\n");
  const JobSpec job = parse_job("/proj/job.toml", text, {});
  CHECK(job.runs[0].patterns[0] == "/data/heron/tas_*.nc");
  CHECK(job.workspace == "/home/kelder/scratch");
  CHECK(job.title == "~ ${WINDROW_TEST_DATA}");
}

TEST_CASE("paths are relative to the job file's folder, not to the present one") {
  const JobSpec job = parse_job("sub/job.toml", job_texts::kShortest, {"output.directory=../made"});
  const std::string here = std::filesystem::current_path().string();
  CHECK(job.path == here + "/sub/job.toml");
  CHECK(job.output.directory == here + "/made");
  CHECK(job.workspace == here + "/sub/work");
}

TEST_CASE("an override is a TOML value where it is one, and plain text otherwise") {
  const JobSpec job =
      parse_job("/proj/job.toml", job_texts::kShortest,
                {"field.0.units=degC", "field.0.range=[-1, 2]", "job.version=2", "output.digits=3", "mesh.lon.step=0.5",
                 "run.0.files=[\"a.nc\", \"b.nc\"]", "job.title=a=b", "field.0.name=\"t\"", "output.compression=none"});
  CHECK(job.fields[0].units == "degC");
  CHECK(job.fields[0].range == std::pair{-1.0, 2.0});
  CHECK(job.version == "2");
  CHECK(job.output.digits == 3);
  CHECK(job.mesh.x.edges().size() == 81);
  CHECK(job.runs[0].patterns.size() == 2);
  CHECK(job.title == "a=b");
  CHECK(job.fields[0].name == "t");
  CHECK_FALSE(job.output.deflate);
  CHECK(job.output.level == 0);
}

TEST_CASE("edges begin and end exactly at the given ends and are symmetric where the axis is") {
  const AxisSpec around{-180, 180, 0.1};
  const std::vector<double> edges = around.edges();
  REQUIRE(edges.size() == 3601);
  CHECK(edges.front() == -180);
  CHECK(edges.back() == 180);
  CHECK(edges[1800] == 0);
  for (std::size_t i = 0; i < edges.size(); ++i) CHECK(edges[i] == -edges[edges.size() - 1 - i]);
  // A step typed to 12 digits still means 1/120 degree.
  std::string text = job_texts::kShortest;
  text.replace(text.find("step = 0.25"), 11, "step = 0.00833333333333");
  CHECK(parse_job("job.toml", text, {}).mesh.x.edges().size() == 4801);
}

TEST_CASE("every kind of mesh is read with its own keys") {
  const auto mesh = [](const std::string& keys) {
    return parse_job("/proj/job.toml", job_texts::job_on(keys), {}).mesh;
  };
  const MeshSpec raster = mesh("kind = \"raster\"\ntemplate = \"grid.tif\"\nheight = \"relief.tif\"\n");
  CHECK(raster.kind == MeshKind::raster);
  CHECK(raster.source == "/proj/grid.tif");
  CHECK(raster.height == "/proj/relief.tif");
  CHECK(raster.place == "/proj/job.toml:7:12");
  CHECK(raster.excerpt == "template = \"grid.tif\"\n           ^");
  const MeshSpec file = mesh("kind = \"file\"\nfrom = \"other.nc\"\nvariable = \"v\"\nmask = \"land.gpkg\"\n");
  CHECK(file.kind == MeshKind::file);
  CHECK(file.source == "/proj/other.nc");
  CHECK(file.variable == "v");
  CHECK(file.mask == "/proj/land.gpkg");
  const MeshSpec catchments =
      mesh("kind = \"catchments\"\npolygons = \"b.gpkg\"\nlayer = \"basins\"\nid = \"code\"\nearth = \"ellipsoid\"\n");
  CHECK(catchments.kind == MeshKind::catchments);
  CHECK(catchments.source == "/proj/b.gpkg");
  CHECK(catchments.layer == "basins");
  CHECK(catchments.id == "code");
  CHECK(catchments.ellipsoid);
  CHECK(mesh("kind = \"catchments\"\npolygons = \"b.gpkg\"\n").id.empty());
  const MeshSpec towns = mesh("kind = \"towns\"\nsites = \"towns.csv\"\n");
  CHECK(towns.kind == MeshKind::towns);
  CHECK(towns.source == "/proj/towns.csv");
  const MeshSpec faces = mesh("kind = \"faces\"\nfrom = \"ugrid.nc\"\ntopology = \"Mesh2\"\n");
  CHECK(faces.kind == MeshKind::faces);
  CHECK(faces.source == "/proj/ugrid.nc");
  CHECK(faces.topology == "Mesh2");
}

TEST_CASE("every regridding method is read, and totals go with those that conserve") {
  const auto field = [](const std::string& keys) {
    return parse_job(
               "job.toml",
               job_texts::job_on("lon = { from = 0, to = 1, step = 1 }\nlat = { from = 0, to = 1, step = 1 }\n", keys),
               {})
        .fields[0];
  };
  const std::vector<std::pair<std::string, Method>> methods{{"conservative-1", Method::conservative_1},
                                                            {"conservative-2", Method::conservative_2},
                                                            {"conservative-smooth", Method::conservative_smooth},
                                                            {"bilinear", Method::bilinear},
                                                            {"nearest", Method::nearest},
                                                            {"majority", Method::majority}};
  for (const auto& [word, method] : methods) {
    const auto& told = word;  // a lambda cannot capture a binding
    CAPTURE(told);
    CHECK(field("method = \"" + word + "\"\n").method == method);
    if (word.starts_with("conservative")) CHECK(field("quantity = \"total\"\nmethod = \"" + word + "\"\n").total);
  }
}

TEST_CASE("a vector pair is read with the axes of its product") {
  const auto fields = [](const std::string& keys) {
    std::string text = job_texts::kShortest;
    text.replace(text.find("variable = \"tas\"\n"), 17,
                 "variable = \"uas\"\npair = \"eastward\"\n" + keys +
                     "[[field]]\nvariable = \"vas\"\npair = \"northward\"\n" + keys);
    return parse_job("job.toml", text, {}).fields;
  };
  CHECK(fields("")[0].pair == Pair::eastward);
  CHECK(fields("")[1].pair == Pair::northward);
  CHECK(fields("")[0].axes == VectorAxes::east_north);
  CHECK(fields("axes = \"east-north\"\nmethod = \"bilinear\"\n")[1].method == Method::bilinear);
  CHECK(fields("axes = \"mesh\"\n")[1].axes == VectorAxes::mesh);
}

TEST_CASE("what a run's files do not say about their grid is read from the job") {
  const auto grid = [](const std::string& value) {
    return parse_job("/proj/job.toml", job_texts::kShortest, {"run.0.grid=" + value}).runs[0].grid;
  };
  CHECK(grid("{ pole = [-162, 39.25] }").pole == std::array<double, 2>{-162, 39.25});
  CHECK(grid("{ pole = [198, 39.25], sides = \"great-circles\" }").sides == "great-circles");
  CHECK(grid("{ crs = \"EPSG:3035\" }").crs == "EPSG:3035");
  for (const char* units : {"m", "km", "US_survey_foot", "radian", "degree"}) {
    CAPTURE(units);
    CHECK(grid(std::string("{ units = \"") + units + "\" }").axis_units == units);
  }
  CHECK(grid("{ coordinates = \"corners.nc\" }").coordinates == "/proj/corners.nc");
}

TEST_CASE("towns take the value of the cell that holds them, bilinear or nearest, and their own heights") {
  const std::string towns = "kind = \"towns\"\nsites = \"towns.csv\"\n";
  for (const char* method : {"conservative-1", "bilinear", "nearest"})
    CHECK_NOTHROW(parse_job("job.toml", job_texts::job_on(towns, std::string("method = \"") + method + "\"\n"), {}));
  const JobSpec job = parse_job(
      "job.toml", job_texts::job_on(towns, "[field.terrain]\nlapse = \"-6.5 K/km\"\nmodel_height = \"orog.nc\"\n"), {});
  CHECK(job.fields[0].method == Method::conservative_1);
  CHECK(job.fields[0].terrain.has_value());
}

TEST_CASE("a tile has three numbers on a grid, two where cells stand in no rows, either on another file's grid") {
  const auto output = [](const std::string& mesh, const std::string& keys) {
    return parse_job("job.toml", job_texts::job_on(mesh, "", keys), {}).output;
  };
  const std::string catchments = "kind = \"catchments\"\npolygons = \"b.gpkg\"\n",
                    file = "kind = \"file\"\nfrom = \"o.nc\"\n";
  CHECK(output(catchments, "tile = [365, 512]\n").tile == std::array<int, 3>{365, 1, 512});
  CHECK(output(file, "tile = [365, 512]\n").tile == std::array<int, 3>{365, 1, 512});
  CHECK(output(file, "tile = [365, 16, 32]\n").tile == std::array<int, 3>{365, 16, 32});
  CHECK_FALSE(output(catchments, "tile = \"auto\"\n").tile.has_value());
  CHECK(output(catchments, "also = [\"csv\"]\n").csv);
  CHECK(output("kind = \"towns\"\nsites = \"t.csv\"\n", "also = \"csv\"\n").csv);
  CHECK_FALSE(output(catchments, "").csv);
}
