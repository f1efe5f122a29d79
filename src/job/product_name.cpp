// The name pattern of products, filled in except for {year}.
#include "windrow/job/spec.h"

namespace windrow::job {

std::string product_name(const JobSpec& job, const FieldSpec& field, const RunSpec& run) {
  std::string out;
  const std::string& pattern = job.output.name;
  for (std::size_t at = 0; at < pattern.size();) {
    const std::size_t end = pattern[at] == '{' ? pattern.find('}', at) : std::string::npos;
    if (end == std::string::npos) {
      out += pattern[at++];
      continue;
    }
    const std::string inside = pattern.substr(at + 1, end - at - 1);
    if (inside == "field") out += field.name;
    if (inside == "run") out += run.name;
    if (inside == "mesh") out += job.mesh.name;
    if (inside == "version") out += job.version;
    if (inside == "year") out += "{year}";
    at = end + 1;
  }
  return out;
}

}  // namespace windrow::job
