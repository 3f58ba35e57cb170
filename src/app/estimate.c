/* SPDX-License-Identifier: BSD-2-Clause
 *
 * What a run will need, from what its set-up made. Memory is counted from what the process holds by then: MPI, PETSc,
 * HDF5 and BLAS alone are some 100 MB, another number on every machine. */
#include "run.h"

#include "ebbturn/memory.h"

#include <math.h>

static const double BATCH_BYTES = 5e8; /* per rank, for probabilities and states of one batch */
enum { BATCH_MOST = 256 };
/* A safe point every so many seconds by estimate, where the batch is not smaller than what the serial recursion needs
 * beside the sum (some percent of it at 16 samples). */
static const double STRETCH = 5.0, STRETCH_SHARE = 0.25; /* the latter of the interval between checkpoints */
enum { BATCH_LEAST = 16 };
static const double GIGAFLOPS = 10e9;  /* per core, a cautious dense-product rate for the estimate of time */
static const double STORE_BYTES = 4e6; /* an open result: HDF5's own tables and buffers (measured) */

bool ebb_run_steps(const struct ebb_run *run)
{
  return run->method == EBB_METHOD_CHEBYSHEV || run->method == EBB_METHOD_KRYLOV;
}

/* Samples at once: bounded by memory, and by the time between two safe points. */
static PetscInt choose_batch(const struct ebb_run *run, double bytes, double seconds)
{
  const double every = run->settings->output.checkpoint_every;
  const double stretch = isnan(every) ? STRETCH : fmin(STRETCH, STRETCH_SHARE * every);
  const double most = fmax(stretch * (double)run->m / fmax(seconds, 1e-300), ebb_run_steps(run) ? 1.0 : BATCH_LEAST);

  return PetscMax((PetscInt)fmin(fmin(fmin(BATCH_MOST, run->m), floor(BATCH_BYTES / fmax(bytes, 1.0))), most), 1);
}

static double seconds_of(const struct ebb_run *run, double share)
{
  const double n = (double)ebb_lattice_size(&run->lattice), modes = (double)run->packet->n;
  double seconds = n * share * modes * 12.0 * (double)run->m / GIGAFLOPS;

  if (run->bundle) seconds *= (double)run->bundle->n;
  if (ebb_run_steps(run)) { /* 1.5 v_max products per unit of clock */
    const double clock = run->phi[run->m - 1] - run->phi[0];

    seconds = 1.5 * 4.0 * n * clock * n * share * 60.0 / (GIGAFLOPS / 10.0);
  }
  return seconds;
}

/* The table of phases, blocks of basis rows and what they sum up to (source_packet.c): real and imaginary parts of
 * three fields a sample, on a grid of four and the copies they are put together from. */
static double sum_bytes(const struct ebb_run *run, double batch)
{
  static const double rows = 192.0, cursor = 40.0; /* basis rows at once; numbers of the recursion, a mode */
  const double modes = (double)run->packet->n, columns = run->lattice.rows.prescription->grid ? 16.0 : 6.0;

  return 8.0 * (modes * (columns * batch + rows + cursor) + rows * columns * batch);
}

struct ebb_estimate ebb_run_estimate(const struct ebb_run *run)
{
  const unsigned keep = run->settings->output.keep;
  const double n = (double)ebb_lattice_size(&run->lattice);
  const bool quantiles = run->settings->output.quantiles > 0, state = ebb_run_keeps_states(run);
  const bool probability = (keep & EBB_KEEP_PROBABILITY) != 0;
  /* probabilities, their running sums for quantiles, states; per sample and site */
  const double bytes =
      (quantiles || probability || run->bundle ? 8.0 : 0.0) + (quantiles ? 8.0 : 0.0) + (state ? 16.0 : 0.0);
  struct ebb_estimate e = {0};
  PetscMPIInt ranks;
  double local;

  (void)MPI_Comm_size(run->comm, &ranks);
  local = ceil(n / ranks);
  e.seconds = seconds_of(run, 1.0 / ranks);
  e.batch = choose_batch(run, local * bytes, e.seconds);
  e.file = (probability ? 8.0 * n * run->m : 0.0) +
           (state ? 16.0 * n * ceil((double)run->m / run->settings->output.every) : 0.0) + 24.0 * n +
           16.0 * (EBB_MOMENTS + 4.0) * run->m;
  e.work = local * bytes * (double)e.batch + sum_bytes(run, (double)e.batch) + STORE_BYTES +
           16.0 * (EBB_MOMENTS + 4.0) * run->m;
  if (run->bundle) e.work += ebb_source_bundle_bytes(run->bundle, (PetscInt)local, e.batch);
  if (ebb_run_steps(run)) e.work += local * 16.0 * 24.0;
  e.memory = fmax(ebb_memory_peak(), ebb_memory_now() + e.work);
  return e;
}
