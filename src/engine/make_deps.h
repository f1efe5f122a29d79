// A makefile fragment that names each product's inputs. Private to the engine.
#pragma once
#include <string>
#include <vector>

#include "session.h"

namespace windrow::engine {

/// `PRODUCT: JOB INPUT...` lines for GNU make, blanks, `#` and `$` escaped; the file is left alone when nothing
/// changed.
void write_make_deps(const std::string& path, const std::vector<Product>& products, const std::string& job_file);

}  // namespace windrow::engine
