// Job texts that the tests of module job share. All invented.
#pragma once
#include <string>

namespace job_texts {

/// The shortest whole job.
inline const std::string kShortest = R"toml([[run]]
files = ["tas_*.nc"]
[[field]]
variable = "tas"
[mesh]
lon = { from = -10, to = 30, step = 0.25 }
lat = { from = 35, to = 60, step = 0.25 }
)toml";

/// Every key of this version that goes with a projected mesh and adjusted fields, none at its default.
inline const std::string kEveryKey = R"toml([job]
title     = "Daily climate of Kelder"
workspace = "scratch"
memory    = "4 GiB"
threads   = 3
settle    = "10 min"
version   = "2.1"

[[run]]
name     = "heron-all"
family   = "heron"
anchor   = true
forcing  = "all forcings"
files    = ["in/heron_all_*.nc", "/data/heron_extra.nc"]
land_fraction = "in/heron_sftlf.nc"
grid     = { crs = "EPSG:3035", units = "km", coordinates = "in/heron_corners.nc", sides = "parallels" }

[[run]]
name     = "heron-natural"
family   = "heron"
forcing  = "natural only"
files    = "in/heron_nat_*.nc"

[[field]]
variable = "ts"
name     = "tas"
units    = "degC"
method   = "conservative-1"
quantity = "mean"
min_cover = 0.25
min_land  = 0.125
fill     = "nearest"
range    = [-90, 60.5]

[field.adjust]
method   = "quantile-mapping"
form     = "additive"
observed = ["tmin", "tmax"]
period   = ["1981-01-01", 2010-12-31]
season   = "21 days"
day_step = 7
quantiles = 50
max_ratio = 8
tails    = "constant"
carry    = "correction"
period_mismatch = "accept"

[field.terrain]
lapse    = "-6.5 K/km"
model_height = "in/heron_orog.nc"

[[field]]
variable = "pr"
units    = "mm/day"
[field.adjust]
method   = "mean-ratio"
form     = "multiplicative"
season   = "month"

[mesh]
name     = "kelder5"
kind     = "projected"
crs      = "+proj=laea +lat_0=48 +lon_0=-28 +R=6371000"
x        = { from = -150000, to = 150000, step = 5000 }
y        = { from = -200000, to = 200000, step = 5000 }
height   = "in/relief.tif"
mask     = "in/land.gpkg"
earth    = "ellipsoid"

[stations]
sites    = "in/sites.csv"
daily    = "in/daily.csv"
normals  = ["in/normals_a.csv", "in/normals_b.csv"]
columns  = { station = "id", longitude = "lon", elevation = "elev_m" }
units    = { tmin_degC = "degC", precip_mm = "mm/month" }
normals_period = [1981, 2010]
min_years = 12
day       = { ends = "09:00", zone = "UTC+1", label = "start" }
undercatch = "none"

[reach]
method   = "nearest"
radius   = "250 km"
power    = 3
beyond   = "missing"
neighbours = 16

[output]
directory = "made"
name      = "{field}_{run}_{mesh}_v{version}_{year}.nc"
calendar  = "source"
compression = "deflate"
level     = 3
digits    = 4
tile      = [365, 16, 32]
attributes = { institution = "Kelder Weather Office (invented)", contact = "none" }
)toml";

/// Three runs of two families and everything [ensemble] can ask for.
inline const std::string kEnsemble = R"toml([[run]]
name    = "heron-all"
family  = "heron"
anchor  = true
forcing = "All forcings"
files   = ["heron_all.nc"]
[[run]]
name    = "heron-natural"
family  = "heron"
forcing = "natural only"
files   = ["heron_nat.nc"]
[[run]]
name    = "plover-all"
forcing = "All forcings"
files   = ["plover.nc"]
[[field]]
variable = "tas"
[mesh]
lon = { from = -10, to = 30, step = 0.25 }
lat = { from = 35, to = 60, step = 0.25 }
[ensemble]
statistics = ["mean", "spread", "quantile:0.1", "quantile:0.975", "agreement"]
contrast = [["heron-all", "heron-natural"]]
baseline = [1981, 2010]
warming  = { levels = [1.5, 2.0], global = "in/{run}_gmst.nc", reference = [1861, 1900] }
)toml";

/// A job on another kind of mesh: `mesh` are its keys below [mesh]; `field` more keys of its one field.
inline std::string job_on(const std::string& mesh, const std::string& field = "", const std::string& output = "") {
  return "[[run]]\nfiles = [\"tas_*.nc\"]\n[[field]]\nvariable = \"tas\"\n" + field + "[mesh]\n" + mesh + "[output]\n" +
         output;
}

}  // namespace job_texts
