// Annual global means of a run: from a file of the job's, or from the run's own files.
#include <fmt/format.h>

#include <algorithm>
#include <charconv>
#include <cmath>
#include <numbers>
#include <sstream>

#include "ensemble_plan.h"
#include "grid_mesh.h"
#include "windrow/base/error.h"
#include "windrow/cf/product.h"
#include "windrow/codec/codec.h"
#include "windrow/units/units.h"

namespace windrow::engine {
namespace {

std::vector<ensemble::Span> spans_of(const cf::RunVariable& variable) {
  std::vector<ensemble::Span> out;
  for (const auto& step : variable.time()) out.push_back({step.time, step.begin, step.end});
  return out;
}

/// The only data variable, or the only one that is a temperature.
std::string series_variable(const std::string& path) {
  const auto names = cf::data_variables(path);
  if (names.size() == 1) return names.front();
  std::vector<std::string> temperatures;
  const auto reader = cf::open_product(path);
  for (const auto& name : names) {
    for (const auto& attribute : reader->attributes(name)) {
      if (attribute.name == "standard_name" && attribute.text.find("temperature") != std::string::npos) {
        temperatures.push_back(name);
      }
    }
  }
  if (temperatures.size() == 1) return temperatures.front();
  throw Error(Failure::data, path,
              fmt::format("has {} variables of which {} are temperatures; expected one series of global means",
                          names.size(), temperatures.size()));
}

/// Kelvin a unit: offsets do not matter, as only differences from the reference count.
double kelvin_of(const cf::VariableInfo& info, const std::string& place) {
  return units::conversion(info.units, "K", "", place).affine.scale;
}

GlobalMeans from_file(const std::string& path) {
  if (!os::state(path)) throw Error(Failure::missing, path, "no such file; it is 'global' in 'warming' of [ensemble]");
  const std::string name = series_variable(path);
  Notices notices;
  const auto variable = cf::open_run({path}, name, notices);
  const auto& grid = variable->grid();
  const bool points = grid.kind == cf::GridKind::points;
  const std::size_t cells = points ? grid.points.size() : mesh_of(grid, {}, path, notices).mesh->size();
  if (cells != 1 || variable->frequency() == cf::Frequency::fixed) {
    throw Error(Failure::data, path,
                fmt::format("variable {} has {} cells and {} steps; expected a series of global means", name, cells,
                            variable->time().size()));
  }
  std::vector<double> values(variable->time().size());
  variable->read(0, values.size(), {0}, values.data());
  const double scale = kelvin_of(variable->info(), path);
  for (double& x : values) x *= scale;
  return {ensemble::annual_means(variable->calendar(), spans_of(*variable), values), path};
}

/// The field whose global mean is taken: an air temperature, else any temperature.
std::size_t temperature_field(Session& session, std::size_t run) {
  std::optional<std::size_t> second;
  for (std::size_t field = 0; field < session.job.fields.size(); ++field) {
    const auto& info = session.variable(field, run).info();
    if (info.standard_name == "air_temperature") return field;
    if (!second && info.standard_name.find("temperature") != std::string::npos) second = field;
  }
  if (second) return *second;
  throw Error(
      Failure::job, session.job.path,
      "'warming' of [ensemble] needs global mean temperatures and no field is a temperature; expected 'global', "
      "a file with the series");
}

std::vector<double> area_means(const cf::RunVariable& variable, const mesh::Mesh& mesh) {
  std::vector<std::uint32_t> cells(mesh.size());
  for (std::size_t k = 0; k < cells.size(); ++k) cells[k] = static_cast<std::uint32_t>(k);
  constexpr std::size_t kSliceBytes = 16 << 20;
  const std::size_t slice = std::max<std::size_t>(1, kSliceBytes / sizeof(double) / cells.size());
  std::vector<double> values, out;
  for (std::size_t t0 = 0; t0 < variable.time().size(); t0 += slice) {
    const std::size_t count = std::min(slice, variable.time().size() - t0);
    values.resize(count * cells.size());
    variable.read(t0, t0 + count, cells, values.data());
    for (std::size_t t = 0; t < count; ++t) {
      double sum = 0, area = 0;
      for (std::size_t k = 0; k < cells.size(); ++k) {
        const double x = values[t * cells.size() + k];
        if (std::isnan(x)) continue;
        sum += x * mesh.area(k);
        area += mesh.area(k);
      }
      out.push_back(sum / area);
    }
  }
  return out;
}

GlobalMeans from_run(Session& session, std::size_t run) {
  const std::size_t field = temperature_field(session, run);
  const auto& source = session.source(field, run);
  const auto& variable = *source.variable;
  const std::string place = fmt::format("run '{}'", session.job.runs[run].name);
  double area = 0;
  for (std::size_t k = 0; k < source.mesh->size(); ++k) area += source.mesh->area(k);
  constexpr double kGlobe = 4 * std::numbers::pi, kTolerance = 1e-6;
  if (std::fabs(area - kGlobe) > kTolerance * kGlobe) {
    throw Error(Failure::data, place,
                fmt::format("its grid covers {:.1f} % of the globe, so that its global mean is not known; expected "
                            "'global' in 'warming' of [ensemble], a file with the series",
                            100 * area / kGlobe));
  }
  const double scale = kelvin_of(variable.info(), place);
  auto values = area_means(variable, *source.mesh);
  for (double& x : values) x *= scale;
  return {ensemble::annual_means(variable.calendar(), spans_of(variable), values), place};
}

std::string kept_path(Session& session, std::size_t run) {
  codec::Hasher hasher;
  hasher.add(session.job.fields[temperature_field(session, run)].variable);
  hasher.add(session.target().mesh->earth().e2);
  for (const auto& path : session.files(run)) hasher.add(session.digests().of(path).hex());
  if (const auto& path = session.job.runs[run].grid.coordinates; !path.empty()) {
    hasher.add(session.digests().of(path).hex());
  }
  return session.job.workspace + "/global/" + hasher.finish().hex() + ".txt";
}

/// A year and its mean a line, in the shortest form that reads back the same. Nothing where the file is damaged.
std::optional<std::vector<ensemble::YearMean>> read_kept(const std::string& path) {
  if (!os::state(path)) return std::nullopt;
  std::istringstream lines(os::read_text(path));
  std::vector<ensemble::YearMean> out;
  std::string word;
  for (int year = 0; lines >> year >> word;) {
    double value = 0;
    const auto [end, code] = std::from_chars(word.data(), word.data() + word.size(), value);
    if (code != std::errc() || end != word.data() + word.size()) return std::nullopt;
    out.push_back({year, value});
  }
  // The last line says how many there are: a cut file is made again.
  if (out.empty() || out.back().year != static_cast<int>(out.size()) - 1 || out.back().value != 0) return std::nullopt;
  out.pop_back();
  return out;
}

}  // namespace

GlobalMeans global_means(Session& session, std::size_t run) {
  const auto& global = session.job.ensemble.warming->global;
  if (!global.empty()) return from_file(for_run(global, session.job.runs[run]));
  const std::string path = kept_path(session, run);
  if (auto kept = read_kept(path)) return {std::move(*kept), fmt::format("run '{}'", session.job.runs[run].name)};
  GlobalMeans made = from_run(session, run);
  if (!session.writes()) return made;
  std::string text;
  for (const auto& [year, value] : made.years) text += fmt::format("{} {}\n", year, value);
  text += fmt::format("{} 0\n", made.years.size());
  os::make_folder(os::folder_of(path));
  os::replace_file(path, text);
  return made;
}

}  // namespace windrow::engine
