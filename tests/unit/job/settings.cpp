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
std::string filled_template() {
  std::istringstream in(template_text("grid"));
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

TEST_CASE("the job file to start from is a right one, and stays right with all its settings put in") {
  const JobSpec job = parse_job("/proj/job.toml", template_text("grid"), {});
  CHECK(job.fields[0].variable == "tas");
  const JobSpec filled = parse_job("/proj/job.toml", filled_template(), {});
  CHECK(filled.stations.given);
  CHECK(filled.fields[0].terrain.has_value());
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

TEST_CASE("the job file to start from names every key of this version") {
  const std::string text = template_text("grid");
  for (const Keys* keys : {&kJobKeys, &kRunKeys, &kFieldKeys, &kMeshKeys, &kStationKeys, &kReachKeys, &kOutputKeys})
    for (const std::string& key : keys->known) {
      CAPTURE(key);
      CHECK((text.find(key + " ") != std::string::npos || text.find("." + key + "]") != std::string::npos));
    }
}

TEST_CASE("a kind of job that cannot be started from is refused") {
  CHECK_THROWS_WITH(template_text("towns"), "new: 'towns' is not in this version; expected grid");
  CHECK_THROWS_WITH(template_text("gird"), "new: unknown kind of job 'gird'; expected grid");
}
