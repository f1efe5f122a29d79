// Multiplicative corrections where wet and dry days are told apart. See make_correction and evaluate for the rules.
#pragma once
#include <span>

#include "windrow/adjust/transfer.h"

namespace windrow::adjust {

void make_wet_correction(const Setup& setup, const Steps& anchor_steps, const RowClimate& climate,
                         std::span<const double> anchor_series, const CellTarget& target, const CellDraws* draws,
                         Correction& out);
void evaluate_wet(const Setup& setup, const Steps& steps, std::span<const double> series, const Ranks& ranks,
                  const Correction& correction, const CellDraws* draws, std::span<double> out);

}  // namespace windrow::adjust
