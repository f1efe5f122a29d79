// The validated job: what one invocation is to do. Made from the job file by parse_job(); paths are absolute.
#pragma once
#include <array>
#include <cstddef>
#include <map>
#include <optional>
#include <string>
#include <utility>
#include <vector>

#include "windrow/base/error.h"
#include "windrow/calendar/calendar.h"

namespace windrow::job {

/// `grid = {...}` under [[run]]: what the files do not say about their grid.
struct GridSpec {
  std::string crs, axis_units, coordinates, sides;  ///< coordinates: path
  std::optional<std::array<double, 2>> pole;        ///< longitude, latitude of the rotated north pole
};

struct RunSpec {
  std::string name, family, forcing;
  bool anchor = false;                ///< exactly one run a family has it (a family of one is its own anchor)
  std::vector<std::string> patterns;  ///< as written, absolute; globbed later
  std::string land_fraction;          ///< path or empty
  GridSpec grid;
};

enum class Method { conservative_1, conservative_2, conservative_smooth, bilinear, nearest, majority };
enum class Pair { none, eastward, northward };
enum class VectorAxes { east_north, mesh };
enum class Adjustment {
  none,
  mean_shift,
  mean_ratio,
  variance_scaling,
  quantile_mapping,
  detrended_quantile_mapping,
  quantile_delta_mapping,
  gamma_mapping
};
/// The method as a job file names it.
std::string word(Adjustment method);
enum class Form { additive, multiplicative };
enum class Carry { target, correction };
enum class SeasonKind { month, year, moving };

struct AdjustSpec {
  Adjustment method = Adjustment::none;
  Form form = Form::additive;                                       ///< multiplicative for mean-ratio and gamma-mapping
  std::vector<std::string> observed;                                ///< one or two station columns
  std::optional<std::pair<calendar::Date, calendar::Date>> period;  ///< default: the anchor run's whole period
  SeasonKind season = SeasonKind::moving;
  bool season_given = false;  ///< monthly model data default to month
  int window_days = 31, day_step = 5;
  int window_years = 30, window_step = 10;                ///< the run's own windows
  std::optional<std::pair<double, std::string>> wet_day;  ///< value and units; nothing: 1 mm/day for precipitation
  int quantiles = 100;
  double max_ratio = 10;
  Carry carry = Carry::target;
  bool accept_period_mismatch = false;
};

struct TerrainSpec {
  std::array<double, 12> lapse_per_m{};  ///< per metre, in K (or the field's units) — negative for cooling with height
  bool fit = false;                      ///< lapse from the stations; then lapse_per_m is zero
  std::string model_height;              ///< path
};

struct FieldSpec {
  std::string variable, name, units;  ///< units empty: the source's
  Method method = Method::conservative_1;
  Pair pair = Pair::none;  ///< component of a tangent vector; its partner is the other field with a pair
  VectorAxes axes = VectorAxes::east_north;  ///< what the product's components run along
  bool total = false;
  double min_cover = 0.5, min_land = 0;
  bool fill_nearest = false;
  std::optional<std::pair<double, double>> range;
  AdjustSpec adjust;
  std::optional<TerrainSpec> terrain;
};

struct AxisSpec {
  double from = 0, to = 0, step = 0;
  [[nodiscard]] std::vector<double> edges() const;  ///< from + i*step computed as (from*(n-i) + to*i)/n
};
enum class MeshKind { latlon, projected, raster, file, catchments, towns, faces };
struct MeshSpec {
  std::string name;  ///< default "mesh"
  MeshKind kind = MeshKind::latlon;
  AxisSpec x, y;  ///< lon, lat on latlon meshes; x, y on projected ones
  std::string crs;
  std::string source;          ///< template, from, polygons or sites: the file that holds the cells
  std::string variable;        ///< file: whose grid; empty: the only one
  std::string layer, id;       ///< catchments
  std::string topology;        ///< faces: name of the mesh topology variable; empty: the only one
  std::string height;          ///< path or empty
  std::string mask;            ///< path or empty: polygons or raster; a cell less than half within is missing
  std::string place, excerpt;  ///< where the job file says so, for errors of the geometry: place, line with a caret
  bool ellipsoid = false;      ///< [mesh] earth = "ellipsoid"
};

struct StationSpec {
  bool given = false;
  std::string sites;  ///< empty: daily or monthly are NetCDF files that hold the sites too
  std::vector<std::string> daily, monthly, normals;
  std::map<std::string, std::string> columns, units;
  std::optional<std::pair<int, int>> normals_period;
  int min_years = 10;
  std::string day_note;    ///< text for the product's comment, from `day = {...}`
  int day_shift = 0;       ///< whole days from a daily value's date to the date that holds most of its hours
  std::string undercatch;  ///< factor column of the sites table; empty: none
};

enum class ReachMethod { nearest, inverse_distance, kriging, kriging_height };
enum class VariogramModel { exponential, spherical, gaussian };
struct VariogramSpec {
  bool fit = true;
  VariogramModel model = VariogramModel::exponential;
  double nugget = 0, sill = 1, range_m = 300e3;  ///< where not fitted; sill: the total, nugget included
};
enum class Beyond { taper, raw, missing };
struct ReachSpec {
  ReachMethod method = ReachMethod::inverse_distance;
  double radius_m = 300e3;
  double power = 2;
  Beyond beyond = Beyond::taper;
  int neighbours = 32;
  VariogramSpec variogram;
  [[nodiscard]] bool kriges() const { return method == ReachMethod::kriging || method == ReachMethod::kriging_height; }
};

struct OutputSpec {
  std::string directory;  ///< default "out"
  std::string name = "{field}_{run}_{mesh}.nc";
  bool deflate = true;
  int level = 1;
  int digits = 0;
  std::optional<std::array<int, 3>> tile;  ///< time, y, x; y is 1 where cells stand in no rows; nothing: auto
  bool csv = false;                        ///< also = ["csv"]: catchments and towns
  std::vector<std::pair<std::string, std::string>> attributes;
};

enum class StatisticKind { mean, spread, quantile, agreement };
struct EnsembleStatistic {
  StatisticKind kind = StatisticKind::mean;
  double p = 0;      ///< of a quantile
  std::string word;  ///< as the job file says it
};
struct WarmingSpec {
  std::vector<double> levels;            ///< kelvin above the reference
  std::string global;                    ///< path with {run}; empty: computed from the run's own files
  std::pair<int, int> reference{1850, 1900};
};
/// What is computed from finished products.
struct EnsembleSpec {
  std::vector<EnsembleStatistic> statistics;
  std::vector<std::pair<std::size_t, std::size_t>> contrasts;  ///< runs: factual, counterfactual
  std::optional<std::pair<int, int>> baseline;
  std::optional<WarmingSpec> warming;
};

struct JobSpec {
  std::string path;  ///< the job file
  std::string text;  ///< its text, kept for provenance
  std::string title, version = "1";
  std::string workspace;  ///< default "work"
  std::optional<long long> memory_bytes;
  int threads = 0;
  double settle_s = 0;
  std::vector<RunSpec> runs;
  std::vector<FieldSpec> fields;
  MeshSpec mesh;
  StationSpec stations;
  ReachSpec reach;
  EnsembleSpec ensemble;
  OutputSpec output;
};

/// Parses and validates. Every problem is Error(job) whose message is `FILE:LINE:COLUMN: what, expected what` and whose
/// detail shows the line with a caret; the nearest valid word is named. `overrides` are --set key=value pairs (dotted
/// path, index for arrays of tables: field.0.units=K).
JobSpec parse_job(const std::string& path, const std::string& text, const std::vector<std::string>& overrides);

/// The commented job file that `windrow new` prints (kinds: "grid", "catchments", "towns"). Parses with parse_job.
std::string template_text(const std::string& kind);

/// The file name of a field's product of one run, from the pattern of [output] name; {year} is left in.
std::string product_name(const JobSpec& job, const FieldSpec& field, const RunSpec& run);

/// Runs that make an ensemble: those of one forcing, one member a family (its anchor run where that has this forcing, else
/// its first). Forcings with runs of a single family make none.
struct EnsembleGroup {
  std::string forcing, name;         ///< name: "ensemble", with the forcing where there are several groups
  std::vector<std::size_t> runs;     ///< members
  std::vector<std::size_t> others;   ///< runs of a family that has its member already
};
std::vector<EnsembleGroup> ensemble_groups(const JobSpec& job);

/// What stands for {run} in the names of products of [ensemble], and for a statistic in it ("mean", "q90").
std::string contrast_name(const JobSpec& job, const std::pair<std::size_t, std::size_t>& pair);
std::string statistic_part(const EnsembleStatistic& statistic);
std::string warming_name(const JobSpec& job, std::size_t run, double level);
std::vector<std::string> ensemble_names(const JobSpec& job);

/// Every setting with its value, defaults included, one "key = value" a line, in job-file order. Result-changing keys
/// only when `result_only`; used for the ledger and the staleness key.
std::vector<std::pair<std::string, std::string>> settings(const JobSpec& job, bool result_only);

/// What a setting changes: a product's values or attributes; only how the file stores them (compression, level, tile);
/// nothing of the file (threads, memory, folders).
enum class Effect { result, encoding, none };

/// The settings one product depends on, without list indices ("field.units", "run.name", "anchor.files"), so that
/// another run or field added to the job does not touch it: those whose effect is `least` or stronger. Stations and
/// reach only for an adjusted field; the anchor run's where it is another run.
std::vector<std::pair<std::string, std::string>> product_settings(const JobSpec& job, std::size_t field,
                                                                  std::size_t run, Effect least);

/// The settings a product of [ensemble] depends on beside its members' own: `own` are those of its kind.
std::vector<std::pair<std::string, std::string>> ensemble_settings(
    const JobSpec& job, std::size_t field, const std::vector<std::pair<std::string, std::string>>& own, Effect least);

}  // namespace windrow::job
