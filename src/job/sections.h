// One reader a table of the job file. Each checks what can be said of its own table; what concerns several is in
// checks.h.
#pragma once
#include "table.h"
#include "windrow/job/spec.h"

namespace windrow::job {

void read_job_table(const Table& table, JobSpec& job);  ///< [job]
RunSpec read_run(const Table& table);                   ///< [[run]]; an absent name or family stays empty
FieldSpec read_field(const Table& table);               ///< [[field]] with [field.adjust] and [field.terrain]
MeshSpec read_mesh(const Table& table);                 ///< [mesh]
StationSpec read_stations(const Table& table);          ///< [stations]
ReachSpec read_reach(const Table& table);               ///< [reach]
EnsembleSpec read_ensemble(const Table& table, const JobSpec& job);  ///< [ensemble]; needs the job's runs
/// [output], directory absolute. What `tile` and `also` may say depends on the kind of mesh.
OutputSpec read_output(const Table& table, MeshKind kind);

extern const Keys kRootKeys, kJobKeys, kRunKeys, kGridKeys, kFieldKeys, kMeshKeys, kStationKeys, kReachKeys,
    kEnsembleKeys, kWarmingKeys, kOutputKeys;

std::string kind_word(MeshKind kind);  ///< as [mesh] kind says it
/// Cells in rows and columns; `file` may turn out otherwise once the file is read.
bool is_structured(MeshKind kind);
std::string method_word(Method method);  ///< as [[field]] method says it

/// A name that becomes part of a file name: letters, digits, '.', '_', '+' and '-', beginning with a letter or digit.
void check_name(const Table& table, const std::string& key, const std::string& name);
/// Units that UDUNITS knows, after the usual repairs; absent is fine.
void check_units(const Table& table, const std::string& key);

/// [first year, last year]; nothing when the key is absent.
std::optional<std::pair<int, int>> read_years(const Table& table, const std::string& key);

}  // namespace windrow::job
