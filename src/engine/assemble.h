// A finished stage becomes files: CF description, chunks from the spool, ledger. Private to the engine.
#pragma once
#include <optional>
#include <string>
#include <vector>

#include "calibration.h"
#include "scan.h"
#include "session.h"
#include "windrow/cf/product.h"
#include "windrow/pipeline/stage.h"
#include "windrow/report/ledger.h"

namespace windrow::engine {

/// Everything of one field of one run that its products need when they are finished.
struct StageContext {
  Session& session;
  std::size_t field, run;
  const Source& source;
  const Target& target;
  const linear_map::Weights& weights;
  const Regridding& regridding;
  const Scan& scan;
  const Calibration* calibration;  ///< null: regridding only
  std::vector<Notice> notices;     ///< of this field and run: files, stations
  units::Conversion conversion;
  std::string output_units;
  std::vector<Product> products;
  pipeline::StageInput input;
};

/// The CF description of one product. `stats`: merged over its tiles.
cf::ProductFile describe(const StageContext& context, const Product& product, const pipeline::TileStats& stats,
                         const report::Balance& balance);

/// UTC date of the product's newest input (its time stamp), or of SOURCE_DATE_EPOCH.
std::string newest_input_date(const Product& product);

report::Balance balance_of(const StageContext& context, const Product& product, const pipeline::TileStats& stats);

/// Writes the product under a temporary name beside it, which is returned; the ledger gets its size and digest.
std::string write_temporary(const Product& product, const cf::ProductFile& file, const cf::ChunkSource& chunks,
                            report::Ledger& ledger);

/// Writes, syncs and renames the product and its ledger.
void assemble(const StageContext& context, std::size_t product, const pipeline::Spool& spool);

}  // namespace windrow::engine
