// The product of catchments or towns once more as a table a spreadsheet opens. Private to the engine.
#pragma once
#include <string>

#include "assemble.h"

namespace windrow::engine {

/// PRODUCT.csv beside PRODUCT.nc.
std::string table_path(const std::string& product_path);

/// One row a time step, one column a catchment or town: "date" and "ID [units]"; missing values stay empty. Values are
/// the stored float32 ones in their shortest form that reads back the same. Written under a temporary name and renamed.
void write_table(const StageContext& context, const Product& product);

}  // namespace windrow::engine
