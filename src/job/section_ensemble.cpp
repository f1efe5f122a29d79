// [ensemble]: what is computed from the finished products of several runs, and which runs make an ensemble.
#include <fmt/format.h>

#include <algorithm>
#include <cctype>
#include <map>
#include <set>

#include "checks.h"
#include "sections.h"
#include "windrow/text/words.h"

namespace windrow::job {

const Keys kEnsembleKeys{{"statistics", "contrast", "baseline", "warming"}, {}};
const Keys kWarmingKeys{{"levels", "global", "reference"}, {}};

namespace {

const std::vector<std::string> kStatisticWords{"mean", "spread", "quantile:0.1", "agreement"};

EnsembleStatistic statistic_of(const Table& table, const std::string& word, Position at) {
  if (word == "mean") return {StatisticKind::mean, 0, word};
  if (word == "spread") return {StatisticKind::spread, 0, word};
  if (word == "agreement") return {StatisticKind::agreement, 0, word};
  const std::string mark = "quantile:";
  if (word.starts_with(mark)) {
    const auto p = text::parse_number(word.substr(mark.size()));
    if (!p || *p < 0 || *p > 1)
      table.document().fail(
          at, fmt::format("'{}' is no quantile; expected one such as quantile:0.9, from 0 to 1", printable(word)));
    return {StatisticKind::quantile, *p, mark + fmt::format("{}", *p)};
  }
  const std::string nearest = text::nearest_word(word, kStatisticWords);
  table.document().fail(at, fmt::format("unknown statistic '{}'; {}", printable(word),
                                        nearest.empty() ? "expected mean, spread, quantile:P or agreement"
                                                        : "did you mean '" + nearest + "'?"));
}

std::vector<EnsembleStatistic> statistics(const Table& table) {
  std::vector<EnsembleStatistic> out;
  for (const auto& [word, at] : table.texts("statistics")) {
    const EnsembleStatistic made = statistic_of(table, word, at);
    for (const auto& other : out)
      if (other.word == made.word) table.document().fail(at, fmt::format("'{}' is named twice", made.word));
    out.push_back(made);
  }
  return out;
}

std::size_t run_called(const Table& table, const Value& item, const JobSpec& job) {
  if (item.kind != Value::Kind::text)
    table.document().fail(item.at,
                          fmt::format("a run of 'contrast' is {}; expected a name in quotes", kind_name(item)));
  std::vector<std::string> names;
  for (std::size_t i = 0; i < job.runs.size(); ++i) {
    if (job.runs[i].name == item.text) return i;
    names.push_back(job.runs[i].name);
  }
  const std::string nearest = text::nearest_word(item.text, names);
  table.document().fail(item.at, fmt::format("there is no run '{}'; {}", printable(item.text),
                                             nearest.empty() ? "expected " + text::alternatives(names)
                                                             : "did you mean '" + nearest + "'?"));
}

std::vector<std::pair<std::size_t, std::size_t>> contrasts(const Table& table, const JobSpec& job) {
  std::vector<std::pair<std::size_t, std::size_t>> out;
  const Value* value = table.find("contrast");
  if (value == nullptr) return out;
  const std::string expected = "pairs of runs such as [[\"heron-all\", \"heron-natural\"]]";
  if (value->kind != Value::Kind::array) table.wrong_kind("contrast", *value, expected);
  if (value->items.empty()) table.fail("contrast", "'contrast' is empty; expected " + expected);
  for (const Value& pair : value->items) {
    if (pair.kind != Value::Kind::array || pair.items.size() != 2)
      table.document().fail(pair.at, "an entry of 'contrast' is no pair of runs; expected " + expected);
    const std::size_t first = run_called(table, pair.items[0], job), second = run_called(table, pair.items[1], job);
    const RunSpec &a = job.runs[first], &b = job.runs[second];
    if (first == second)
      table.document().fail(pair.items[1].at, fmt::format("run '{}' is contrasted with itself", a.name));
    if (a.family != b.family)
      table.document().fail(
          pair.items[1].at,
          fmt::format("'{}' is of family '{}', '{}' of family '{}'; expected two runs of one family, which share one "
                      "transfer",
                      a.name, a.family, b.name, b.family));
    const std::pair made{first, second};
    if (std::find(out.begin(), out.end(), made) != out.end())
      table.document().fail(pair.at, fmt::format("'{}' and '{}' are contrasted twice", a.name, b.name));
    out.push_back(made);
  }
  return out;
}

std::vector<double> levels(const Table& table) {
  const Value* value = table.find("levels");
  if (value == nullptr) table.missing("levels", "warming levels in kelvin such as [1.5, 2.0]");
  if (value->kind != Value::Kind::array) table.wrong_kind("levels", *value, "an array of numbers");
  if (value->items.empty()) table.fail("levels", "'levels' is empty; expected at least one entry");
  std::vector<double> out;
  for (const Value& item : value->items) {
    const bool number = item.kind == Value::Kind::number || item.kind == Value::Kind::whole;
    if (!number || !(item.number > 0) || item.number > 20)
      table.document().fail(item.at, "an entry of 'levels' is no warming level; expected kelvin above 0, up to 20");
    if (std::find(out.begin(), out.end(), item.number) != out.end())
      table.document().fail(item.at, fmt::format("the level {} is named twice", item.number));
    out.push_back(item.number);
  }
  return out;
}

WarmingSpec warming(const Table& table) {
  WarmingSpec out;
  out.levels = levels(table);
  if (table.has("global")) out.global = table.path("global");
  out.reference = read_years(table, "reference").value_or(std::pair{1850, 1900});
  return out;
}

/// Free text as part of a file name: letters and digits in lower case, everything else a '-'.
std::string slug(const std::string& text) {
  std::string out;
  for (const unsigned char c : text) {
    if (std::isalnum(c) != 0)
      out += static_cast<char>(std::tolower(c));
    else if (!out.empty() && out.back() != '-')
      out += '-';
  }
  while (!out.empty() && out.back() == '-') out.pop_back();
  return out;
}

}  // namespace

EnsembleSpec read_ensemble(const Table& table, const JobSpec& job) {
  EnsembleSpec out;
  out.statistics = statistics(table);
  out.contrasts = contrasts(table, job);
  out.baseline = read_years(table, "baseline");
  if (const auto found = table.table("warming", "'warming' of [ensemble]", kWarmingKeys)) out.warming = warming(*found);
  const bool nothing = out.statistics.empty() && out.contrasts.empty() && !out.baseline && !out.warming;
  if (nothing)
    table.document().fail(table.at(),
                          "[ensemble] asks for nothing; expected 'statistics', 'contrast', 'baseline' or 'warming'");
  for (const auto& statistic : out.statistics)
    if (statistic.kind == StatisticKind::agreement && !out.baseline)
      table.fail("statistics", "'agreement' is that of changes; expected 'baseline', the years they are changes from");
  return out;
}

std::vector<EnsembleGroup> ensemble_groups(const JobSpec& job) {
  std::vector<EnsembleGroup> out;
  for (std::size_t i = 0; i < job.runs.size(); ++i) {
    const auto same = [&](const EnsembleGroup& group) { return group.forcing == job.runs[i].forcing; };
    auto group = std::find_if(out.begin(), out.end(), same);
    if (group == out.end()) group = out.insert(out.end(), {job.runs[i].forcing, "", {}, {}});
    const auto kin = std::find_if(group->runs.begin(), group->runs.end(),
                                  [&](std::size_t k) { return job.runs[k].family == job.runs[i].family; });
    if (kin == group->runs.end()) {
      group->runs.push_back(i);
    } else if (job.runs[i].anchor) {
      group->others.push_back(*kin);
      *kin = i;
    } else {
      group->others.push_back(i);
    }
  }
  std::erase_if(out, [](const EnsembleGroup& group) { return group.runs.size() < 2; });
  for (EnsembleGroup& group : out) {
    const std::string part = slug(group.forcing);
    group.name = out.size() == 1 || part.empty() ? "ensemble" : "ensemble-" + part;
  }
  return out;
}

std::string contrast_name(const JobSpec& job, const std::pair<std::size_t, std::size_t>& pair) {
  return job.runs[pair.first].name + "-minus-" + job.runs[pair.second].name;
}

std::string statistic_part(const EnsembleStatistic& statistic) {
  if (statistic.kind != StatisticKind::quantile) return statistic.word;
  std::string text = fmt::format("{:.10g}", 100 * statistic.p);
  std::replace(text.begin(), text.end(), '.', '_');
  return "q" + text;
}

std::string warming_name(const JobSpec& job, std::size_t run, double level) {
  return fmt::format("{}-warming-{}K", job.runs[run].name, level);
}

std::vector<std::string> ensemble_names(const JobSpec& job) {
  const EnsembleSpec& spec = job.ensemble;
  std::vector<std::string> out;
  for (const auto& pair : spec.contrasts) out.push_back(contrast_name(job, pair));
  for (const RunSpec& run : job.runs)
    if (spec.baseline) out.push_back(run.name + "-anomaly");
  for (const EnsembleGroup& group : ensemble_groups(job))
    for (const auto& statistic : spec.statistics) {
      if (statistic.kind != StatisticKind::agreement) out.push_back(group.name + "-" + statistic_part(statistic));
      if (spec.baseline) out.push_back(group.name + "-anomaly-" + statistic_part(statistic));
    }
  for (std::size_t run = 0; run < job.runs.size(); ++run)
    for (const double level : spec.warming ? spec.warming->levels : std::vector<double>{})
      out.push_back(warming_name(job, run, level));
  return out;
}

void check_ensemble(const Document& document, const Tables& tables, const JobSpec& job) {
  if (!tables.ensemble) return;
  if (!job.ensemble.statistics.empty() && ensemble_groups(job).empty())
    tables.ensemble->fail("statistics",
                          "'statistics' need members; expected runs of at least two families with the same 'forcing'");
  const Position at = tables.output ? tables.output->at("name") : Position{};
  if (job.output.name.find("{run}") == std::string::npos)
    document.fail(at,
                  "products of [ensemble] are told from those of runs by {run}; expected {run} in 'name' of [output]");
  std::set<std::string> taken;
  for (const RunSpec& run : job.runs) taken.insert(run.name);
  for (const std::string& name : ensemble_names(job))
    if (!taken.insert(name).second)
      document.fail(tables.ensemble->at(),
                    fmt::format("two runs or products of [ensemble] would both be called '{}'; expected other names of "
                                "runs or texts of 'forcing'",
                                name));
}

}  // namespace windrow::job
