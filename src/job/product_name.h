// The name pattern of products, filled in except for {year}.
#pragma once
#include "windrow/job/spec.h"

namespace windrow::job {

std::string product_name(const JobSpec& job, const FieldSpec& field, const RunSpec& run);

}  // namespace windrow::job
