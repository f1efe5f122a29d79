// Runs of the invented models as NetCDF, with the habits real files have: packed shorts, north first, 0..360
// longitudes, years without leap days. What the models get wrong stands in invented.h.
#include "model_files.h"

#include <netcdf.h>

#include <cmath>
#include <cstdint>
#include <stdexcept>
#include <utility>
#include <vector>

#include "days.h"
#include "island.h"
#include "weather.h"

namespace demo {
namespace {

constexpr double kKelvin = 273.15;
constexpr double kSecondsPerDay = 86400;
constexpr float kFill = 1e20F;
constexpr short kPackedFill = -32768;
constexpr int kYearsPerFile = 10;

void check(int status, const std::string& path) {
  if (status != NC_NOERR) throw std::runtime_error(path + ": " + nc_strerror(status));
}

/// A NetCDF file being written: define everything, then data.
class Writer {
 public:
  explicit Writer(std::string path) : path_(std::move(path)) {
    check(nc_create(path_.c_str(), NC_CLOBBER | NC_64BIT_OFFSET, &file_), path_);
    check(nc_set_fill(file_, NC_NOFILL, nullptr), path_);
  }
  int dimension(const char* name, std::size_t length) {
    int id = 0;
    check(nc_def_dim(file_, name, length, &id), path_);
    return id;
  }
  int variable(const char* name, nc_type type, const std::vector<int>& dimensions,
               const std::vector<std::pair<const char*, std::string>>& texts) {
    int id = 0;
    check(nc_def_var(file_, name, type, static_cast<int>(dimensions.size()), dimensions.data(), &id), path_);
    for (const auto& [key, text] : texts) attribute(id, key, text);
    return id;
  }
  void attribute(int variable, const char* name, const std::string& text) {
    check(nc_put_att_text(file_, variable, name, text.size(), text.c_str()), path_);
  }
  void attribute(int variable, const char* name, nc_type type, double value) {
    check(nc_put_att_double(file_, variable, name, type, 1, &value), path_);
  }
  void end_definitions() { check(nc_enddef(file_), path_); }
  void values(int variable, const std::vector<double>& values) {
    check(nc_put_var_double(file_, variable, values.data()), path_);
  }
  void block(int variable, const std::vector<std::size_t>& count, const std::vector<double>& values) {
    const std::vector<std::size_t> start(count.size(), 0);
    check(nc_put_vara_double(file_, variable, start.data(), count.data(), values.data()), path_);
  }
  void close() { check(nc_close(file_), path_); }

 private:
  std::string path_;
  int file_ = 0;
};

/// How values are stored: as float, or packed into shorts.
struct Packing {
  bool packed = false;
  double scale = 1, offset = 0;
  [[nodiscard]] double stored(double value) const { return packed ? std::round((value - offset) / scale) : value; }
};

struct Horizontal {
  int lat = 0, lon = 0;  // dimensions
  int lat_values = 0, lon_values = 0, lat_bounds = 0, lon_bounds = 0;
};

Horizontal define_horizontal(Writer& file, const Model& model, int pair) {
  Horizontal h;
  h.lat = file.dimension("lat", static_cast<std::size_t>(model.rows));
  h.lon = file.dimension("lon", static_cast<std::size_t>(model.columns));
  h.lat_values = file.variable("lat", NC_DOUBLE, {h.lat},
                               {{"standard_name", "latitude"}, {"units", "degrees_north"}, {"bounds", "lat_bnds"}});
  h.lon_values = file.variable("lon", NC_DOUBLE, {h.lon},
                               {{"standard_name", "longitude"}, {"units", "degrees_east"}, {"bounds", "lon_bnds"}});
  h.lat_bounds = file.variable("lat_bnds", NC_DOUBLE, {h.lat, pair}, {});
  h.lon_bounds = file.variable("lon_bnds", NC_DOUBLE, {h.lon, pair}, {});
  return h;
}

void write_axis(Writer& file, int values, int bounds, double first, double step, int count) {
  std::vector<double> centres, edges;
  for (int i = 0; i < count; ++i) {
    centres.push_back(first + (i + 0.5) * step);
    edges.push_back(first + i * step);
    edges.push_back(first + (i + 1) * step);
  }
  file.values(values, centres);
  file.values(bounds, edges);
}

void write_horizontal(Writer& file, const Model& model, const Horizontal& h) {
  const double north = model.south + model.rows * model.step;
  write_axis(file, h.lat_values, h.lat_bounds, model.descending ? north : model.south,
             model.descending ? -model.step : model.step, model.rows);
  write_axis(file, h.lon_values, h.lon_bounds, model.west + (model.east_positive ? 360 : 0), model.step, model.columns);
}

void describe_file(Writer& file, const Model& model, const std::string& what) {
  file.attribute(NC_GLOBAL, "Conventions", "CF-1.8");
  file.attribute(NC_GLOBAL, "title", what + " of " + model.title);
  file.attribute(NC_GLOBAL, "source", "invented data about the invented island of Kelder; no real model or place");
}

double south_of(const Model& model, int row) {
  return model.south + (model.descending ? model.rows - 1 - row : row) * model.step;
}

void write_fixed(const Model& model, const std::string& path, const char* name, const char* standard_name,
                 const char* units, const std::vector<double>& values) {
  Writer file(path);
  describe_file(file, model, standard_name);
  const int pair = file.dimension("bnds", 2);
  const Horizontal h = define_horizontal(file, model, pair);
  const int variable =
      file.variable(name, NC_FLOAT, {h.lat, h.lon}, {{"standard_name", standard_name}, {"units", units}});
  file.attribute(variable, "_FillValue", NC_FLOAT, kFill);
  file.end_definitions();
  write_horizontal(file, model, h);
  file.values(variable, values);
  file.close();
}

/// Some years of one run in memory: [day][row][column], rows as stored.
struct Block {
  std::vector<double> tas, pr;
};

struct RunFile {
  std::string run;  // "all" or "natural"
  std::string title;
  int first_year = 0;
  std::size_t first_day = 0, days = 0;  // since the first year
};

int define_data(Writer& file, const char* name, const char* standard_name, const char* units,
                const std::vector<int>& dimensions, const Packing& packing) {
  const int id = file.variable(name, packing.packed ? NC_SHORT : NC_FLOAT, dimensions,
                               {{"standard_name", standard_name}, {"units", units}, {"cell_methods", "time: mean"}});
  file.attribute(id, "_FillValue", packing.packed ? NC_SHORT : NC_FLOAT, packing.packed ? kPackedFill : kFill);
  if (packing.packed) {
    file.attribute(id, "scale_factor", NC_DOUBLE, packing.scale);
    file.attribute(id, "add_offset", NC_DOUBLE, packing.offset);
  }
  return id;
}

void write_block(const Model& model, const std::string& folder, const RunFile& part, const Block& block,
                 const Packing& tas_packing, const Packing& pr_packing) {
  Writer file(folder + "/" + model.name + "_" + part.run + "_" + std::to_string(part.first_year) + "-" +
              std::to_string(part.first_year + kYearsPerFile - 1) + ".nc");
  describe_file(file, model, part.title);
  const int time = file.dimension("time", NC_UNLIMITED);
  const int pair = file.dimension("bnds", 2);
  const Horizontal h = define_horizontal(file, model, pair);
  const int times = file.variable("time", NC_DOUBLE, {time},
                                  {{"standard_name", "time"},
                                   {"units", "days since " + std::to_string(kFirstYear) + "-01-01"},
                                   {"calendar", model.noleap ? "noleap" : "standard"},
                                   {"bounds", "time_bnds"}});
  const int time_bounds = file.variable("time_bnds", NC_DOUBLE, {time, pair}, {});
  const int tas = define_data(file, "tas", "air_temperature", "K", {time, h.lat, h.lon}, tas_packing);
  const int pr = define_data(file, "pr", "precipitation_flux", "kg m-2 s-1", {time, h.lat, h.lon}, pr_packing);
  file.end_definitions();
  write_horizontal(file, model, h);
  std::vector<double> middle, edges;
  for (std::size_t d = 0; d < part.days; ++d) {
    const auto day = static_cast<double>(part.first_day + d);
    middle.push_back(day + 0.5);
    edges.push_back(day);
    edges.push_back(day + 1);
  }
  const std::vector<std::size_t> count{part.days, static_cast<std::size_t>(model.rows),
                                       static_cast<std::size_t>(model.columns)};
  file.block(times, {part.days}, middle);
  file.block(time_bounds, {part.days, 2}, edges);
  file.block(tas, count, block.tas);
  file.block(pr, count, block.pr);
  file.close();
}

struct Cell {
  Share temperature, rain;
  double lat, height_m;
};

/// Appends one day of both runs: [0] all forcings, [1] natural forcings only.
void append_day(const Model& model, const Day& day, const std::vector<Cell>& cells, const WeatherField& temperature,
                const WeatherField& rain_field, const Packing& tas_packing, const Packing& pr_packing,
                Block (&blocks)[2]) {
  const double error = kKelvin + model.bias + model.bias_season * season(day.phase());
  for (const Cell& cell : cells) {
    const double weather = model.deviation_factor * temperature.value(cell.temperature);
    const double wetness = rain_field.value(cell.rain);
    for (int run = 0; run < 2; ++run) {
      const double decades = run == 0 ? day.decades() : 0;
      const double t = true_temperature(cell.lat, cell.height_m, day.phase(), decades, weather) + error;
      const double p = rain(cell.height_m, day.phase(), decades, wetness, model.threshold_shift, model.rain_factor);
      blocks[run].tas.push_back(tas_packing.stored(t));
      blocks[run].pr.push_back(pr_packing.stored(p / kSecondsPerDay));
    }
  }
}

}  // namespace

void write_model(const Model& model, const std::string& folder) {
  WeatherField temperature(kTemperatureNodes, kTemperatureMemory, model.seed);
  WeatherField rain_field(kRainNodes, kRainMemory, model.seed + 1);
  std::vector<Cell> cells;
  std::vector<double> heights, land;
  for (int row = 0; row < model.rows; ++row) {
    for (int column = 0; column < model.columns; ++column) {
      const double west = model.west + column * model.step, south = south_of(model, row);
      const CellRelief relief = cell_relief(west, south, model.step);
      heights.push_back(relief.height_m);
      land.push_back(100 * relief.land);
      cells.push_back({temperature.cell(west, south, model.step), rain_field.cell(west, south, model.step),
                       south + model.step / 2, relief.height_m});
    }
  }
  const std::string stem = folder + "/" + model.name;
  write_fixed(model, stem + "_orog.nc", "orog", "surface_altitude", "m", heights);
  write_fixed(model, stem + "_sftlf.nc", "sftlf", "land_area_fraction", "%", land);

  const Packing tas_packing{model.packed, 0.01, 280}, pr_packing{model.packed, 5e-8, 0};
  Day day{model.noleap, kFirstYear};
  for (int first = kFirstYear; first <= kLastYear; first += kYearsPerFile) {
    Block blocks[2];
    const auto first_day = static_cast<std::size_t>(day.number);
    for (; day.year < first + kYearsPerFile; day.next()) {
      append_day(model, day, cells, temperature, rain_field, tas_packing, pr_packing, blocks);
      temperature.next_day();
      rain_field.next_day();
    }
    const std::size_t days = static_cast<std::size_t>(day.number) - first_day;
    write_block(model, folder, {"all", "all forcings", first, first_day, days}, blocks[0], tas_packing, pr_packing);
    write_block(model, folder, {"natural", "natural forcings only", first, first_day, days}, blocks[1], tas_packing,
                pr_packing);
  }
}

}  // namespace demo
