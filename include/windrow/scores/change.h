// The change between two periods in the model and in the product made from it: is the modelled change kept?
#pragma once
#include <span>

#include "windrow/scores/resample.h"

namespace windrow::scores {

struct Period {
  int first, last;  ///< years of the season, both within
};

enum class ChangeKind { difference, ratio };  ///< later minus earlier mean; later over earlier mean

struct Change {
  double modelled, product;     ///< NaN where a period is empty, or for a ratio where the earlier mean is not > 0
  double added;                 ///< product - modelled: what the adjustment made of the change; 0 where it is kept
  Interval added_interval;      ///< 90 %: years of each period drawn anew, the same for model and product
  int early_years, late_years;  ///< well-sampled ones
  bool too_small;               ///< either is below kFewestYears
  bool kept;                    ///< the interval holds 0
};

/// Days on which either series is missing are left out. The late period's draws use the replicates after those of the
/// early one, so that both are independent also where the periods are equally long.
Change change_between(const Days& days, const Season& season, std::span<const double> modelled,
                      std::span<const double> product, Period early, Period late, ChangeKind kind,
                      const Resampling& resampling);

}  // namespace windrow::scores
