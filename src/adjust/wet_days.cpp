// Wet-day frequency both ways (too many: Schmidli et al. 2006, IJC 26:679, a threshold of the model's own; too few:
// Themessl et al. 2012, 10.1007/s10584-011-0224-4, dry days made wet) and the amounts of wet days.
#include "wet_days.h"

#include <algorithm>
#include <cmath>
#include <limits>

#include "blend.h"
#include "det_exp.h"
#include "ranking.h"
#include "station_shape.h"
#include "windrow/stats/gamma.h"
#include "windrow/stats/stats.h"

namespace windrow::adjust {
namespace {

constexpr double kNoNumber = std::numeric_limits<double>::quiet_NaN();

/// Mapped by the value itself, in the anchor's distribution, amount to amount; else by its rank in the run's own
/// window, as a ratio.
bool by_value(const Setup& setup) { return setup.maps_quantiles() && setup.method != Method::quantile_delta_mapping; }

/// F_o^-1(F_m(x)) between nodes, linear in the value; beyond the outermost ones their ratio.
double mapped(const NodeRow& row, const double* ratio, double x) {
  const std::span<const double> node = row.nodes();
  if (x < node.front()) return x * ratio[0];
  if (x > node.back()) return x * ratio[node.size() - 1];
  const Between b = row.between(x);
  const double from = node[b.node] * ratio[b.node], to = node[b.node + 1] * ratio[b.node + 1];
  return from + b.weight * (to - from);
}

/// tau among the drawn days of the one at `place` of `count`.
double drawn_tau(std::size_t place, std::size_t count) {
  return (static_cast<double>(place) + 0.5) / static_cast<double>(count);
}

/// One season of one cell.
class Season {
 public:
  Season(const Setup& setup, const RowClimate& climate, const CellTarget& target, std::size_t season, Correction& out)
      : setup_(setup),
        target_(target),
        sample_(climate.sample[season]),
        season_(season),
        fade_(target.shape.empty() ? 0 : target.fade_shape),
        mean_(climate.mean[season] * season_ratio(setup, climate, target, season, out.capped)),
        out_(out) {}

  WetSplit split() const {
    if (setup_.first_node() == 0) {
      WetSplit all;
      all.threshold = std::numeric_limits<double>::min();
      all.below =
          static_cast<std::size_t>(std::lower_bound(sample_.begin(), sample_.end(), all.threshold) - sample_.begin());
      return all;
    }
    const double own = wet_share(sample_, setup_.wet_day);
    const std::size_t i = season_ * setup_.width();
    const double odds = own / (1 - own);
    const double near = (setup_.carry_target ? 1 : odds) * det_exp(at(target_.shape, i));
    const double far = odds * det_exp(at(target_.mean_correction_shape, i));
    const double p = blend(fade_, near / (1 + near), far / (1 + far));
    return split_wet(setup_, sample_, p);
  }

  /// The ratio that gives the season its mean: mean-ratio.
  void scale(const WetSplit& split) {
    double sum = 0;
    for (std::size_t i = split.below; i < sample_.size(); ++i) sum += sample_[i];
    const double rest = static_cast<double>(split.drawn) * setup_.wet_day + dry_sum(split);
    const double ratio = (mean_ * static_cast<double>(sample_.size()) - rest) / sum;
    out_.table[season_] = sum > 0 ? capped(setup_, std::max(0.0, ratio), out_.capped) : 1;
    fill(amounts(), setup_.wet_day);
  }

  /// Ratios at the nodes of the wet days: the quantile methods.
  void map(const WetSplit& split) {
    const std::size_t n = nodes();
    const std::span<const double> wet(sample_.data() + split.below, sample_.size() - split.below);
    if (wet.empty() || !(mean_ == mean_)) {
      fill(std::span(out_.table).subspan(season_ * n, n), 1);
      fill(amounts(), setup_.wet_day);
      return;
    }
    set_own(wet);
    set_target();
    const double share = static_cast<double>(split.drawn) / static_cast<double>(split.drawn + wet.size());
    placed_.resize(n);
    drawn_.resize(n);
    for (std::size_t k = 0; k < n; ++k) {
      placed_[k] = at_tau(wanted_, share + (1 - share) * node_tau(k, n));
      drawn_[k] = at_tau(wanted_, share * node_tau(k, n));
    }
    weigh(wet);
    drawn_weight_.assign(n, 0.0);
    for (std::size_t i = 0; i < split.drawn; ++i) {
      const Between b = between_nodes(drawn_tau(i, split.drawn), n);
      drawn_weight_[b.node] += 1 - b.weight;
      drawn_weight_[b.node + 1] += b.weight;
    }
    reset(split);
    if (by_value(setup_)) std::copy(own_.begin(), own_.end(), out_.node.begin() + offset());
  }

  /// Dry days keep their values, unless the model has too many wet days or too few.
  [[nodiscard]] static bool keeps_dry(const WetSplit& split) { return split.drawn == 0 && split.excess == 0; }

 private:
  [[nodiscard]] double dry_sum(const WetSplit& split) const {
    double sum = 0;
    for (std::size_t i = 0; keeps_dry(split) && i < split.below; ++i) sum += sample_[i];
    return sum;
  }
  [[nodiscard]] std::size_t nodes() const { return static_cast<std::size_t>(setup_.quantiles); }
  [[nodiscard]] std::ptrdiff_t offset() const { return static_cast<std::ptrdiff_t>(season_ * nodes()); }
  [[nodiscard]] std::span<double> amounts() const {
    return std::span(out_.drawn_amount).subspan(season_ * nodes(), nodes());
  }
  static void fill(std::span<double> values, double value) { std::fill(values.begin(), values.end(), value); }

  void set_own(std::span<const double> wet) {
    own_.resize(nodes());
    const bool gamma = setup_.method == Method::gamma_mapping && wet.front() < wet.back();
    const stats::Gamma fit = gamma ? stats::fit_gamma(wet) : stats::Gamma{};
    for (std::size_t k = 0; k < own_.size(); ++k) {
      const double tau = node_tau(k, own_.size());
      own_[k] = gamma ? stats::gamma_quantile(fit, tau) : stats::quantile(wet, tau, 7);
      if (k > 0) own_[k] = std::max(own_[k], own_[k - 1]);
    }
  }

  void set_target() {
    const std::size_t first = season_ * setup_.width() + setup_.first_node();
    const double level = at(target_.level, season_);
    wanted_.resize(nodes());
    for (std::size_t k = 0; k < wanted_.size(); ++k) {
      const double carried = at(target_.shape, first + k);
      const double near = setup_.carry_target ? det_exp(level + carried) : own_[k] * det_exp(carried);
      wanted_[k] = blend(fade_, near, own_[k] * det_exp(at(target_.mean_correction_shape, first + k)));
    }
    out_.reordered += stats::make_non_decreasing(wanted_);
  }

  /// Sum of the wet values' amounts = sum over nodes of weight * ratio: both ways of mapping are linear in the ratios.
  void weigh(std::span<const double> wet) {
    weight_.assign(nodes(), 0.0);
    NodeRow row;
    if (by_value(setup_)) row.set(own_);
    for (std::size_t i = 0; i < wet.size(); ++i) {
      const double x = wet[i];
      if (!by_value(setup_)) {
        const Between b =
            between_nodes(wet.size() > 1 ? static_cast<double>(i) / static_cast<double>(wet.size() - 1) : 0.5, nodes());
        weight_[b.node] += x * (1 - b.weight);
        weight_[b.node + 1] += x * b.weight;
      } else if (x < own_.front() || x > own_.back()) {
        weight_[x < own_.front() ? 0 : own_.size() - 1] += x;
      } else {
        const Between b = row.between(x);
        weight_[b.node] += own_[b.node] * (1 - b.weight);
        weight_[b.node + 1] += own_[b.node + 1] * b.weight;
      }
    }
  }

  /// One factor on all wet targets, so that the calibration days have the level's mean; wet days stay wet (wet_day at
  /// least) and ratios within their caps, which is why it takes several steps.
  void reset(const WetSplit& split) {
    constexpr int kMost = 60;
    constexpr double kEnough = 1e-13;
    const std::size_t n = nodes();
    const std::span<double> ratio = std::span(out_.table).subspan(season_ * n, n);
    const double wanted = mean_ * static_cast<double>(sample_.size()) - dry_sum(split);
    const double low = 1 / setup_.max_ratio, high = setup_.max_ratio;
    // A gamma distribution begins at zero, so its lowest quantiles are no wet days on either side.
    const double least = setup_.method == Method::gamma_mapping ? 0 : setup_.wet_day;
    double factor = 1;
    for (int step = 0; step < kMost; ++step) {
      double sum = 0;
      for (std::size_t k = 0; k < n; ++k) {
        const double r = std::max(factor * placed_[k], least) / own_[k];
        ratio[k] = std::clamp(r, low, high);
        sum += weight_[k] * ratio[k];
        amounts()[k] = std::max(factor * drawn_[k], least);
        sum += drawn_weight_[k] * amounts()[k];
      }
      if (!(sum > 0) || std::abs(wanted / sum - 1) < kEnough) break;
      factor *= wanted / sum;
    }
    for (const double r : ratio) out_.capped += r == low || r == high ? 1 : 0;
  }

  const Setup& setup_;
  const CellTarget& target_;
  const std::vector<double>& sample_;
  std::size_t season_;
  double fade_, mean_;
  Correction& out_;
  std::vector<double> own_, wanted_, placed_, drawn_, weight_, drawn_weight_;
};

/// The random field on the calibration days to be made wet: the lowest of the dry ones.
void choose_days(const Steps& steps, std::span<const double> series, std::size_t season, const WetSplit& split,
                 const CellDraws& draws, std::vector<double>& chosen) {
  for (std::uint32_t i = steps.sample.start[season]; i < steps.sample.start[season + 1]; ++i) {
    const std::uint32_t t = steps.sample.step[i];
    if (series[t] < split.threshold) chosen.push_back(draws(t));
  }
  std::sort(chosen.begin(), chosen.end());
  if (chosen.size() > split.drawn) chosen.resize(split.drawn);
}

/// Values below the threshold in every sample that places refer to.
std::vector<std::size_t> dry_counts(const std::vector<std::vector<double>>& samples, const Correction& correction) {
  std::vector<std::size_t> out;
  const std::size_t seasons = correction.threshold.size();
  for (std::size_t g = 0; g < samples.size(); ++g) {
    out.push_back(static_cast<std::size_t>(
        std::lower_bound(samples[g].begin(), samples[g].end(), correction.threshold[g % seasons]) -
        samples[g].begin()));
  }
  return out;
}

}  // namespace

void make_wet_correction(const Setup& setup, const Steps& anchor_steps, const RowClimate& climate,
                         std::span<const double> anchor_series, const CellTarget& target, const CellDraws* draws,
                         Correction& out) {
  const std::size_t seasons = climate.mean.size();
  const auto n = static_cast<std::size_t>(setup.quantiles);
  out.table.assign(setup.maps_quantiles() ? seasons * n : seasons, kNoNumber);
  out.threshold.assign(seasons, kNoNumber);
  out.dry_factor.assign(seasons, 1.0);
  out.drawn_below.assign(seasons, {});
  out.drawn_amount.assign(seasons * n, setup.wet_day);
  if (by_value(setup)) out.node.assign(seasons * n, 1.0);
  for (std::size_t s = 0; s < seasons; ++s) {
    if (climate.sample[s].empty()) continue;
    Season season(setup, climate, target, s, out);
    WetSplit split = season.split();
    if (draws == nullptr) split.drawn = 0;
    out.threshold[s] = split.threshold;
    out.dry_factor[s] = Season::keeps_dry(split) ? 1 : 0;
    if (setup.maps_quantiles()) {
      season.map(split);
    } else {
      season.scale(split);
    }
    if (split.drawn > 0) choose_days(anchor_steps, anchor_series, s, split, *draws, out.drawn_below[s]);
  }
}

void evaluate_wet(const Setup& setup, const Steps& steps, std::span<const double> series, const Ranks& ranks,
                  const Correction& correction, const CellDraws* draws, std::span<double> out) {
  const std::size_t seasons = correction.threshold.size();
  const auto n = static_cast<std::size_t>(setup.quantiles);
  const bool own_windows = setup.method == Method::quantile_delta_mapping;
  const std::vector<std::size_t> dry = dry_counts(ranks.sample, correction);
  std::vector<NodeRow> rows(by_value(setup) ? seasons : 0);
  for (std::size_t s = 0; s < rows.size(); ++s) rows[s].set(std::span(correction.node).subspan(s * n, n));
  for (std::size_t t = 0; t < series.size(); ++t) {
    const double x = series[t];
    const auto s = static_cast<std::size_t>(steps.season[t]);
    if (!(x == x) || !(correction.threshold[s] == correction.threshold[s])) {
      out[t] = kNoNumber;
      continue;
    }
    if (x < correction.threshold[s]) {
      const std::vector<double>& below = correction.drawn_below[s];
      out[t] = x * correction.dry_factor[s];
      if (below.empty() || draws == nullptr) continue;
      const double field = (*draws)(t);
      if (field > below.back()) continue;
      const auto place = static_cast<std::size_t>(std::lower_bound(below.begin(), below.end(), field) - below.begin());
      out[t] = at_tau(std::span(correction.drawn_amount).subspan(s * n, n), drawn_tau(place, below.size()));
      continue;
    }
    if (!setup.maps_quantiles()) {
      out[t] = x * correction.table[s];
      continue;
    }
    const double* ratio = correction.table.data() + s * n;
    if (!own_windows) {
      const double change = ranks.change.empty() ? 1 : ranks.change[t];
      out[t] = change * mapped(rows[s], ratio, x / change);
      continue;
    }
    const std::size_t g = static_cast<std::size_t>(steps.window[t]) * seasons + s;
    const std::size_t wet = ranks.sample[g].size() - dry[g];
    const Between b =
        between_nodes(wet > 1 ? (ranks.place[t] - static_cast<double>(dry[g])) / static_cast<double>(wet - 1) : 0.5, n);
    out[t] = x * (ratio[b.node] + b.weight * (ratio[b.node + 1] - ratio[b.node]));
  }
}

}  // namespace windrow::adjust
