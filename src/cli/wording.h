// What commands print for people: the summary of a run, the checks of a product, notes and errors. Text only.
#pragma once
#include <string>

#include "windrow/engine/engine.h"

namespace windrow::cli {

std::string state_word(engine::State state);        ///< "made", "current", "failed"
std::string verdict_word(engine::Verdict verdict);  ///< "passed", "FAILED", "needs inputs"

/// Products that were made, a line each with the reason; the last line counts made, current and failed and names the
/// failed. `last_line_only` for --quiet.
std::string summary_text(const engine::Summary& summary, bool last_line_only);
/// Why products failed, `windrow: reason`, each reason once.
std::string failures_text(const engine::Summary& summary);
/// A line a check, then the digest of the values.
std::string vouched_text(const engine::Vouched& vouched);
/// `note: place: text`
std::string notice_text(const Notice& notice);
/// `windrow: what` and the detail's lines.
std::string error_text(const Error& error);

}  // namespace windrow::cli
