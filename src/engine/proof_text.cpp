#include "proof_text.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

namespace windrow::engine {
namespace {

constexpr std::array<const char*, 12> kMonths = {"January", "February", "March",     "April",   "May",      "June",
                                                 "July",    "August",   "September", "October", "November", "December"};

std::string number(double value) { return std::isnan(value) ? "-" : fmt::format("{:.2f}", value); }
std::string three(double value) { return std::isnan(value) ? "-" : fmt::format("{:.3g}", value); }

/// Cells padded to their columns' widths: the first column to the left, the others to the right.
std::string table(const std::vector<std::vector<std::string>>& rows) {
  std::vector<std::size_t> width;
  for (const auto& row : rows) {
    width.resize(std::max(width.size(), row.size()));
    for (std::size_t c = 0; c < row.size(); ++c) width[c] = std::max(width[c], row[c].size());
  }
  std::string out;
  for (const auto& row : rows) {
    out += " ";
    for (std::size_t c = 0; c < row.size(); ++c) {
      out += c == 0 ? fmt::format(" {:<{}}", row[c], width[c]) : fmt::format("  {:>{}}", row[c], width[c]);
    }
    out += "\n";
  }
  return out;
}

const DesignScores& verdict(const FieldProof& proof) { return proof.designs[proof.verdict]; }

std::size_t daily_stations(const FieldProof& proof) {
  const auto& seasons = verdict(proof).seasons;
  return seasons.empty() ? 0 : seasons.front().stations.size();
}

std::string months_by_version(const FieldProof& proof, const DesignScores& design) {
  std::vector<std::vector<std::string>> rows(14);
  rows[0] = {""};
  for (std::size_t m = 0; m < 12; ++m) rows[m + 1] = {kMonths[m]};
  rows[13] = {"mean of the months"};
  for (const auto& column : design.months) {
    rows[0].push_back(column.version);
    for (std::size_t m = 0; m < 12; ++m) rows[m + 1].push_back(number(column.errors.mean_absolute[m]));
    rows[13].push_back(number(column.errors.mean_absolute_mean));
  }
  const auto& adjusted = design.months.back().errors;
  rows[0].insert(rows[0].end(), {"bias of adjusted", "stations"});
  for (std::size_t m = 0; m < 12; ++m) {
    rows[m + 1].push_back(number(adjusted.bias[m]));
    rows[m + 1].push_back(fmt::format("{}", adjusted.stations[m]));
  }
  rows[13].push_back(number(adjusted.bias_mean));
  return fmt::format("Means of months, {}: mean absolute error over the stations, {}\n{}", design.design.name(),
                     proof.units, table(rows));
}

std::string months_by_design(const FieldProof& proof) {
  std::vector<std::vector<std::string>> rows{{"", "raw", "height alone", "adjusted", "bias of adjusted"}};
  for (const auto& design : proof.designs) {
    const auto& last = design.months.back().errors;
    rows.push_back({design.design.name(), number(design.months[0].errors.mean_absolute_mean),
                    number(design.months[1].errors.mean_absolute_mean), number(last.mean_absolute_mean),
                    number(last.bias_mean)});
  }
  return fmt::format("Means of months by what is left out: mean absolute error over months and stations, {}\n{}",
                     proof.units, table(rows));
}

bool is_main(const FieldProof& proof, scores::Score score) {
  const auto main = scores::main_scores(proof.options.quantity);
  return std::find(main.begin(), main.end(), score) != main.end();
}

std::string days_table(const FieldProof& proof, const DesignScores& design) {
  std::vector<std::vector<std::string>> rows{
      {"season", "score", "raw", "height alone", "adjusted", "better than height alone by", "verdict"}};
  for (const auto& season : design.seasons) {
    for (const auto& c : season.comparisons) {
      if (!is_main(proof, c.score)) continue;
      rows.push_back({season.season.name, scores::name(c.score), three(c.raw), three(c.height), three(c.adjusted),
                      fmt::format("{} ({} to {})", three(c.over_height), three(c.over_height_interval.low),
                                  three(c.over_height_interval.high)),
                      scores::words(c.verdict)});
    }
  }
  return fmt::format("Days, {}: how far off, mean over {} stations, {} (Perkins: shares); 90 % intervals\n{}",
                     design.design.name(), daily_stations(proof), proof.score_units, table(rows));
}

/// What means of months allow to be said: by how much, but not how surely.
std::string months_sentence(const FieldProof& proof, const DesignScores& design) {
  const auto mean = [&design](std::size_t k) { return design.months[k].errors.mean_absolute_mean; };
  const double raw = mean(0), height = mean(1), adjusted = mean(design.months.size() - 1);
  const auto& counts = design.months.back().errors.stations;
  const int stations = *std::max_element(counts.begin(), counts.end());
  if (stations == 0) {
    return fmt::format("{}, means of months, {}: sample too small: no station has one", proof.field,
                       design.design.name());
  }
  return fmt::format(
      "{}, means of months, {}: {:.2f} {} off instead of {:.2f} {} with height adjustment alone "
      "({:.2f} {} raw); {} stations; without an interval, as normals have no years to draw from",
      proof.field, design.design.name(), adjusted, proof.units, height, proof.units, raw, proof.units, stations);
}

std::vector<std::string> verdict_sentences(const FieldProof& proof) {
  std::vector<std::string> out;
  const auto& design = verdict(proof);
  for (const auto& season : design.seasons) {
    out.push_back(scores::overall_sentence(season.comparisons, proof.field, season.season, proof.options));
  }
  if (design.seasons.empty()) {
    out.push_back(months_sentence(proof, proof.designs.front()));
    out.push_back(months_sentence(proof, design));
    out.push_back(
        fmt::format("{}: sample too small for scores of days: no station has a daily series beside a daily "
                    "run",
                    proof.field));
  }
  if (proof.years.size() < 2) {
    out.push_back(fmt::format("{}: sample too small for split periods: run and stations have {} in common", proof.field,
                              proof.years.empty() ? "no year" : "one year"));
  }
  return out;
}

std::string points_text(const FieldProof& proof) {
  std::string out;
  if (!proof.points.likeness.empty()) {
    std::vector<std::vector<std::string>> rows{{"season", "distance, km", "pairs", "observed", "adjusted"}};
    for (const auto& season : proof.points.likeness) {
      for (const auto& bin : season.bins) {
        rows.push_back({season.season.name, fmt::format("{:.0f} to {:.0f}", bin.from_m / 1000, bin.to_m / 1000),
                        fmt::format("{}", bin.pairs), number(bin.observed), number(bin.modelled)});
      }
    }
    out += "Points: correlation of days between stations, " + proof.designs.front().design.name() + "\n" + table(rows);
  }
  for (const auto& [group, area] : proof.points.areas) {
    if (area.sentence.rfind("year,", 0) == 0) out += fmt::format("{}, {}: {}\n", proof.field, group, area.sentence);
  }
  return out;
}

report::Fact list(const std::string& label) {
  report::Fact out(label);
  out.list = true;
  return out;
}

report::Fact months_fact(const MonthColumn& column) {
  report::Fact out("");
  out.add({"version", column.version});
  out.add({"mean absolute error", column.errors.mean_absolute_mean});
  out.add({"bias", column.errors.bias_mean});
  auto& months = out.add(list("months"));
  for (std::size_t m = 0; m < 12; ++m) {
    auto& month = months.add(report::Fact(""));
    month.add({"month", kMonths[m]});
    month.add({"mean absolute error", column.errors.mean_absolute[m]});
    month.add({"bias", column.errors.bias[m]});
    month.add({"stations", static_cast<std::int64_t>(column.errors.stations[m])});
  }
  return out;
}

report::Fact season_fact(const FieldProof& proof, const SeasonScores& season) {
  report::Fact out("");
  out.add({"season", season.season.name});
  out.add({"verdict", scores::words(scores::overall(season.comparisons, proof.options.quantity))});
  auto& all = out.add(list("scores"));
  for (const auto& c : season.comparisons) {
    auto& fact = all.add(report::Fact(""));
    fact.add({"score", scores::name(c.score)});
    fact.add({"main", is_main(proof, c.score)});
    fact.add({"stations", static_cast<std::int64_t>(c.stations)});
    fact.add({"left out", static_cast<std::int64_t>(c.left_out)});
    fact.add({"years", static_cast<std::int64_t>(c.years)});
    fact.add({"raw", c.raw});
    fact.add({"height", c.height});
    fact.add({"adjusted", c.adjusted});
    fact.add({"over height", c.over_height});
    fact.add({"over height low", c.over_height_interval.low});
    fact.add({"over height high", c.over_height_interval.high});
    fact.add({"over raw", c.over_raw});
    fact.add({"over raw low", c.over_raw_interval.low});
    fact.add({"over raw high", c.over_raw_interval.high});
    fact.add({"verdict", scores::words(c.verdict)});
    fact.add({"sentence", scores::sentence(c, proof.field, season.season, proof.score_units)});
  }
  return out;
}

report::Fact estimate_fact(const std::string& label, const scores::Estimate& estimate) {
  report::Fact out(label);
  out.add({"ratio", estimate.value.value});
  out.add({"low", estimate.interval.low});
  out.add({"high", estimate.interval.high});
  return out;
}

void add_points(const FieldProof& proof, report::Fact& fact) {
  auto& likeness = fact.add(list("correlation by distance"));
  for (const auto& season : proof.points.likeness) {
    for (const auto& bin : season.bins) {
      auto& one = likeness.add(report::Fact(""));
      one.add({"season", season.season.name});
      one.add({"from m", bin.from_m});
      one.add({"to m", bin.to_m});
      one.add({"pairs", static_cast<std::int64_t>(bin.pairs)});
      one.add({"observed", bin.observed});
      one.add({"adjusted", bin.modelled});
    }
  }
  auto& areas = fact.add(list("areas"));
  for (const auto& [group, area] : proof.points.areas) {
    auto& one = areas.add(report::Fact(""));
    one.add({"group", group});
    one.add({"stations", static_cast<std::int64_t>(area.stations)});
    one.add({"years", static_cast<std::int64_t>(area.years)});
    one.add(estimate_fact("variance", area.variance));
    one.add(estimate_fact("95th percentile", area.percentile_95));
    one.add(estimate_fact("yearly maximum", area.yearly_maximum));
    one.add({"sentence", area.sentence});
  }
}

/// A value that a comma or a quote must not take apart.
std::string quoted(const std::string& text) {
  if (text.find_first_of(",\"\n") == std::string::npos) return text;
  std::string out = "\"";
  for (const char c : text) out += c == '"' ? std::string("\"\"") : std::string(1, c);
  return out + "\"";
}

std::string csv_number(double value) { return std::isnan(value) ? "" : fmt::format("{:.10g}", value); }

}  // namespace

std::string text_of(const FieldProof& proof) {
  std::string out = fmt::format("{}, family {}, calibrated on {}: {} stations, {} with daily series", proof.field,
                                proof.family, proof.run, proof.stations.size(), daily_stations(proof));
  if (!proof.years.empty()) {
    out += fmt::format("; {} years in common with the run, {} to {}", proof.years.size(), proof.years.front(),
                       proof.years.back());
  }
  out += "\n\n" + months_by_version(proof, proof.designs.front()) + "\n" + months_by_design(proof) + "\n";
  if (!verdict(proof).seasons.empty()) out += days_table(proof, verdict(proof)) + "\n";
  const std::string points = points_text(proof);
  if (!points.empty()) out += points + "\n";
  for (const auto& sentence : verdict_sentences(proof)) out += sentence + "\n";
  return out + "\n";
}

report::Fact facts_of(const FieldProof& proof) {
  report::Fact out("");
  out.add({"field", proof.field});
  out.add({"family", proof.family});
  out.add({"run", proof.run});
  out.add({"units", proof.units});
  out.add({"score units", proof.score_units});
  out.add({"stations", static_cast<std::int64_t>(proof.stations.size())});
  out.add({"daily stations", static_cast<std::int64_t>(daily_stations(proof))});
  out.add({"years", static_cast<std::int64_t>(proof.years.size())});
  out.add({"verdict rests on", verdict(proof).design.name()});
  auto& sentences = out.add(list("verdict"));
  for (const auto& sentence : verdict_sentences(proof)) sentences.add({"", sentence});
  auto& designs = out.add(list("designs"));
  for (const auto& design : proof.designs) {
    auto& fact = designs.add(report::Fact(""));
    fact.add({"left out", design.design.name()});
    auto& months = fact.add(list("means of months"));
    for (const auto& column : design.months) months.add(months_fact(column));
    auto& seasons = fact.add(list("seasons"));
    for (const auto& season : design.seasons) {
      if (!season.comparisons.empty()) seasons.add(season_fact(proof, season));
    }
  }
  add_points(proof, out);
  return out;
}

std::string csv_heading() {
  return "field,family,run,left_out,station,season,score,observed,raw,height,adjusted,low,high\n";
}

std::string csv_of(const FieldProof& proof) {
  std::string out;
  for (const auto& design : proof.designs) {
    const auto add = [&](std::size_t station, const std::string& season, const std::string& score, double observed,
                         std::array<double, 5> values) {
      out += fmt::format("{},{},{},{},{},{},{},{}", quoted(proof.field), quoted(proof.family), quoted(proof.run),
                         quoted(design.design.name()), quoted(proof.stations[station]), season, quoted(score),
                         csv_number(observed));
      for (const double value : values) out += "," + csv_number(value);
      out += "\n";
    };
    const auto error = [&design](std::size_t column, std::size_t i, std::size_t m) {
      const auto& station = design.months[column].stations[i];
      return station.modelled[m] - station.observed[m];
    };
    for (std::size_t i = 0; i < proof.stations.size(); ++i) {
      for (std::size_t m = 0; m < 12; ++m) {
        const double none = std::nan("");
        add(i, kMonths[m], "bias of monthly mean", design.months.front().stations[i].observed[m],
            {error(0, i, m), error(1, i, m), error(design.months.size() - 1, i, m), none, none});
      }
    }
    for (const auto& season : design.seasons) {
      for (const auto& station : season.stations) {
        for (std::size_t s = 0; s < scores::kScores; ++s) {
          const auto score = static_cast<scores::Score>(s);
          const auto& adjusted = station.adjusted.score[s];
          const bool interval = !station.adjusted.too_small;
          if (std::isnan(adjusted.value.value)) continue;
          add(station.station, season.season.name, scores::name(score), adjusted.value.observed,
              {station.raw[s].value, station.height[s].value, adjusted.value.value,
               interval ? adjusted.interval.low : std::nan(""), interval ? adjusted.interval.high : std::nan("")});
        }
      }
    }
  }
  return out;
}

}  // namespace windrow::engine
