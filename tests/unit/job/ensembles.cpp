// What [ensemble] is read as: members, names, settings.
#include <doctest/doctest.h>

#include "job_texts.h"
#include "windrow/job/spec.h"

using namespace windrow::job;

TEST_CASE("every key of [ensemble] is read") {
  const JobSpec job = parse_job("/proj/job.toml", job_texts::kEnsemble, {});
  const EnsembleSpec& spec = job.ensemble;
  REQUIRE(spec.statistics.size() == 5);
  CHECK(spec.statistics[0].kind == StatisticKind::mean);
  CHECK(spec.statistics[3].kind == StatisticKind::quantile);
  CHECK(spec.statistics[3].p == 0.975);
  CHECK(spec.contrasts == std::vector<std::pair<std::size_t, std::size_t>>{{0, 1}});
  CHECK(spec.baseline == std::pair{1981, 2010});
  REQUIRE(spec.warming.has_value());
  CHECK(spec.warming->levels == std::vector<double>{1.5, 2});
  CHECK(spec.warming->global == "/proj/in/{run}_gmst.nc");
  CHECK(spec.warming->reference == std::pair{1861, 1900});
}

TEST_CASE("products of [ensemble] are named after what they are") {
  const JobSpec job = parse_job("/proj/job.toml", job_texts::kEnsemble, {});
  CHECK(ensemble_names(job) ==
        std::vector<std::string>{"heron-all-minus-heron-natural", "heron-all-anomaly", "heron-natural-anomaly",
                                 "plover-all-anomaly", "ensemble-mean", "ensemble-anomaly-mean", "ensemble-spread",
                                 "ensemble-anomaly-spread", "ensemble-q10", "ensemble-anomaly-q10", "ensemble-q97_5",
                                 "ensemble-anomaly-q97_5", "ensemble-anomaly-agreement", "heron-all-warming-1.5K",
                                 "heron-all-warming-2K", "heron-natural-warming-1.5K", "heron-natural-warming-2K",
                                 "plover-all-warming-1.5K", "plover-all-warming-2K"});
}

TEST_CASE("an ensemble has one member a family: the anchor run where it has the forcing, else the first") {
  const auto run = [](const std::string& name, const std::string& family, const std::string& forcing, bool anchor) {
    return "[[run]]\nname = \"" + name + "\"\nfamily = \"" + family + "\"\nforcing = \"" + forcing + "\"\nfiles = \"" +
           name + ".nc\"\n" + (anchor ? "anchor = true\n" : "");
  };
  const std::string text =
      run("h1", "heron", "all", false) + run("h2", "heron", "all", true) + run("hn1", "heron", "natural", false) +
      run("hn2", "heron", "natural", false) + run("p1", "plover", "all", true) + run("pn", "plover", "natural", false) +
      run("s1", "stilt", "future", true) + job_texts::kShortest.substr(job_texts::kShortest.find("[[field]]"));
  const auto groups = ensemble_groups(parse_job("/proj/job.toml", text, {}));
  REQUIRE(groups.size() == 2);  // one family alone makes no ensemble
  CHECK(groups[0].name == "ensemble-all");
  CHECK(groups[0].runs == std::vector<std::size_t>{1, 4});
  CHECK(groups[0].others == std::vector<std::size_t>{0});
  CHECK(groups[1].name == "ensemble-natural");
  CHECK(groups[1].runs == std::vector<std::size_t>{2, 5});
  CHECK(groups[1].others == std::vector<std::size_t>{3});
}
