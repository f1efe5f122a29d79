// One reader a table of the job file. Each checks what can be said of its own table; what concerns several is in
// checks.h.
#pragma once
#include "table.h"
#include "windrow/job/spec.h"

namespace windrow::job {

void read_job_table(const Table& table, JobSpec& job);  ///< [job]
RunSpec read_run(const Table& table);                   ///< [[run]]; an absent name or family stays empty
FieldSpec read_field(const Table& table);               ///< [[field]] with [field.adjust] and [field.terrain]
/// Before the keys of [mesh] are checked: Error(job) for a kind of mesh that this version does not have, since its keys
/// tell less than the word.
void refuse_later_kind(const Document& document, const Value& mesh);
MeshSpec read_mesh(const Table& table);         ///< [mesh]
StationSpec read_stations(const Table& table);  ///< [stations]
ReachSpec read_reach(const Table& table);       ///< [reach]
OutputSpec read_output(const Table& table);     ///< [output], directory absolute

extern const Keys kRootKeys, kJobKeys, kRunKeys, kFieldKeys, kMeshKeys, kStationKeys, kReachKeys, kOutputKeys;

/// A name that becomes part of a file name: letters, digits, '.', '_', '+' and '-', beginning with a letter or digit.
void check_name(const Table& table, const std::string& key, const std::string& name);
/// Units that UDUNITS knows, after the usual repairs; absent is fine.
void check_units(const Table& table, const std::string& key);

}  // namespace windrow::job
