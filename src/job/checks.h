// Rules that concern several keys or tables of the job file: names, families, products told apart, what an adjustment
// needs; what a regridding method, a vector pair and a kind of mesh go with (checks_methods.cpp).
#pragma once
#include <vector>

#include "table.h"
#include "windrow/job/spec.h"

namespace windrow::job {

/// The cursors the checks point with, in the order of JobSpec's lists.
struct Tables {
  std::vector<Table> runs, fields;
  std::optional<Table> ensemble, output;
};

/// Fills in what a run's name and family default to, then checks that names are unique and that every family has
/// exactly one anchor.
void settle_runs(const Tables& tables, JobSpec& job);
void check_fields(const Tables& tables, const JobSpec& job);
/// Methods against quantity, adjustment and kind of mesh.
void check_methods(const Tables& tables, const JobSpec& job);
/// One eastward and one northward field that are regridded alike, or none.
void check_pairs(const Tables& tables, const JobSpec& job);
/// Every field of every run has a product name of its own.
void check_products(const Document& document, const Tables& tables, const JobSpec& job);
/// Statistics have members, and products of [ensemble] names of their own.
void check_ensemble(const Document& document, const Tables& tables, const JobSpec& job);

}  // namespace windrow::job
