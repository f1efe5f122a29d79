// Rules that concern several tables of the job file: names, families, products told apart, what an adjustment needs.
#pragma once
#include <vector>

#include "table.h"
#include "windrow/job/spec.h"

namespace windrow::job {

/// The cursors the checks point with, in the order of JobSpec's lists.
struct Tables {
  std::vector<Table> runs, fields;
  std::optional<Table> output;
};

/// Fills in what a run's name and family default to, then checks that names are unique and that every family has
/// exactly one anchor.
void settle_runs(const Tables& tables, JobSpec& job);
void check_fields(const Tables& tables, const JobSpec& job);
/// Every field of every run has a product name of its own.
void check_products(const Document& document, const Tables& tables, const JobSpec& job);

}  // namespace windrow::job
