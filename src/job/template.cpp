// The commented job files to start from: one of a grid, of catchments, of towns. Every key of this version is in one of
// them; tests check that against the key lists.
#include "windrow/job/spec.h"
#include "windrow/text/words.h"

namespace windrow::job {
namespace {

// Pieces of them, put together with an empty line between. Lines that begin with '#' and a space explain; lines that
// begin with '#' alone are settings left out.
constexpr const char* kHead = R"toml(# A windrow job: which model files, which variables, onto which mesh.
# Paths are relative to this file; ~ and ${NAME} are filled in. Lines that begin with "# " explain. Settings that are
# left out begin with "#" alone and show their default, or an example where there is none. Check with `windrow plan`.

[job]
#title     = "Daily climate of Kelder, 1981-2010"   # kept in the products
#workspace = "work"           # linear maps, transfers, journal; safe to delete
#memory    = "4 GiB"          # ceiling for the whole process; default: 80 % of what there is
#threads   = 0                # 0: the processors this process may use
#settle    = "0 min"          # input files younger than this are waited for
#version   = "1"              # product version, kept in the product and as {version}

# One [[run]] for each model run.
[[run]]
#name     = "run"             # needed when there are several
#family   = "run"             # runs that share one calibration; default: the run's name
#anchor   = true              # the family is calibrated on this run; exactly one in a family of several
#forcing  = "all forcings"    # free text, kept in the product
files    = ["in/tas_*.nc"]
#land_fraction = "in/sftlf.nc"    # only that fraction of each cell counts
# What the files do not say about their grid; any of these:
#grid     = { crs = "EPSG:3035", units = "km" }   # of projected x and y without a grid mapping, or without units
# grid    = { pole = [-162, 39.25] }      # longitude and latitude of a rotated grid's north pole
# grid    = { coordinates = "in/corners.nc" }   # a file that holds the coordinates and bounds
# grid    = { sides = "parallels" }       # great-circles | parallels: how the sides of curvilinear cells run
)toml";

constexpr const char* kField = R"toml(# One [[field]] for each variable.
[[field]]
variable = "tas"              # name in the model files
#name     = "tas"             # name in the product; default: the same
#units    = "degC"            # default: the source's; converted with UDUNITS
#method   = "conservative-1"  # the means over model cells are kept; conservative-2 (linear within a cell) |
#                             # conservative-smooth | bilinear | nearest | majority (the largest share, for categories)
#quantity = "mean"            # mean (a cell average: temperature, flux density) | total (a cell sum: mass, population)
#min_cover = 0.5              # a mesh cell with less cover by cells that have a value is missing
#min_land  = 0.0              # with land_fraction: a mesh cell with a smaller land share is missing
#fill     = "none"            # none | nearest: what a cell below min_cover gets
#range    = [-90, 60]         # physical range in output units; what falls outside is clamped and counted
# pair    = "eastward"        # eastward | northward: components of a vector, in two fields, turned together
# axes    = "east-north"      # east-north | mesh: what the components of the product run along
)toml";

constexpr const char* kTownField = R"toml(# One [[field]] for each variable.
[[field]]
variable = "tas"              # name in the model files
#name     = "tas"             # name in the product; default: the same
#units    = "degC"            # default: the source's; converted with UDUNITS
#method   = "conservative-1"  # the value of the cell that holds the town | bilinear | nearest
#quantity = "mean"            # a cell sum has no value at a point
#min_cover = 0.5              # a town with less of its weight on cells that have a value is missing
#fill     = "none"            # none | nearest: what a town below min_cover gets
#range    = [-90, 60]         # physical range in output units; what falls outside is clamped and counted
)toml";

constexpr const char* kAdjust =
    R"toml(# Bias adjustment to stations; leave it out for regridding only. Needs [stations].
#[field.adjust]
#method   = "quantile-delta-mapping"   # none | mean-shift | mean-ratio | variance-scaling | quantile-mapping |
#                             # detrended-quantile-mapping | quantile-delta-mapping | gamma-mapping
#form     = "additive"        # additive | multiplicative (rain, wind speed, radiation)
#observed = "tas"             # station column; default: the field's name. Two are averaged: ["tmin", "tmax"]
#period   = ["1981-01-01", "2010-12-31"]   # calibration period; default: all of the anchor run
#season   = "31 days"         # "31 days" (moving window, default for daily data) | month (for monthly data) | year
#day_step = 5                 # days between the centres of those windows
#window   = "30 years"        # quantile-delta- and detrended-quantile-mapping: the run's own window,
#window_step = "10 years"     # stepped by so much
#quantiles = 100              # of the quantile methods
# With form = "multiplicative" also:
#   wet_day = "1 mm/day"      # from here on a day is wet; default for precipitation with the quantile methods
#max_ratio = 10               # cap of a multiplicative correction, and of the factor of variance-scaling
#tails    = "constant"        # beyond the calibrated range: the correction of the outermost quantile
#carry    = "target"          # target | correction: what is carried from stations to cells
#period_mismatch = "refuse"   # refuse | accept: station and model years that cannot be matched

# Height adjustment before the transfer. Needs [mesh] height; towns bring their own.
#[field.terrain]
#lapse    = "-6.5 K/km"       # or 12 monthly values, or "fit": from the stations
#model_height = "in/orog.nc"
)toml";

constexpr const char* kGridMesh = R"toml([mesh]
#name     = "mesh"
#kind     = "latlon"          # latlon | projected | raster | file | faces | catchments | towns
lon      = { from = -10, to = 30, step = 0.25 }    # cell edges in degrees
lat      = { from = 35, to = 60, step = 0.25 }
# For kind = "projected" take these instead of lon and lat (cell edges in the projection's units):
#   crs  = "EPSG:3035"        # any PROJ definition
#   x    = { from = 4000000, to = 4500000, step = 5000 }
#   y    = { from = 2500000, to = 3000000, step = 5000 }
# For the others take one of these instead of lon and lat (`windrow new --for catchments` and `--for towns` tell more):
#   template = "in/grid.tif"               # kind = "raster": its cells and CRS
#   from     = "in/other.nc"               # kind = "file": a CF grid of any kind,
#   variable = "v"                         # that of this variable
#   from     = "in/ugrid.nc"               # kind = "faces": a UGRID mesh,
#   topology = "Mesh2"                     # that of this topology variable
#height   = "in/relief.tif"   # a raster or CF NetCDF; averaged conservatively onto the mesh
#mask     = "in/land.gpkg"    # polygons or a raster; a cell less than half within is missing
#earth    = "sphere"          # sphere | ellipsoid: what areas are measured on
)toml";

constexpr const char* kCatchmentMesh = R"toml([mesh]
#name     = "mesh"
kind     = "catchments"
polygons = "in/basins.gpkg"   # GeoPackage, Shapefile, GeoJSON or FlatGeobuf
#layer    = "basins"          # needed when the file has several
#id       = "code"            # column that tells catchments apart; default: numbers from 1
#height   = "in/relief.tif"   # a raster or CF NetCDF; averaged conservatively over catchments
#mask     = "in/land.gpkg"    # polygons or a raster; a catchment less than half within is missing
#earth    = "sphere"          # sphere | ellipsoid: what areas are measured on
)toml";

constexpr const char* kTownMesh = R"toml([mesh]
#name     = "mesh"
kind     = "towns"
sites    = "in/towns.csv"     # station,longitude,latitude,elevation,name
#earth    = "sphere"          # sphere | ellipsoid: as for other kinds of mesh
)toml";

constexpr const char* kStations = R"toml(#[stations]
#sites    = "in/sites.csv"    # station,longitude,latitude,elevation,name; CF timeSeries files hold their own
#daily    = "in/daily.csv"    # station,date,tas [degC]        (or monthly = ..., instead of it; or CF NetCDF)
# monthly = "in/monthly.csv"  # station,year,month,tas [degC]
#normals  = "in/normals.csv"  # station,month,tas [degC]       (instead of, or beside the series)
#columns  = { station = "id", elevation = "elev_m" }    # when a file's headings differ
#units    = { tmin_degC = "degC" }                      # when a heading carries no [unit]
#normals_period = [1981, 2010]
#min_years = 10               # a station with fewer complete years is left out, and said so
#day      = { ends = "24:00", zone = "UTC", label = "end" }   # the hours a station day covers; dates are moved
                              # by whole days to the UTC date that holds most of them
#undercatch = "none"          # or the column of the sites table with factors for precipitation

# How a station's correction reaches the cells between stations.
#[reach]
#method   = "inverse-distance"    # nearest | inverse-distance | kriging | kriging-height (elevation as drift)
#radius   = "300 km"
#power    = 2                 # of the distance
#beyond   = "taper"           # cells farther from any station: taper (to the mean correction) | raw | missing
#neighbours = 32              # up to 500 stations all are used
# With method = "kriging" or "kriging-height" also:
#   variogram = "fit"         # or { model = "exponential", nugget = 0.1, sill = 1.0, range = "120 km" };
#                             # models: exponential | spherical | gaussian; a model alone is fitted
)toml";

constexpr const char* kEnsemble =
    R"toml(# Products computed from the finished products of the runs; they are named with what they are in place of {run}.
#[ensemble]
# Statistics are taken over the runs of one 'forcing', one member a family (its anchor run, or its first of that forcing), at the
# steps that all have; a cell where a member is missing is missing. With 'baseline' of values and of anomalies. spread:
# standard deviation with n - 1; quantile: type 7 of Hyndman & Fan 1996; agreement (of anomalies): share of members whose
# change has the sign of the mean change.
# statistics = ["mean", "spread", "quantile:0.1", "quantile:0.9", "agreement"]
# contrast = [["run", "run-natural"]]   # factual minus counterfactual, step by step: two runs of one family
#baseline = [1981, 2010]      # anomalies of every run against its monthly means of these years
# Warming levels: monthly means of the 20 years (n - 9 to n + 10) in which the running global mean first reaches each level
# above its mean of 'reference'. global: a file with the series; without it, it is computed from the run's files.
#warming  = { levels = [1.5, 2.0], global = "in/{run}_gmst.nc", reference = [1850, 1900] }
)toml";

constexpr const char* kOutput = R"toml([output]
#directory = "out"
#name      = "{field}_{run}_{mesh}.nc"   # {field} {run} {mesh} {version}; {year} splits by year
#calendar  = "source"         # the model's own calendar
#compression = "deflate"      # deflate | none
#level     = 1                # 0 to 9
#digits    = 0                # 1 to 7: keep that many significant digits
#attributes = { institution = "Kelder Weather Office (invented)" }
)toml";

constexpr const char* kGridOutput = R"toml(#tile      = "auto"           # or [time, y, x]
)toml";

constexpr const char* kCellOutput = R"toml(#tile      = "auto"           # or [time, cells]
#also      = ["csv"]          # a table beside each product
)toml";

}  // namespace

std::string template_text(const std::string& kind) {
  const auto whole = [](const std::string& field, const std::string& mesh, const std::string& output) {
    return kHead + ("\n" + field) + "\n" + kAdjust + "\n" + mesh + "\n" + kStations + "\n" + kEnsemble + "\n" +
           kOutput + output;
  };
  if (kind == "grid") return whole(kField, kGridMesh, kGridOutput);
  if (kind == "catchments") return whole(kField, kCatchmentMesh, kCellOutput);
  if (kind == "towns") return whole(kTownField, kTownMesh, kCellOutput);
  const std::vector<std::string> kinds{"grid", "catchments", "towns"};
  const std::string nearest = text::nearest_word(kind, kinds);
  throw Error(Failure::usage, "new",
              "unknown kind of job '" + kind + "'; " +
                  (nearest.empty() ? "expected " + text::alternatives(kinds) : "did you mean '" + nearest + "'?"));
}

}  // namespace windrow::job
