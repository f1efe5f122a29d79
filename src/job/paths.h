// Paths of the job file: ~ and ${NAME} expanded, relative to the job file's folder.
#pragma once
#include <string>

#include "document.h"

namespace windrow::job {

/// Absolute path. Error(job) at `at` for an empty path, an environment variable that is not set, and an unclosed ${.
std::string expanded_path(const Document& document, const std::string& written, Position at, const std::string& key);

/// The job file's own absolute path; not Document::name(), which is kept as the user typed it.
std::string absolute_job_path(const std::string& path);

}  // namespace windrow::job
