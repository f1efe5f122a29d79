// Variogram models and their fit to stations' values. No shares; the drift stands in drift.cpp.
#include "windrow/reach/variogram.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <numbers>
#include <numeric>

#include "rows.h"
#include "windrow/base/error.h"

namespace windrow::reach {
namespace {

constexpr std::size_t kFewestStations = 8, kFewestBins = 4, kMostBins = 100, kPairsPerBin = 30;
constexpr int kRanges = 60, kPasses = 5, kSections = 40;
/// A partial sill below this part of the sill is no structure.
constexpr double kLeastStructure = 0.05;
constexpr double kRangeOfOnePlace_m = 100e3;
constexpr double kFallbackNugget = 0.1;

struct Pair {
  double distance;  ///< as the model takes it
  std::size_t a, b;
  bool operator<(const Pair& o) const {
    return distance != o.distance ? distance < o.distance : a != o.a ? a < o.a : b < o.b;
  }
};

struct Bin {
  double distance = 0, gamma = 0, noise = 0, pairs = 0;
};

struct Fit {
  double nugget = 0, partial = 0, misfit = 0;
};

/// Seasons of the stations that have all of them, each with mean 0 and variance 1: [season][station]; constant ones go.
std::vector<std::vector<double>> standardise(const std::vector<double>& values, std::size_t width,
                                             const std::vector<std::size_t>& stations) {
  std::vector<std::vector<double>> seasons;
  const auto n = static_cast<double>(stations.size());
  for (std::size_t k = 0; k < width && stations.size() > 1; ++k) {
    std::vector<double> z;
    for (const std::size_t i : stations) z.push_back(values[i * width + k]);
    const double mean = std::accumulate(z.begin(), z.end(), 0.0) / n;
    double square = 0, largest = 0;
    for (double& v : z) {
      largest = std::max(largest, std::abs(v));
      v -= mean;
      square += v * v;
    }
    const double deviation = std::sqrt(square / (n - 1));
    // Rounding of a constant is no variation.
    if (!(deviation > 1e-12 * largest)) continue;
    for (double& v : z) v /= deviation;
    seasons.push_back(std::move(z));
  }
  return seasons;
}

std::vector<std::size_t> complete_stations(const std::vector<double>& values, std::size_t width, std::size_t n) {
  std::vector<std::size_t> complete;
  for (std::size_t i = 0; i < n; ++i) {
    const auto* row = values.data() + i * width;
    if (std::all_of(row, row + width, [](double v) { return std::isfinite(v); })) complete.push_back(i);
  }
  return complete;
}

/// Pairs up to half of the largest distance; the largest distance.
std::pair<std::vector<Pair>, double> near_pairs(const std::vector<GeoPoint>& positions,
                                                const std::vector<std::size_t>& stations, Variogram::Model model) {
  std::vector<Vector> at;
  for (const std::size_t i : stations) at.push_back(unit_vector(positions[i]));
  std::vector<Pair> pairs;
  double largest = 0;
  for (std::size_t a = 0; a < at.size(); ++a) {
    for (std::size_t b = 0; b < a; ++b) {
      pairs.push_back({model_distance_m(model, haversine(at[a], at[b])), a, b});
      largest = std::max(largest, pairs.back().distance);
    }
  }
  std::erase_if(pairs, [&](const Pair& p) { return p.distance > largest / 2; });
  std::sort(pairs.begin(), pairs.end());
  return {std::move(pairs), largest};
}

std::vector<Bin> make_bins(const std::vector<Pair>& pairs, const std::vector<std::vector<double>>& seasons,
                           const std::vector<double>& noise) {
  const std::size_t wanted = std::clamp(pairs.size() / kPairsPerBin, kFewestBins, kMostBins);
  std::vector<Bin> bins;
  for (std::size_t b = 0; b < wanted; ++b) {
    const std::size_t from = pairs.size() * b / wanted, to = pairs.size() * (b + 1) / wanted;
    if (from == to) continue;
    Bin bin;
    bin.pairs = static_cast<double>(to - from);
    for (std::size_t p = from; p < to; ++p) {
      bin.distance += pairs[p].distance;
      bin.noise += (noise[pairs[p].a] + noise[pairs[p].b]) / 2;
      for (const auto& z : seasons) {
        const double d = z[pairs[p].a] - z[pairs[p].b];
        bin.gamma += d * d / 2;
      }
    }
    bin.distance /= bin.pairs;
    bin.noise /= bin.pairs;
    bin.gamma = bin.gamma / (bin.pairs * static_cast<double>(seasons.size())) - bin.noise;
    bins.push_back(bin);
  }
  return bins;
}

/// Rise of the variogram from 0 to 1.
double rise(Variogram::Model model, double range, double distance) {
  return 1 - covariance({model, 0, 1, range}, distance);
}

/// Nugget and partial sill, both >= 0, that fit best at this range: the unconstrained optimum, or the better border.
Fit fit_at(const std::vector<Bin>& bins, const std::vector<double>& weight, Variogram::Model model, double range) {
  double w = 0, wg = 0, wgg = 0, wy = 0, wgy = 0;
  for (std::size_t i = 0; i < bins.size(); ++i) {
    const double g = rise(model, range, bins[i].distance);
    w += weight[i];
    wg += weight[i] * g;
    wgg += weight[i] * g * g;
    wy += weight[i] * bins[i].gamma;
    wgy += weight[i] * g * bins[i].gamma;
  }
  const auto misfit = [&](double nugget, double partial) {
    double sum = 0;
    for (std::size_t i = 0; i < bins.size(); ++i) {
      const double e = bins[i].gamma - nugget - partial * rise(model, range, bins[i].distance);
      sum += weight[i] * e * e;
    }
    return Fit{nugget, partial, sum};
  };
  const double determinant = w * wgg - wg * wg;
  if (determinant > 1e-12 * w * wgg) {
    const double nugget = (wgg * wy - wg * wgy) / determinant;
    const double partial = (w * wgy - wg * wy) / determinant;
    if (nugget >= 0 && partial >= 0) return misfit(nugget, partial);
  }
  const Fit flat = misfit(std::max(0.0, wy / w), 0);
  const Fit steep = misfit(0, wgg > 0 ? std::max(0.0, wgy / wgg) : 0);
  return steep.misfit < flat.misfit ? steep : flat;
}

/// The best range between low and high: a grid in equal ratios, then golden section about its best point.
std::pair<double, Fit> best_range(const std::vector<Bin>& bins, const std::vector<double>& weight,
                                  Variogram::Model model, double low, double high) {
  const double step = std::log(high / low) / (kRanges - 1);
  const auto at = [&](double position) { return fit_at(bins, weight, model, low * std::exp(step * position)); };
  int best = 0;
  double least = at(0).misfit;
  for (int i = 1; i < kRanges; ++i) {
    const double misfit = at(i).misfit;
    if (misfit < least) {
      least = misfit;
      best = i;
    }
  }
  constexpr double kGolden = 1 / std::numbers::phi;
  double a = std::max(0, best - 1), b = std::min(kRanges - 1, best + 1);
  for (int i = 0; i < kSections; ++i) {
    const double c = b - kGolden * (b - a), d = a + kGolden * (b - a);
    (at(c).misfit <= at(d).misfit ? b : a) = at(c).misfit <= at(d).misfit ? d : c;
  }
  const double middle = (a + b) / 2;
  const double position = at(middle).misfit < least ? middle : best;
  return {low * std::exp(step * position), at(position)};
}

void weigh_bins(const std::vector<Bin>& bins, const Variogram& model, std::vector<double>& weight) {
  for (std::size_t i = 0; i < bins.size(); ++i) {
    const double gamma = model.sill - covariance(model, bins[i].distance) + bins[i].noise;
    // Standardised values have variance 1; a bin that ought to have none must not decide alone.
    weight[i] = bins[i].pairs / std::pow(std::max(gamma, 1e-3), 2);
  }
}

std::string km(double metres) { return fmt::format("{:.3g} km", metres / 1e3); }

void say_limits(const Variogram& fitted, double low, double high, Notices& notices) {
  if (fitted.range_m > high * (1 - 1e-6)) {
    notices.add("variogram",
                fmt::format("still rises at the largest distance between stations; the range is held at {}", km(high)));
  } else if (fitted.range_m < low * (1 + 1e-6)) {
    notices.add("variogram",
                fmt::format("has risen before the nearest pairs' distance; the range is held at {}", km(low)));
  }
}

}  // namespace

double covariance(const Variogram& variogram, double distance) {
  const double partial = variogram.sill - variogram.nugget;
  const double h = distance / variogram.range_m;
  switch (variogram.model) {
    case Variogram::Model::exponential:
      return partial * std::exp(-3 * h);
    case Variogram::Model::spherical:
      return h < 1 ? partial * (1 - h * (1.5 - 0.5 * h * h)) : 0;
    case Variogram::Model::gaussian:
      return partial * std::exp(-3 * h * h);
  }
  return 0;
}

void check(const Variogram& v) {
  if (!(v.sill > 0 && v.nugget >= 0 && v.nugget <= v.sill && v.range_m > 0) || std::isinf(v.sill) ||
      std::isinf(v.range_m)) {
    throw Error(Failure::job, "variogram",
                fmt::format("nugget {}, sill {}, range {} m: expected 0 <= nugget <= sill, sill > 0, range > 0",
                            v.nugget, v.sill, v.range_m));
  }
}

std::vector<double> standardised_noise(const std::vector<double>& values, const std::vector<double>& sampling_variance,
                                       std::size_t width) {
  const std::size_t n = width == 0 ? 0 : values.size() / width;
  if (values.size() != n * width || sampling_variance.size() != values.size()) {
    throw Error(Failure::defect, "variogram", "sampling variances do not fit the values");
  }
  std::vector<double> noise(n, 0);
  std::vector<double> seasons(n, 0);
  for (std::size_t k = 0; k < width; ++k) {
    double sum = 0, square = 0, count = 0;
    for (std::size_t i = 0; i < n; ++i) {
      if (!std::isfinite(values[i * width + k])) continue;
      sum += values[i * width + k];
      ++count;
    }
    for (std::size_t i = 0; i < n; ++i) {
      if (std::isfinite(values[i * width + k])) square += std::pow(values[i * width + k] - sum / count, 2);
    }
    if (!(square > 0)) continue;
    for (std::size_t i = 0; i < n; ++i) {
      const double v = sampling_variance[i * width + k];
      if (!std::isfinite(v)) continue;
      noise[i] += v / (square / (count - 1));
      ++seasons[i];
    }
  }
  double sum = 0, known = 0;
  for (std::size_t i = 0; i < n; ++i) {
    if (seasons[i] == 0) continue;
    sum += noise[i] /= seasons[i];
    ++known;
  }
  for (std::size_t i = 0; i < n; ++i) {
    if (seasons[i] == 0 && known > 0) noise[i] = sum / known;
  }
  return noise;
}

Variogram fit_variogram(const std::vector<GeoPoint>& positions, const std::vector<double>& values, std::size_t width,
                        const std::vector<double>& noise, Variogram::Model model, Notices& notices) {
  if (values.size() != positions.size() * width || (!noise.empty() && noise.size() != positions.size())) {
    throw Error(Failure::defect, "variogram", "values or sampling variances do not fit the stations");
  }
  const auto stations = complete_stations(values, width, positions.size());
  const auto seasons = standardise(values, width, stations);
  const auto near = near_pairs(positions, stations, model);
  const double largest = near.second;
  Variogram fitted{model, kFallbackNugget, 1, largest > 0 ? largest / 2 : kRangeOfOnePlace_m};
  const auto fall_back = [&](const std::string& why) {
    notices.add("variogram", fmt::format("not fitted: {}; nugget {} and range {} are taken", why, fitted.nugget,
                                         km(fitted.range_m)));
    return fitted;
  };
  if (stations.size() < kFewestStations)
    return fall_back(fmt::format("{} stations, at least {} are needed", stations.size(), kFewestStations));
  if (seasons.empty()) return fall_back("the stations do not differ");
  if (!(largest > 0)) return fall_back("all stations stand in one place");
  std::vector<double> own;
  for (const std::size_t i : stations) own.push_back(noise.empty() ? 0 : noise[i]);
  const auto bins = make_bins(near.first, seasons, own);
  if (bins.size() < kFewestBins) return fall_back("too few pairs of stations near one another");

  const double low = std::max(bins.front().distance, 1e-3 * largest);
  std::vector<double> weight;
  for (const Bin& bin : bins) weight.push_back(bin.pairs);
  Fit fit;
  for (int pass = 0; pass < kPasses; ++pass) {
    const auto best = best_range(bins, weight, model, low, largest);
    fit = best.second;
    fitted = {model, fit.nugget, fit.nugget + fit.partial, best.first};
    weigh_bins(bins, fitted, weight);
  }
  if (fit.partial < kLeastStructure * (fit.nugget + fit.partial) || !(fitted.sill > 0)) {
    // What the stations' own noise explains entirely leaves no sill; some is needed to weigh them.
    const double sill = std::max(fitted.sill, 1e-3);
    fitted = {model, sill, sill, largest / 2};
    notices.add("variogram",
                "differences between stations do not grow with distance: pure nugget, all stations within "
                "reach count alike");
    return fitted;
  }
  say_limits(fitted, low, largest, notices);
  return fitted;
}

}  // namespace windrow::reach
