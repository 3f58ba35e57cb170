/* SPDX-License-Identifier: BSD-2-Clause
 *
 * Is this a good clock? The criteria are common practice without one source: it should read every value once, in a time
 * short against that of expansion, leave the system as it was, and not care whether it is read before or after. */
#include "relational_impl.h"

#include <math.h>

enum { UNUSABLE, POOR, GOOD };
const char *const ebb_clock_verdict_names[] = {"unusable", "poor", "good"};

static const double FUZZY = 0.5, STALLED = 1.0;   /* kappa sigma_t: share of an e-fold of volume */
static const double LEAKS = 0.01, BROKEN = 0.1;   /* share of the dwell sent to v <= 0 */
static const double DISTURBS = 0.1, ORDER = 0.25; /* total variation */
static const double MIXED = 0.1;                  /* purity */

/* The worst of the outcomes that were not refused. */
struct worst {
  PetscInt good;
  double stretches, clock, leak, purity;
};

static struct worst worst_of(const struct ebb_reading_result *x)
{
  struct worst w = {.purity = 1.0};

  for (PetscInt i = 0; i < x->n; i++) {
    if (x->refused[i]) continue;
    w.good++;
    w.stretches = fmax(w.stretches, x->intervals[i]);
    w.clock = fmax(w.clock, x->clock_spread[i]);
    w.leak = fmax(w.leak, x->leak[i]);
    if (!isnan(x->purity[i])) w.purity = fmin(w.purity, x->purity[i]);
  }
  return w;
}

void ebb_engine_judge(const struct ebb_relational *r, struct ebb_engine *e)
{
  struct ebb_reading_result *x = &e->result;
  const struct worst w = worst_of(x);
  char *text = x->reason;
  const size_t size = sizeof x->reason;

  (void)r;
  x->verdict = GOOD;
  if (w.good == 0) {
    x->verdict = UNUSABLE;
    (void)PetscSNPrintf(text, size, "every outcome was refused; see status");
  } else if (w.leak > BROKEN) {
    x->verdict = UNUSABLE;
    (void)PetscSNPrintf(text, size, "up to %.2g of what it reads is sent to v <= 0", w.leak);
  } else if (w.stretches > 1.0) {
    x->verdict = POOR;
    (void)PetscSNPrintf(text, size, "it reads the same value in %d stretches of the parameter: before and after",
                        (int)w.stretches);
  } else if (w.clock > STALLED) {
    x->verdict = UNUSABLE;
    (void)PetscSNPrintf(text, size, "it stalls: one reading lasts for %.2g e-folds of volume (one standard deviation)",
                        w.clock);
  } else if (w.clock > FUZZY) {
    x->verdict = POOR;
    (void)PetscSNPrintf(text, size, "fuzzy: one reading lasts for %.2g e-folds of volume (one standard deviation)",
                        w.clock);
  } else if (w.leak > LEAKS) {
    x->verdict = POOR;
    (void)PetscSNPrintf(text, size, "a reading sends %.2g of the probability to v <= 0%s", w.leak,
                        x->mean_exists ? "" : ", and sharp bins leave no mean volume");
  } else if (x->back_action > DISTURBS) {
    x->verdict = POOR;
    (void)PetscSNPrintf(text, size, "reading it moves %.2g of the system's probability elsewhere", x->back_action);
  } else if (x->order_violation > ORDER) {
    x->verdict = POOR;
    (void)PetscSNPrintf(text, size, "it matters whether clock or system is read first: total variation %.2g",
                        x->order_violation);
  } else if (w.purity < MIXED) {
    x->verdict = POOR;
    (void)PetscSNPrintf(text, size, "a reading leaves a mixture of purity %.2g", w.purity);
  } else {
    (void)PetscSNPrintf(
        text, size,
        "one stretch of the parameter per reading, %.2g e-folds of volume long at most, back action %.2g, order %.2g",
        w.clock, x->back_action, x->order_violation);
  }
}
