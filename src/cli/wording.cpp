#include "wording.h"

#include <fmt/format.h>

#include "progress.h"
#include "windrow/text/words.h"

namespace windrow::cli {

std::string state_word(engine::State state) {
  switch (state) {
    case engine::State::made:
      return "made";
    case engine::State::current:
      return "current";
    case engine::State::failed:
      return "failed";
  }
  return {};
}

std::string verdict_word(engine::Verdict verdict) {
  switch (verdict) {
    case engine::Verdict::passed:
      return "passed";
    case engine::Verdict::failed:
      return "FAILED";
    case engine::Verdict::needs_inputs:
      return "needs inputs";
  }
  return {};
}

std::string summary_text(const engine::Summary& summary, bool last_line_only) {
  std::size_t made = 0, current = 0, failed = 0;
  std::string out, failed_names;
  for (const engine::ProductStatus& product : summary.products) {
    made += product.state == engine::State::made;
    current += product.state == engine::State::current;
    failed += product.state == engine::State::failed;
    if (product.state == engine::State::failed) failed_names += (failed_names.empty() ? "" : ", ") + product.path;
    if (product.state != engine::State::made || last_line_only) continue;
    out += fmt::format("{:<7} {}{}\n", state_word(product.state), product.path,
                       product.reason.empty() ? "" : ": " + product.reason);
  }
  std::string took = fmt::format("{:.1f} s", summary.seconds);
  if (summary.output_bytes > 0) {
    took += ", " + text::bytes_text(static_cast<std::int64_t>(summary.output_bytes)) + " of values";
    if (summary.seconds > 0)
      took +=
          fmt::format(" ({}/s)", text::bytes_text(static_cast<std::int64_t>(summary.output_bytes / summary.seconds)));
  }
  if (summary.peak_memory > 0) took += ", peak memory " + text::bytes_text(summary.peak_memory);
  out += fmt::format("{} made, {} current, {} failed{} [{}]\n", made, current, failed,
                     failed_names.empty() ? "" : ": " + failed_names, took);
  return out;
}

std::string failures_text(const engine::Summary& summary) {
  std::string out;
  for (const engine::ProductStatus& product : summary.products) {
    if (product.state != engine::State::failed || product.reason.empty()) continue;
    const std::string line = fmt::format("windrow: {}\n", product.reason);
    if (out.find(line) == std::string::npos) out += line;
  }
  return out;
}

std::string vouched_text(const engine::Vouched& vouched) {
  std::string out;
  for (const engine::Check& check : vouched.checks)
    out += fmt::format("{:<12} {}: {}{}\n", verdict_word(check.verdict), vouched.product, check.name,
                       check.text.empty() ? "" : ", " + check.text);
  if (!vouched.value_digest.empty())
    out += fmt::format("{:<12} {}: digest of the values {}\n", "", vouched.product, vouched.value_digest);
  return out;
}

std::string notice_text(const Notice& notice) {
  return notice.place.empty() ? "note: " + notice.text : "note: " + notice.place + ": " + notice.text;
}

std::string error_text(const Error& error) {
  std::string out = fmt::format("windrow: {}\n", error.what());
  if (!error.detail().empty()) out += error.detail() + (error.detail().back() == '\n' ? "" : "\n");
  return out;
}

}  // namespace windrow::cli
