#include "ensemble_make.h"

#include <fmt/format.h>
#include <omp.h>

#include <algorithm>
#include <atomic>
#include <cmath>
#include <exception>
#include <set>

#include "assemble.h"
#include "ensemble_values.h"
#include "stage_setup.h"
#include "table.h"
#include "windrow/base/error.h"
#include "windrow/codec/codec.h"
#include "windrow/os/process.h"

namespace windrow::engine {
namespace {

// Beside a worker's buffers: libraries, caches of open products (16 MiB each at most, while they are read),
// descriptions.
constexpr std::int64_t kSlackBytes = 64 << 20;
constexpr std::int64_t kBytesPerCell = 96;
constexpr std::uint32_t kData = 0, kClimatology = 1;

/// Buffers of one worker and its way to the spool.
class Encoder {
 public:
  Encoder(pipeline::Spool& spool, int level, float missing) : spool_(spool), missing_(missing) {
    if (level > 0) deflater_ = std::make_unique<codec::Deflater>(level);
  }
  /// values[step * cells + cell], NaN where missing, as one chunk of `time` steps.
  void append(const pipeline::TileId& id, const std::vector<double>& values, const CellBlock& block, std::size_t time,
              const plan::Chunk& chunk);

 private:
  pipeline::Spool& spool_;
  float missing_;
  std::unique_ptr<codec::Deflater> deflater_;
  std::vector<float> raw_;
  std::vector<std::byte> shuffled_, packed_;
};

void Encoder::append(const pipeline::TileId& id, const std::vector<double>& values, const CellBlock& block,
                     std::size_t time, const plan::Chunk& chunk) {
  raw_.assign(time * chunk.y * chunk.x, missing_);
  pipeline::TileStats stats;
  const std::size_t width = block.x1 - block.x0;
  for (std::size_t i = 0; i < values.size(); ++i) {
    const std::size_t step = i / block.cells(), cell = i % block.cells();
    const std::size_t at = (step * chunk.y + cell / width) * chunk.x + cell % width;
    if (std::isnan(values[i])) {
      ++stats.count[pipeline::kMissing];
      continue;
    }
    const auto x = static_cast<float>(values[i]);
    raw_[at] = x;
    stats.minimum = std::min(stats.minimum, x);
    stats.maximum = std::max(stats.maximum, x);
  }
  const auto bytes = std::as_bytes(std::span<const float>(raw_));
  const auto aux = pipeline::serialise(stats);
  if (!deflater_) {
    spool_.append(id, codec::digest(bytes), bytes, aux);
    return;
  }
  shuffled_.resize(bytes.size());
  codec::shuffle(bytes, sizeof(float), shuffled_);
  deflater_->compress(shuffled_, packed_);
  spool_.append(id, codec::digest(bytes), packed_, aux);
}

class Maker {
 public:
  Maker(Session& session, const EnsembleStage& stage, const EnsembleHooks& hooks)
      : session_(session),
        stage_(stage),
        hooks_(hooks),
        target_(session.target()),
        needs_(ensemble_needs(session, stage)),
        text_(member_text(stage)),
        level_(session.job.output.deflate ? session.job.output.level : 0),
        blocks_(cell_blocks(target_, needs_.chunk)),
        spool_(fmt::format("{}/{}-{}-{}.spool", session.job.workspace, session.job.fields[stage.field].name,
                           stage.outputs.front(), session.job.mesh.name)),
        reader_(stage, text_, describe_rows()) {
    for (std::size_t i = 0; i < stage.outputs.size(); ++i) {
      scale_.push_back(output_text(stage, text_, i).scale);
    }
  }

  void make() {
    std::vector<codec::Digest> keys;
    for (const auto& product : products()) keys.push_back(product.key_digest);
    spool_.keep_for(keys);
    work();
    for (std::size_t i = 0; i < products().size(); ++i) {
      if (!products()[i].span.wanted) continue;
      assemble_one(i);
      hooks_.finished(i);
    }
    spool_.remove();
  }

 private:
  [[nodiscard]] const std::vector<Product>& products() const { return stage_.result.products; }
  [[nodiscard]] bool describe_rows() const;
  [[nodiscard]] std::size_t time_chunks(const Product& product) const {
    if (stage_.kind == EnsembleKind::warming) return 1;
    return (product.span.t1 - product.span.t0 + needs_.chunk.time - 1) / needs_.chunk.time;
  }
  void work();
  void make_block(std::size_t block, Encoder& encoder);
  void make_warming(const CellBlock& cells, std::size_t block, Encoder& encoder);
  void make_steps(const CellBlock& cells, std::size_t block, Encoder& encoder);
  void compute(std::size_t output, const CellBlock& cells, std::size_t t0, std::size_t count,
               const std::vector<std::vector<float>>& values, const std::vector<double>& climatology,
               std::vector<double>& out) const;
  [[nodiscard]] pipeline::TileId id(std::size_t product, std::size_t time_chunk, std::size_t block) const {
    return {products()[product].key_digest, kData, static_cast<std::uint32_t>(time_chunk * blocks_ + block)};
  }
  [[nodiscard]] std::vector<std::size_t> open_at(std::size_t first, std::size_t time_chunk, std::size_t block) const;
  [[nodiscard]] EnsembleFacts facts(std::size_t product) const;
  void assemble_one(std::size_t product);

  Session& session_;
  const EnsembleStage& stage_;
  const EnsembleHooks& hooks_;
  const Target& target_;
  EnsembleNeeds needs_;
  MemberText text_;
  int level_;
  std::size_t blocks_;
  std::vector<double> scale_;
  pipeline::Spool spool_;
  MemberReader reader_;
};

bool Maker::describe_rows() const {
  const auto reader = cf::open_product(stage_.members.front()->products.front().path);
  return reader->dimensions(text_.variable).size() == 3;
}

void Maker::work() {
  std::exception_ptr error;
  std::mutex mutex;
  std::atomic<bool> failed = false;
  const auto keep = [&] {
    const std::lock_guard lock(mutex);
    if (!error) error = std::current_exception();
    failed = true;
  };
#pragma omp parallel num_threads(needs_.threads)
  {
    Encoder encoder(spool_, level_, text_.missing);
#pragma omp for schedule(dynamic, 1)
    for (std::size_t block = 0; block < blocks_; ++block) {
      if (failed) continue;
      try {
        make_block(block, encoder);
      } catch (...) {
        keep();
      }
    }
  }
  if (error) std::rethrow_exception(error);
}

/// Products of the same steps as product `first` (one an output) that still lack a chunk.
std::vector<std::size_t> Maker::open_at(std::size_t first, std::size_t time_chunk, std::size_t block) const {
  const std::size_t files = products().size() / stage_.outputs.size();
  std::vector<std::size_t> out;
  for (std::size_t p = first; p < products().size(); p += files) {
    if (products()[p].span.wanted && !spool_.has(id(p, time_chunk, block))) out.push_back(p);
  }
  return out;
}

void Maker::make_warming(const CellBlock& cells, std::size_t block, Encoder& encoder) {
  if (open_at(0, 0, block).empty()) return;
  const auto means = monthly_means(stage_, reader_, cells, needs_.chunk.time);
  encoder.append(id(0, 0, block), means, cells, 12, needs_.chunk);
  if (hooks_.progress) hooks_.progress(static_cast<std::int64_t>(means.size() * sizeof(float)));
}

void Maker::compute(std::size_t output, const CellBlock& cells, std::size_t t0, std::size_t count,
                    const std::vector<std::vector<float>>& values, const std::vector<double>& climatology,
                    std::vector<double>& out) const {
  out.resize(count * cells.cells());
  std::vector<double> members(values.size());
  for (std::size_t i = 0; i < out.size(); ++i) {
    if (stage_.kind == EnsembleKind::anomaly) {
      const std::size_t month = static_cast<std::size_t>(stage_.result.dates[t0 + i / cells.cells()].month - 1);
      const double norm = climatology[month * cells.cells() + i % cells.cells()];
      out[i] = (static_cast<double>(values[0][i]) - norm) * scale_[output];
      continue;
    }
    for (std::size_t m = 0; m < members.size(); ++m) members[m] = values[m][i];
    out[i] = ensemble_value(stage_, output, members, scale_[output]);
  }
}

void Maker::make_steps(const CellBlock& cells, std::size_t block, Encoder& encoder) {
  const std::size_t files = products().size() / stage_.outputs.size();
  std::vector<double> climatology, out;
  std::vector<std::vector<float>> values(stage_.members.size());
  for (std::size_t file = 0; file < files; ++file) {
    const auto& span = products()[file].span;
    for (std::size_t chunk = 0; chunk < time_chunks(products()[file]); ++chunk) {
      const auto open = open_at(file, chunk, block);
      if (open.empty()) continue;
      if (hooks_.stop && hooks_.stop()) {
        throw Error(Failure::interrupted, "", "interrupted; run again to go on from here");
      }
      const std::size_t t0 = span.t0 + chunk * needs_.chunk.time, t1 = std::min(span.t1, t0 + needs_.chunk.time);
      if (stage_.kind == EnsembleKind::anomaly && climatology.empty()) {
        climatology = monthly_means(stage_, reader_, cells, needs_.chunk.time);
      }
      for (std::size_t m = 0; m < values.size(); ++m) {
        reader_.read(m, cells, std::span(stage_.steps[m]).subspan(t0, t1 - t0), values[m]);
      }
      for (const std::size_t p : open) {
        if (stage_.kind == EnsembleKind::anomaly) {
          const pipeline::TileId norm{products()[p].key_digest, kClimatology, static_cast<std::uint32_t>(block)};
          if (!spool_.has(norm)) encoder.append(norm, climatology, cells, 12, needs_.chunk);
        }
        compute(stage_.output_of[p], cells, t0, t1 - t0, values, climatology, out);
        encoder.append(id(p, chunk, block), out, cells, needs_.chunk.time, needs_.chunk);
        if (hooks_.progress) hooks_.progress(static_cast<std::int64_t>(out.size() * sizeof(float)));
      }
    }
  }
}

void Maker::make_block(std::size_t block, Encoder& encoder) {
  const CellBlock cells = cell_block(target_, needs_.chunk, block);
  if (stage_.kind == EnsembleKind::warming) {
    make_warming(cells, block, encoder);
  } else {
    make_steps(cells, block, encoder);
  }
}

/// Product paths among the inputs, each checked to be what this job makes.
std::vector<const Product*> member_products(const EnsembleStage& stage, const Product& product) {
  const std::set<std::string> wanted(product.inputs.begin(), product.inputs.end());
  std::vector<const Product*> out;
  for (const auto& series : stage.members) {
    for (const auto& member : series->products) {
      if (wanted.contains(member.path)) out.push_back(&member);
    }
  }
  return out;
}

EnsembleFacts Maker::facts(std::size_t index) const {
  const Product& product = products()[index];
  EnsembleFacts out;
  out.chunk = needs_.chunk;
  if (stage_.kind == EnsembleKind::warming) out.chunk.time = 12;
  out.level = level_;
  out.flags.assign(target_.mesh->size(), 0);
  for (const Product* member : member_products(stage_, product)) {
    const auto flags = cf::open_product(member->path)->values("status_flag");
    for (std::size_t k = 0; k < flags.size(); ++k) out.flags[k] |= static_cast<std::uint8_t>(flags[k]);
  }
  std::vector<std::byte> bytes;
  pipeline::TileStats tile;
  for (std::size_t chunk = 0; chunk < time_chunks(product); ++chunk) {
    for (std::size_t block = 0; block < blocks_; ++block) {
      spool_.aux(id(index, chunk, block), bytes);
      if (!pipeline::parse(bytes, tile)) {
        throw Error(Failure::io, "spool", "statistics of a tile are damaged; remove the workspace and run again");
      }
      out.missing += static_cast<std::int64_t>(tile.count[pipeline::kMissing]);
      out.minimum = std::min(out.minimum, tile.minimum);
      out.maximum = std::max(out.maximum, tile.maximum);
    }
  }
  return out;
}

report::Ledger ensemble_ledger(Session& session, const EnsembleStage& stage, const Product& product, std::size_t output,
                               const EnsembleFacts& facts) {
  const auto& job = session.job;
  report::Ledger out;
  out.version = WINDROW_VERSION;
  out.product = os::file_name_of(product.path);
  out.field = job.fields[stage.field].name;
  for (const auto& series : stage.members) out.run += (out.run.empty() ? "" : ", ") + series->name;
  out.forcing = stage.forcing;
  out.mesh = job.mesh.name;
  out.product_version = job.version;
  for (const auto& [name, digest] : product.key.parts) out.key.emplace_back(name, digest.hex());
  out.settings = stage.settings[output];
  out.libraries = {{"netcdf", cf::library_version()}, {"codec", codec::library_version()}};
  for (const Product* member : member_products(stage, product)) {
    const auto theirs = report::parse_ledger(os::read_text(member->ledger_path), member->ledger_path);
    out.inputs.push_back({told_path(member->path, session.folder()), theirs.product_digest, theirs.product_bytes});
  }
  out.linear_map = "none: computed from finished products";
  out.balance.kept = false;
  out.balance.statement = "computed from finished products, whose own ledgers balance";
  const auto values = session.target().mesh->size() * (product.span.t1 - product.span.t0);
  out.counts = {{"values", static_cast<std::int64_t>(values)}, {"missing", facts.missing}};
  if (facts.minimum <= facts.maximum) {
    out.minimum = static_cast<double>(facts.minimum);
    out.maximum = static_cast<double>(facts.maximum);
  }
  out.cautions = report::cautions();
  return out;
}

void Maker::assemble_one(std::size_t index) {
  const Product& product = products()[index];
  const EnsembleFacts found = facts(index);
  const auto file = describe_ensemble(session_, stage_, index, text_, found, newest_input_date(product));
  auto ledger = ensemble_ledger(session_, stage_, product, stage_.output_of[index], found);
  std::vector<std::byte> payload;
  const auto chunks = [&](std::size_t variable, std::size_t at) -> std::span<const std::byte> {
    spool_.payload({product.key_digest, static_cast<std::uint32_t>(variable), static_cast<std::uint32_t>(at)}, payload);
    return payload;
  };
  os::publish(write_temporary(product, file, chunks, ledger), product.path);
  if (session_.job.output.csv) {
    const auto text = output_text(stage_, text_, stage_.output_of[index]);
    write_table(product, stage_.result, text.variable, text.units, target_.ids, text_.missing);
  }
  os::replace_file(product.ledger_path, report::to_json(ledger));
}

}  // namespace

EnsembleNeeds ensemble_needs(Session& session, const EnsembleStage& stage) {
  const Target& target = session.target();
  EnsembleNeeds out;
  out.chunk = chunk_of(session, target, stage.members.front()->frequency, session.adjusted(stage.field));
  const auto block = static_cast<std::int64_t>(out.chunk.y * out.chunk.x);
  const auto values = block * static_cast<std::int64_t>(out.chunk.time);
  const auto members = static_cast<std::int64_t>(stage.members.size());
  constexpr std::int64_t kReadAndWrite = 4 * 4 + 8;       // window, raw, shuffled and packed chunk; results in double
  constexpr std::int64_t kClimatologyBytes = 12 * 8 * 4;  // sums, counts, means and their copy
  const std::int64_t worker = values * (4 * members + kReadAndWrite) + block * kClimatologyBytes;
  const std::int64_t fixed =
      os::current_memory() + kSlackBytes + static_cast<std::int64_t>(target.ny * target.nx) * kBytesPerCell;
  const std::int64_t ceiling = memory_ceiling(session.job);
  out.threads = thread_count(session);
  while (out.threads > 1 && fixed + out.threads * worker > ceiling) --out.threads;
  out.bound = fixed + out.threads * worker;
  if (out.bound > ceiling) {
    throw Error(Failure::job, stage.name,
                fmt::format("needs {} MB, 'memory' is {} MB; give more, or a smaller 'tile' in [output]",
                            out.bound / 1'000'000, ceiling / 1'000'000));
  }
  return out;
}

void make_ensemble(Session& session, const EnsembleStage& stage, const EnsembleHooks& hooks) {
  for (const auto& product : stage.result.products) {
    if (!product.span.wanted) continue;
    for (const Product* member : member_products(stage, product)) {
      Product found = *member;
      session.judge(found);
      if (found.stale.empty()) continue;
      throw Error(
          Failure::data, product.path,
          fmt::format("needs {}, which is not there as this job makes it", told_path(member->path, session.folder())));
    }
  }
  Maker(session, stage, hooks).make();
}

}  // namespace windrow::engine
