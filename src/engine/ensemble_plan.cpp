#include "ensemble_plan.h"

#include <fmt/format.h>

#include <algorithm>
#include <set>

#include "calibration.h"
#include "windrow/base/error.h"

namespace windrow::engine {
namespace {

class Planner {
 public:
  Planner(Session& session, const RunProducts& runs) : session_(session), job_(session.job), runs_(runs) {}
  EnsemblePlan plan();

 private:
  SeriesPtr run_series(std::size_t field, std::size_t run);
  template <class Make>
  void attempt(std::size_t field, const std::string& output, Make make);
  void contrasts(std::size_t field);
  void anomalies(std::size_t field);
  void statistics(std::size_t field, const job::EnsembleGroup& group, bool of_anomalies);
  void warming(std::size_t field);
  void warming_of(std::size_t field, std::size_t run, double level);
  void match_steps(EnsembleStage& stage, bool months_of_any_calendar);
  void list_products(EnsembleStage& stage, const std::vector<std::pair<std::string, std::string>>& own,
                     const std::string& further_input = "");
  void add(EnsembleStage stage) {
    const SeriesPtr made = std::make_shared<const Series>(stage.result);
    if (stage.kind == EnsembleKind::anomaly) anomaly_[{stage.field, stage.members.front()->name}] = made;
    out_.stages.push_back(std::move(stage));
  }
  [[nodiscard]] std::string field_name(std::size_t field) const { return job_.fields[field].name; }
  [[nodiscard]] bool timed(std::size_t field);

  Session& session_;
  const job::JobSpec& job_;
  const RunProducts& runs_;
  EnsemblePlan out_;
  std::map<std::pair<std::size_t, std::size_t>, SeriesPtr> series_;
  std::map<std::pair<std::size_t, std::string>, SeriesPtr> anomaly_;  ///< by field and run name
  std::map<std::size_t, GlobalMeans> means_;
};

/// Steps of different runs that stand for the same time have the same key.
std::int64_t key_of(const Series& series, std::size_t step) {
  const calendar::Date& date = series.dates[step];
  if (series.frequency == cf::Frequency::monthly) return std::int64_t{date.year} * 12 + date.month - 1;
  if (series.frequency == cf::Frequency::daily) return series.calendar.day_number(date);
  return series.time[step].time;
}

std::string calendar_word(const calendar::Calendar& calendar) {
  const std::string name = calendar.cf_name();
  return name.empty() ? "one of its own" : name;
}

std::string span_text(const Series& series) {
  return fmt::format("'{}' {} to {}", series.name, calendar::to_string(series.dates.front()),
                     calendar::to_string(series.dates.back()));
}

/// Steps of the years; Error(data) unless each of them is whole.
std::vector<std::size_t> steps_of_years(const Series& series, ensemble::Years years, const std::string& what) {
  std::vector<std::size_t> out;
  std::map<int, double> covered;
  for (std::size_t t = 0; t < series.dates.size(); ++t) {
    const int year = series.dates[t].year;
    if (year < years.first || year > years.last) continue;
    out.push_back(t);
    covered[year] += static_cast<double>(series.time[t].end - series.time[t].begin);
  }
  for (int year = years.first; year <= years.last; ++year) {
    const double length = static_cast<double>(calendar::kDay) * series.calendar.days_in_year(year);
    constexpr double kWhole = 0.99;
    if (covered[year] >= kWhole * length) continue;
    throw Error(Failure::data, fmt::format("run '{}'", series.name),
                fmt::format("its steps {} to {} do not hold all of {}, {}-{}: {} is not whole",
                            calendar::to_string(series.dates.front()), calendar::to_string(series.dates.back()), what,
                            years.first, years.last, year));
  }
  return out;
}

SeriesPtr Planner::run_series(std::size_t field, std::size_t run) {
  auto& known = series_[{field, run}];
  if (known) return known;
  const auto found = runs_.find({field, run});
  if (found == runs_.end()) {
    throw Error(Failure::data, "",
                fmt::format("needs {} of '{}', which cannot be made", field_name(field), job_.runs[run].name));
  }
  const auto& variable = session_.variable(field, run);
  Series series;
  series.name = job_.runs[run].name;
  series.products = found->second;
  series.time = variable.time();
  series.dates = step_dates(variable);
  series.calendar = variable.calendar();
  series.frequency = variable.frequency();
  return known = std::make_shared<const Series>(std::move(series));
}

bool Planner::timed(std::size_t field) {
  for (std::size_t run = 0; run < job_.runs.size(); ++run) {
    if (runs_.contains({field, run})) return session_.variable(field, run).frequency() != cf::Frequency::fixed;
  }
  return true;
}

template <class Make>
void Planner::attempt(std::size_t field, const std::string& output, Make make) {
  try {
    make();
  } catch (const Error& error) {
    if (error.kind() == Failure::interrupted) throw;
    out_.failed.push_back({fmt::format("{} of {}", field_name(field), output), error.what(), error.kind()});
  }
}

void Planner::match_steps(EnsembleStage& stage, bool months_of_any_calendar) {
  const Series& first = *stage.members.front();
  std::map<std::int64_t, std::size_t> count;
  std::vector<std::map<std::int64_t, std::size_t>> place(stage.members.size());
  for (std::size_t m = 0; m < stage.members.size(); ++m) {
    const Series& series = *stage.members[m];
    if (series.frequency != first.frequency) {
      throw Error(Failure::data, stage.name,
                  fmt::format("'{}' and '{}' have different time steps", first.name, series.name));
    }
    const bool free = months_of_any_calendar && first.frequency == cf::Frequency::monthly;
    if (!free && !(series.calendar == first.calendar)) {
      throw Error(Failure::data, stage.name,
                  fmt::format("'{}' has calendar {}, '{}' {}; expected one calendar", first.name,
                              calendar_word(first.calendar), series.name, calendar_word(series.calendar)));
    }
    for (std::size_t t = 0; t < series.dates.size(); ++t) {
      if (place[m].emplace(key_of(series, t), t).second) ++count[key_of(series, t)];
    }
  }
  stage.steps.resize(stage.members.size());
  for (const auto& [key, members] : count) {
    if (members < stage.members.size()) continue;
    for (std::size_t m = 0; m < stage.members.size(); ++m) stage.steps[m].push_back(place[m].at(key));
  }
  const std::size_t common = stage.steps.front().size();
  if (common == 0) {
    std::string spans;
    for (const auto& member : stage.members) spans += (spans.empty() ? "" : ", ") + span_text(*member);
    throw Error(Failure::data, stage.name, "the members have no time step in common: " + spans);
  }
  for (const auto& member : stage.members) {
    if (member->time.size() == common) continue;
    out_.notices.push_back({stage.name, fmt::format("{} of {} steps of '{}' are left out, as not all members have them",
                                                    member->time.size() - common, member->time.size(), member->name)});
  }
  stage.result.calendar = first.calendar;
  stage.result.frequency = first.frequency;
  for (const std::size_t t : stage.steps.front()) {
    stage.result.time.push_back(first.time[t]);
    stage.result.dates.push_back(first.dates[t]);
  }
}

void Planner::list_products(EnsembleStage& stage, const std::vector<std::pair<std::string, std::string>>& own,
                            const std::string& further_input) {
  const bool by_year = job_.output.name.find("{year}") != std::string::npos && stage.kind != EnsembleKind::warming;
  const auto& dates = stage.result.dates;
  for (std::size_t output = 0; output < stage.outputs.size(); ++output) {
    auto told = own;
    if (stage.kind == EnsembleKind::statistics) told.emplace_back("ensemble.statistic", stage.statistics[output].word);
    job::RunSpec named;
    named.name = stage.outputs[output];
    const std::string pattern = job_.output.directory + "/" + job::product_name(job_, job_.fields[stage.field], named);
    stage.settings.push_back(job::ensemble_settings(job_, stage.field, told, job::Effect::encoding));
    for (std::size_t t = 0; t < dates.size();) {
      std::size_t end = t + 1;
      while (end < dates.size() && (!by_year || dates[end].year == dates[t].year)) ++end;
      Product product;
      product.field = stage.field;
      const int year = stage.kind == EnsembleKind::warming ? stage.centre : dates[t].year;
      product.path = with_value(pattern, "{year}", fmt::format("{:04d}", year));
      product.ledger_path = ledger_path(product.path);
      product.span = {t, end, true};
      product.key = Session::key_head(stage.settings.back());
      std::map<std::string, codec::Digest> parts;
      std::set<std::string> origins;
      for (std::size_t m = 0; m < stage.members.size(); ++m) {
        std::vector<std::size_t> needed;
        if (stage.kind != EnsembleKind::warming) {
          needed.assign(stage.steps[m].begin() + static_cast<std::ptrdiff_t>(t),
                        stage.steps[m].begin() + static_cast<std::ptrdiff_t>(end));
        }
        if (m == 0) needed.insert(needed.end(), stage.period_steps.begin(), stage.period_steps.end());
        for (const Product* member : products_holding(*stage.members[m], needed)) {
          parts[member->path] = member->key_digest;
          const auto& behind = member->origins.empty() ? member->inputs : member->origins;
          origins.insert(behind.begin(), behind.end());
        }
      }
      for (const auto& [path, digest] : parts) {
        product.inputs.push_back(path);
        product.key.parts.emplace_back(told_path(path, session_.folder()), digest);
      }
      product.origins.assign(origins.begin(), origins.end());
      if (!further_input.empty()) product.inputs.push_back(further_input);
      session_.judge(product);
      stage.result.products.push_back(std::move(product));
      stage.output_of.push_back(output);
      t = end;
    }
  }
  stage.result.name = stage.outputs.front();
}

void Planner::contrasts(std::size_t field) {
  for (const auto& pair : job_.ensemble.contrasts) {
    attempt(field, job::contrast_name(job_, pair), [&] {
      EnsembleStage stage;
      stage.field = field;
      stage.name = fmt::format("contrast {} minus {} of {}", job_.runs[pair.first].name, job_.runs[pair.second].name,
                               field_name(field));
      stage.members = {run_series(field, pair.first), run_series(field, pair.second)};
      stage.outputs = {job::contrast_name(job_, pair)};
      match_steps(stage, false);
      list_products(stage, {{"ensemble.contrast", stage.outputs.front()}});
      add(std::move(stage));
    });
  }
}

void Planner::anomalies(std::size_t field) {
  const ensemble::Years years{job_.ensemble.baseline->first, job_.ensemble.baseline->second};
  for (std::size_t run = 0; run < job_.runs.size(); ++run) {
    const std::string output = job_.runs[run].name + "-anomaly";
    attempt(field, output, [&] {
      EnsembleStage stage;
      stage.kind = EnsembleKind::anomaly;
      stage.field = field;
      stage.name = fmt::format("anomalies {} of {}", job_.runs[run].name, field_name(field));
      stage.members = {run_series(field, run)};
      stage.outputs = {output};
      stage.period = years;
      stage.period_steps = steps_of_years(*stage.members.front(), years, "the baseline");
      match_steps(stage, false);
      list_products(stage, {{"ensemble.baseline", fmt::format("{} to {}", years.first, years.last)}});
      add(std::move(stage));
    });
  }
}

void Planner::statistics(std::size_t field, const job::EnsembleGroup& group, bool of_anomalies) {
  EnsembleStage stage;
  stage.kind = EnsembleKind::statistics;
  stage.field = field;
  stage.of_anomalies = of_anomalies;
  stage.forcing = group.forcing;
  const std::string label = group.name + (of_anomalies ? "-anomaly" : "");
  for (const auto& statistic : job_.ensemble.statistics) {
    if (statistic.kind == job::StatisticKind::agreement && !of_anomalies) continue;
    stage.statistics.push_back(statistic);
    stage.outputs.push_back(label + "-" + job::statistic_part(statistic));
  }
  if (stage.outputs.empty()) return;
  attempt(field, label, [&] {
    stage.name = fmt::format("statistics {} of {}", label, field_name(field));
    std::string names;
    for (const std::size_t run : group.runs) {
      const auto& name = job_.runs[run].name;
      if (of_anomalies) {
        const auto found = anomaly_.find({field, name});
        if (found == anomaly_.end()) {
          throw Error(Failure::data, "", fmt::format("needs the anomalies of '{}', which cannot be made", name));
        }
        stage.members.push_back(found->second);
      } else {
        stage.members.push_back(run_series(field, run));
      }
      names += (names.empty() ? "" : ", ") + name;
    }
    match_steps(stage, true);
    std::vector<std::pair<std::string, std::string>> own{{"ensemble.members", names},
                                                         {"ensemble.forcing", group.forcing}};
    list_products(stage, own);
    for (const std::size_t run : group.others) {
      out_.notices.push_back(
          {stage.name, fmt::format("'{}' is not a member: its family has one already", job_.runs[run].name)});
    }
    add(std::move(stage));
  });
}

void Planner::warming_of(std::size_t field, std::size_t run, double level) {
  const auto& spec = *job_.ensemble.warming;
  const ensemble::Years reference{spec.reference.first, spec.reference.second};
  if (!means_.contains(run)) means_[run] = global_means(session_, run);
  const auto& means = means_[run];
  const auto& name = job_.runs[run].name;
  const double base = ensemble::reference_mean(means.years, reference, means.place);
  const auto found = ensemble::crossing(means.years, base, level);
  if (!found) {
    out_.notices.push_back({fmt::format("run '{}'", name), fmt::format("does not reach {} K of global warming; it has "
                                                                       "no products at that level",
                                                                       level)});
    return;
  }
  EnsembleStage stage;
  stage.kind = EnsembleKind::warming;
  stage.field = field;
  stage.name = fmt::format("{} K of global warming in {} of {}", level, name, field_name(field));
  stage.members = {run_series(field, run)};
  const Series& series = *stage.members.front();
  if (series.dates.front().year > found->window.first || series.dates.back().year < found->window.last) {
    out_.notices.push_back(
        {fmt::format("run '{}'", name),
         fmt::format(
             "reaches {} K of global warming in {}, but {} is there from {} to {} only; no product of the years "
             "{}-{}",
             level, found->centre, field_name(field), series.dates.front().year, series.dates.back().year,
             found->window.first, found->window.last)});
    return;
  }
  stage.period = found->window;
  stage.period_steps = steps_of_years(series, stage.period, "the years about the warming level");
  stage.level = level;
  stage.centre = found->centre;
  stage.outputs = {job::warming_name(job_, run, level)};
  stage.result.calendar = series.calendar;
  stage.result.frequency = cf::Frequency::monthly;
  for (int month = 1; month <= 12; ++month) stage.result.dates.push_back({found->centre, month, 15});
  stage.result.time.resize(12);
  list_products(stage,
                {{"ensemble.warming.level", fmt::format("{}", level)},
                 {"ensemble.warming.reference", fmt::format("{} to {}", reference.first, reference.last)},
                 {"ensemble.warming.window", fmt::format("{} to {}", stage.period.first, stage.period.last)}},
                spec.global.empty() ? "" : for_run(spec.global, job_.runs[run]));
  add(std::move(stage));
}

void Planner::warming(std::size_t field) {
  for (std::size_t run = 0; run < job_.runs.size(); ++run) {
    for (const double level : job_.ensemble.warming->levels) {
      attempt(field, job::warming_name(job_, run, level), [&] { warming_of(field, run, level); });
    }
  }
}

EnsemblePlan Planner::plan() {
  const auto& spec = job_.ensemble;
  for (std::size_t field = 0; field < job_.fields.size(); ++field) {
    if (!timed(field)) continue;
    contrasts(field);
    if (spec.baseline) anomalies(field);
    for (const auto& group : job::ensemble_groups(job_)) {
      statistics(field, group, false);
      if (spec.baseline) statistics(field, group, true);
    }
    if (spec.warming) warming(field);
  }
  return std::move(out_);
}

}  // namespace

std::vector<const Product*> products_holding(const Series& series, const std::vector<std::size_t>& steps) {
  std::set<std::size_t> wanted(steps.begin(), steps.end());
  std::vector<const Product*> out;
  for (const Product& product : series.products) {
    const auto next = wanted.lower_bound(product.span.t0);
    if (next != wanted.end() && *next < product.span.t1) out.push_back(&product);
  }
  return out;
}

EnsemblePlan plan_ensemble(Session& session, const RunProducts& runs) { return Planner(session, runs).plan(); }

}  // namespace windrow::engine
