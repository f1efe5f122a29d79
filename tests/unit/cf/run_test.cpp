// Laws of runs: several files are one time axis, whatever their order, packing or direction; windows equal the whole.
#include <doctest/doctest.h>

#include <cstring>
#include <thread>

#include "sample_run.h"

using namespace windrow;
using namespace windrow::cftest;

namespace {

/// Days [first, first + count) of the sample run in a file of their own.
Sample days(const std::string& name, double first, std::size_t count) {
  Sample sample;
  sample.name = name;
  sample.time = steps(first, 1, count);
  return sample;
}

std::string refusal(const std::vector<std::string>& paths) {
  return error_text(Failure::data, [&] {
    Notices notices;
    cf::open_run(paths, "v", notices);
  });
}

std::string spans(const cf::RunVariable& run) {
  std::string text;
  for (const cf::FileSpan& span : run.files())
    text += span.path.substr(span.path.rfind('/') + 1) + " " + std::to_string(span.first) + "+" +
            std::to_string(span.count) + " ";
  return text;
}

}  // namespace

TEST_CASE("files given in any order are one axis") {
  const std::string a = days("a.nc", 0, 4).write(), b = days("b.nc", 4, 3).write(), c = days("c.nc", 7, 5).write();
  Notices notices;
  const auto run = cf::open_run({c, a, b}, "v", notices);
  CHECK(spans(*run) == "a.nc 0+4 b.nc 4+3 c.nc 7+5 ");
  check_places(*run, steps(0, 1, 12));
  CHECK(run->frequency() == cf::Frequency::daily);
  CHECK(texts(notices) ==
        std::vector<std::string>{"time has no bounds; each value is taken for the day that contains its "
                                 "time"});
}

TEST_CASE("steps in two files are taken from the one that starts later, and reported") {
  Sample late = days("b.nc", 3, 4);
  late.more = [](FileBuilder& f) { f.att("scale_factor", NC_FLOAT, {2}); };  // tells the two apart
  const std::string a = days("a.nc", 0, 5).write(), b = late.write();
  Notices notices;
  const auto run = cf::open_run({a, b}, "v", notices);
  CHECK(spans(*run) == "a.nc 0+3 b.nc 3+4 ");
  std::vector<double> values(7);
  run->read(0, 7, {0}, values.data());
  for (std::size_t t = 0; t < 7; ++t) CHECK(values[t] == (t < 3 ? 1 : 2) * value_at(double(t), -25, 5));
  CHECK(has(notices, "2 time steps are also in " + b + "; taken from there"));
}

TEST_CASE("a file inside another takes its place there") {
  const std::string a = days("a.nc", 0, 8).write(), b = days("b.nc", 3, 2).write();
  Notices notices;
  const auto run = cf::open_run({a, b}, "v", notices);
  CHECK(spans(*run) == "a.nc 0+3 b.nc 3+2 a.nc 5+3 ");
  check_places(*run, steps(0, 1, 8));
}

TEST_CASE("files that overlap with other time stamps are refused, since days would count twice") {
  Sample noon = days("a.nc", 0, 5), midnight = days("b.nc", 3, 4);
  midnight.day_offset = 0;
  const std::string text = refusal({noon.write(), midnight.write()});
  CHECK(text == "b.nc: overlaps in time with a.nc, but their time stamps differ there");
}

TEST_CASE("a gap between files is reported and no error") {
  Notices notices;
  const auto run = cf::open_run({days("a.nc", 0, 3).write(), days("b.nc", 10, 3).write()}, "v", notices);
  CHECK(run->time().size() == 6);
  CHECK(run->frequency() == cf::Frequency::daily);
  CHECK(has(notices, "gap in time between 2000-01-03 12:00 and 2000-01-11 12:00: 7 days"));
}

TEST_CASE("each file keeps its own packing, type, dimension order and direction") {
  Sample a = days("a.nc", 0, 2), b = days("b.nc", 2, 2), c = days("c.nc", 4, 2);
  b.order = {"lat", "lon", "time"};
  std::ranges::reverse(b.lat);
  b.type = NC_DOUBLE;
  b.mode = NC_NETCDF4;
  c.mode = NC_NETCDF4;
  c.lon = steps(-175, 10, 36);
  c.chunks = {1, 2, 5};
  std::rotate(c.lon.begin(), c.lon.begin() + 18, c.lon.end());  // 5 .. 175, -175 .. -5
  Notices notices;
  const auto run = cf::open_run({a.write(), b.write(), c.write()}, "v", notices);
  CHECK(run->double_precision());
  check_places(*run, steps(0, 1, 6));
}

TEST_CASE("files of another grid, calendar or unit are refused") {
  const std::string a = days("a.nc", 0, 2).write();
  Sample grid = days("b.nc", 2, 2), calendar = days("b.nc", 2, 2), units = days("b.nc", 2, 2);
  grid.lat = steps(-35, 10, 6);
  CHECK(refusal({a, grid.write()}).starts_with("b.nc: the grid is another (regular latitude-longitude"));
  calendar.calendar = "noleap";
  CHECK(refusal({a, calendar.write()}) == "b.nc: the calendar is another (noleap against standard) than in a.nc");
  units.more = [](FileBuilder& f) { f.att("units", "degC"); };
  CHECK(refusal({a, units.write()}) == "b.nc: variable 'v' has other units ('degC' against 'K') than in a.nc");
}

TEST_CASE("a fixed field is exactly one file") {
  Sample fixed;
  fixed.order = {"lat", "lon"};
  fixed.name = "fixed.nc";
  Notices notices;
  const std::string path = fixed.write();
  const auto run = cf::open_run({path}, "v", notices);
  CHECK(run->frequency() == cf::Frequency::fixed);
  REQUIRE(run->time().size() == 1);
  CHECK(run->time()[0].begin == 0);
  check_places(*run, {0});
  CHECK(refusal({path, path}) == "fixed.nc: variable 'v' has no time axis, so it cannot be one of 2 files of a run");
}

TEST_CASE("what is odd in every file is said once, with the count") {
  std::vector<std::string> paths;
  for (int i = 0; i < 4; ++i) {
    Sample sample = days("odd" + std::to_string(i) + ".nc", 2 * i, 2);
    sample.more = [](FileBuilder& f) { f.att("missing_value", "-1"); };
    paths.push_back(sample.write());
  }
  Notices notices;
  cf::open_run(paths, "v", notices);
  REQUIRE(notices.list().size() == 2);
  CHECK(notices.list()[0] ==
        Notice{paths[0], "variable 'v': missing_value is the text '-1', read as a number (and so in 3 more files)"});
}

TEST_CASE("any window of cells and steps equals that part of the whole, in double and float") {
  // Pinned seed; contiguous, record and chunked files, time slowest and fastest.
  std::uint64_t state = 7;
  const auto below = [&](std::size_t n) {
    state = state * 6364136223846793005ULL + 1442695040888963407ULL;
    return std::size_t((state >> 33) % n);
  };
  for (const bool time_first : {true, false}) {
    for (const std::vector<std::size_t>& chunks : {std::vector<std::size_t>{}, {2, 3, 5}, {7, 1, 36}}) {
      Sample a = days("a.nc", 0, 9), b = days("b.nc", 9, 7);
      for (Sample* sample : {&a, &b}) {
        sample->mode = chunks.empty() ? 0 : NC_NETCDF4;
        sample->chunks = chunks;
      }
      if (!time_first) b.order = {"lat", "lon", "time"}, b.mode = NC_NETCDF4, b.chunks = {2, 4, 3};
      Notices notices;
      const auto run = cf::open_run({a.write(), b.write()}, "v", notices);
      const std::vector<double> whole = read_all(*run);
      const std::size_t all = 6 * 36;
      for (int round = 0; round < 20; ++round) {
        const std::size_t t0 = below(16), t1 = t0 + below(16 - t0 + 1);
        std::vector<std::uint32_t> cells;
        const std::size_t sparse = 1 + below(40);
        for (std::uint32_t cell = 0; cell < all; ++cell)
          if (below(sparse) == 0) cells.push_back(cell);
        std::vector<double> part((t1 - t0) * cells.size(), -1);
        std::vector<float> floats(part.size(), -1);
        run->read(t0, t1, cells, part.data());
        run->read(t0, t1, cells, floats.data());
        std::size_t wrong = 0;
        for (std::size_t t = t0; t < t1; ++t)
          for (std::size_t i = 0; i < cells.size(); ++i) {
            const std::size_t at = (t - t0) * cells.size() + i;
            wrong += part[at] != whole[t * all + cells[i]] || floats[at] != float(part[at]);
          }
        CHECK(wrong == 0);
      }
    }
  }
}

TEST_CASE("threads reading at once get the same bits") {
  Sample sample = days("threads.nc", 0, 30);
  sample.mode = NC_NETCDF4;
  sample.chunks = {4, 3, 9};
  Notices notices;
  const auto run = cf::open_run({sample.write()}, "v", notices);
  const std::vector<double> whole = read_all(*run);
  std::vector<std::vector<double>> results(4);
  std::vector<std::thread> threads;
  for (std::vector<double>& result : results) threads.emplace_back([&result, &run] { result = read_all(*run); });
  for (std::thread& thread : threads) thread.join();
  for (const std::vector<double>& result : results) CHECK(result == whole);
}

TEST_CASE("asking beyond the axis or the grid is a defect") {
  Notices notices;
  const auto run = cf::open_run({days("a.nc", 0, 2).write()}, "v", notices);
  double value = 0;
  error_text(Failure::defect, [&] { run->read(0, 3, {0}, &value); });
  error_text(Failure::defect, [&] { run->read(0, 1, {6 * 36}, &value); });
}

TEST_CASE("a file that vanishes after opening is an input error that names it") {
  Notices notices;
  const std::string path = days("gone.nc", 0, 2).write();
  const auto run = cf::open_run({path}, "v", notices);
  std::filesystem::remove(path);
  double value = 0;
  CHECK(error_text(Failure::io, [&] { run->read(0, 1, {0}, &value); }).starts_with("gone.nc: "));
}

TEST_CASE("real files with odd metadata are understood") {
  Notices notices;
  const auto run = cf::open_run({WINDROW_TESTDATA "/cf/tiny_lon_wraps_mid_array.nc"}, "pm10_conc", notices);
  CHECK(run->grid().how ==
        "regular latitude-longitude, 0.1 x 0.1 degrees, 11 x 11 cells, -0.5 .. 0.6 E, 49.9 .. 51 N, "
        "edges half-way between centres (no bounds in the file)");
  CHECK(run->grid().edges.lon_deg[4] == -0.1);
  CHECK(run->grid().edges.lon_deg[5] == 0);
  CHECK(run->info().units == "\xc2\xb5g/m3");
  CHECK(error_text(Failure::data, [&] {
          cf::open_run({WINDROW_TESTDATA "/cf/tiny_packed_descending.nc"}, "u", notices);
        }).ends_with("variable 'u': 2 levels along 'level' (millibars); a field with a single level is needed"));
}

TEST_CASE("real files on other grids are recognised") {
  Notices notices;
  const auto lambert = cf::open_run({WINDROW_TESTDATA "/cf/small_lambert_km_axes.nc"}, "prcp", notices);
  CHECK(lambert->grid().kind == cf::GridKind::projected);
  CHECK(lambert->grid().axis_units == "km");
  CHECK(lambert->grid().x_edges.front() == -778.75);
  CHECK(lambert->grid().y_edges.back() == -119.5);
  const auto rotated = cf::open_run({WINDROW_TESTDATA "/cf/rcm_hsurf_rotated_alps.nc"}, "HSURF", notices);
  CHECK(rotated->grid().rotation == mesh::Rotation{-162, 39.25, 0});
  const auto stations = cf::open_run({WINDROW_TESTDATA "/cf/tiny_dsg_timeseries.nc"}, "pr", notices);
  CHECK(stations->grid().points.size() == 10);
  CHECK(stations->time().size() == 20);
  CHECK(cf::open_run({WINDROW_TESTDATA "/cf/landsea_1deg.nc"}, "LSMASK", notices)
            ->grid()
            .how.starts_with("regular latitude-longitude, 1 x 1 degrees, 180 x 360 cells, global"));
  CHECK(error_text(Failure::data, [&] {
          cf::open_run({WINDROW_TESTDATA "/cf/sst_clim_2_months.nc"}, "sst", notices);
        }).ends_with("time axis 'time' has the units 'Month', which name no date; expected '<unit> since <date>'"));
}

TEST_CASE("the real year of a global model has its known mean temperature") {
  // 287.5637 K: area mean by the file's bounds, weighted by month length; computed independently with numpy.
  Notices notices;
  const auto run = cf::open_run({WINDROW_TESTDATA "/gcm/tas_2005_t63.nc"}, "tas", notices);
  CHECK(run->frequency() == cf::Frequency::monthly);
  CHECK(notices.list().empty());
  const std::vector<double> values = read_all(*run);
  const auto& edges = run->grid().edges;
  double sum = 0, weight = 0;
  for (std::size_t t = 0; t < 12; ++t)
    for (std::size_t j = 0; j < 96; ++j) {
      const double band = std::sin(edges.lat_deg[j + 1] * M_PI / 180) - std::sin(edges.lat_deg[j] * M_PI / 180);
      const double length = double(run->time()[t].end - run->time()[t].begin) / double(calendar::kDay);
      for (std::size_t i = 0; i < 192; ++i) sum += band * length * values[(t * 96 + j) * 192 + i];
      weight += 192 * band * length;
    }
  CHECK(sum / weight == doctest::Approx(287.5637).epsilon(0.5e-4 / 287));
}
