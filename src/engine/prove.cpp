// `windrow prove`: every adjusted field, on the anchor run of each family. The mesh is made for its outline, and
// nothing is regridded onto it.
#include <fmt/format.h>

#include "calibration.h"
#include "proof_text.h"
#include "session.h"
#include "stage_setup.h"
#include "windrow/base/error.h"

namespace windrow::engine {
namespace {

FieldProof prove_one(Session& session, std::size_t field, std::size_t run, Notices& notices,
                     const ProgressSink& progress) {
  const auto& spec = session.job.fields[field];
  const auto& name = session.job.runs[run].name;
  const Source& source = session.source(field, run);
  const std::string units = output_units(session, field, run);
  const auto& info = source.variable->info();
  const auto conversion =
      units::conversion(info.units, units, info.standard_name, fmt::format("field '{}', run '{}'", spec.name, name));
  std::optional<FixedField> height;
  if (spec.terrain) {
    height = read_height(session.height_path(field, run), session.target().earth, notices,
                         hints_of(session.job.runs[run].grid));
  }
  return prove_field(
      {session.job, spec, session.target(), source, name, conversion, units, height ? &*height : nullptr},
      session.job.runs[run].family, thread_count(session), notices, [&](const std::string& step) {
        if (progress) progress({fmt::format("{} of {}: {}", spec.name, name, step), 0, 0, 0, 0});
      });
}

}  // namespace

Proof prove(const std::string& job_file, const Options& options, const ProgressSink& progress) {
  Session session(job_file, options);
  session.write_nothing();
  Proof out;
  report::Fact root("prove");
  report::Fact fields("fields");
  fields.list = true;
  Notices notices;
  bool any = false;
  for (std::size_t field = 0; field < session.job.fields.size(); ++field) {
    if (!session.adjusted(field)) continue;
    any = true;
    for (std::size_t run = 0; run < session.job.runs.size(); ++run) {
      if (session.anchor_of(run) != run) continue;
      try {
        const auto proof = prove_one(session, field, run, notices, progress);
        out.report.text += text_of(proof);
        fields.add(facts_of(proof));
        out.csv += csv_of(proof);
      } catch (const Error& error) {
        if (error.kind() == Failure::interrupted) throw;
        if (!out.failure) out.failure = error.kind();
        out.failures.emplace_back(error.what());
      }
      for (const auto& notice : session.notices(field, run)) notices.add(notice.place, notice.text);
    }
  }
  if (!any) {
    throw Error(Failure::job, session.job.path,
                "no field has [field.adjust]: there is nothing to prove; expected a field adjusted to stations");
  }
  out.notices = notices.list();
  if (fields.children.empty()) return out;
  root.add(std::move(fields));
  out.report.json = report::to_json(root);
  out.csv = csv_heading() + out.csv;
  return out;
}

}  // namespace windrow::engine
