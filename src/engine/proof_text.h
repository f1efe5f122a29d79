// A field's proof in words: tables and sentences for people, facts for JSON, lines of CSV. Private to the engine.
#pragma once
#include <string>

#include "proof_scores.h"
#include "windrow/report/facts.h"

namespace windrow::engine {

std::string text_of(const FieldProof& proof);
report::Fact facts_of(const FieldProof& proof);
std::string csv_heading();
/// A line a design, station, season and score. `observed` is what is compared with (a mean, a quantile, ...); raw,
/// height and adjusted are the scores of the three versions; low and high the 90 % interval of adjusted, where the
/// verdict rests.
std::string csv_of(const FieldProof& proof);

}  // namespace windrow::engine
