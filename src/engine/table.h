// The product of catchments or towns once more as a table a spreadsheet opens. Private to the engine.
#pragma once
#include <string>
#include <vector>

#include "session.h"

namespace windrow::engine {

/// PRODUCT.csv beside PRODUCT.nc.
std::string table_path(const std::string& product_path);

/// One row a time step, one column a catchment or town (`ids`): "date" and "ID [units]"; missing values stay empty.
/// Values are the stored float32 ones of `variable` in their shortest form that reads back the same. The product's span
/// counts on `axis`. Written under a temporary name and renamed.
void write_table(const Product& product, const Series& axis, const std::string& variable, const std::string& units,
                 const std::vector<std::string>& ids, float missing);

}  // namespace windrow::engine
